"""One candidate as one reader may see it: where it stands, and its story.

All that others did passes the one test `seal is open` in `standing_for` and `ruling_lines`; there is
no other way from the log to a reader.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Iterable

from tui.consensus.history import in_order
from tui.consensus.seal import is_open, own_stale, seen_outcome, seen_pending_reason, seen_states
from tui.consensus.standing import Standing
from tui.errors import SealError
from tui.model import CHECKS, Ruling
from tui.store import deriving
from tui.store.connect import snapshot
from tui.store.drafts import drafts
from tui.store.names import id_of
from tui.store.records import CandidateView, RulingLine, StoryLine
from tui.store.reviewers import handles
from tui.store.settings import read_settings


def standing_for(connection: sqlite3.Connection, reviewer_id: str | None, name: str) -> CandidateView:
    """Where a candidate stands as far as this reader may know; UnknownNameError if there is none of that name."""
    with snapshot(connection):
        return seen(connection, reviewer_id, name)


def seen(connection: sqlite3.Connection, reviewer_id: str | None, name: str) -> CandidateView:
    """The same, from one state of the file."""
    candidate_id = id_of(connection, name)
    ground = deriving.ground_of(connection, candidate_id)
    stands = deriving.stand(ground, read_settings(connection))
    seal_open = is_open(stands, reviewer_id)
    by = handles(connection)
    own = {check: ruling for (check, owner), ruling in stands.current.items() if owner == reviewer_id}
    return CandidateView(
        name=connection.execute("SELECT name FROM candidate WHERE id = ?", (candidate_id,)).fetchone()[0],
        states=dict(seen_states(stands, reviewer_id)),
        stale=own_stale(stands, reviewer_id),
        outcome=seen_outcome(stands, reviewer_id),
        pending_reason=seen_pending_reason(stands, reviewer_id),
        seal_open=seal_open,
        done=reviewer_id in stands.done,
        needs_me=reviewer_id is not None and stands.needs(reviewer_id),
        own={check: own[check] for check in CHECKS if check in own},
        others=lines(ground.rulings, stands, by, lambda owner: owner != reviewer_id) if seal_open else [],
        drafts=drafts(connection, reviewer_id, name) if reviewer_id is not None else {},
        id=candidate_id,
        cause=stands.cause if seal_open else "",
        to_rule=stands.to_rule(reviewer_id) if reviewer_id is not None else (),
        own_history=lines(ground.rulings, stands, by, lambda owner: owner == reviewer_id),
    )


def lines(log: Iterable[Ruling], stands: Standing, by: dict[str, str], is_wanted) -> list[RulingLine]:
    """The wanted reviewers' rulings, in time order."""
    current = {ruling.id for ruling in stands.current.values()}
    return [
        RulingLine(
            id=ruling.id,
            check=ruling.check,
            handle=by.get(ruling.reviewer_id, ruling.reviewer_id),
            reviewer_id=ruling.reviewer_id,
            ruling=ruling.ruling,
            note=ruling.note,
            utc=ruling.utc,
            seen_others=ruling.seen_others,
            current=ruling.id in current,
            stale=stands.stale.get(ruling.id, ""),
            evidence_digest=ruling.evidence_digest,
        )
        for ruling in in_order(log)
        if is_wanted(ruling.reviewer_id)
    ]


def others_rulings(connection: sqlite3.Connection, reviewer_id: str, name: str) -> list[RulingLine]:
    """Everyone else's rulings on a candidate, for a reader who says that they should be visible.

    Raises:
        SealError: the reader was never done with this candidate.
    """
    view = standing_for(connection, reviewer_id, name)
    if not view.seal_open:
        raise SealError(f"What others ruled on {view.name} opens when your own walk of it ends.")
    return view.others


def story(connection: sqlite3.Connection, reviewer_id: str | None, name: str) -> list[StoryLine]:
    """What happened to a candidate, in time order; others' rulings only where the seal is open."""
    candidate_id = id_of(connection, name)
    told = [*loaded(connection, candidate_id), *ruled(connection, reviewer_id, name)]
    told.sort(key=lambda line: (line.utc, line.what, line.check, line.who))
    by = handles(connection)
    own = [line.utc for line in told if line.check and line.who == by.get(reviewer_id or "")]
    mine = max(own, default="")
    return [
        StoryLine(line.utc, line.what, line.who, line.check, line.text, bool(mine) and line.utc > mine) for line in told
    ]


def ruled(connection: sqlite3.Connection, reviewer_id: str | None, name: str) -> list[StoryLine]:
    """The rulings that the reader may see, as lines of the story."""
    view = standing_for(connection, reviewer_id, name)
    told = []
    for line in (*view.own_history, *view.others):
        what = "withdrawn" if line.ruling == "withdrawn" else "ruled"
        marks = [text for text in ("others in view" if line.seen_others else "", line.stale) if text]
        text = line.ruling + (f" ({'; '.join(marks)})" if marks else "") + (f": {line.note}" if line.note else "")
        told.append(StoryLine(line.utc, what, line.handle, line.check, text))
    return told


def loaded(connection: sqlite3.Connection, candidate_id: int) -> list[StoryLine]:
    """What tables brought, one line for each load, source and sort of row."""
    told: list[StoryLine] = []
    counted = (
        ("candidate_version", "loaded", "facts"),
        ("neighbour", "neighbours", "neighbours"),
        ("dip", "dips", "dips"),
        ("spectrum", "spectrum", "a spectrum"),
        ("cutout", "cutout", "cutouts"),
    )
    for table, what, noun in counted:
        query = (
            f"SELECT load.utc, source, COUNT(*) FROM {table} JOIN load ON load.id = load_id "
            "WHERE candidate_id = ? GROUP BY load.utc, source"
        )
        for utc, source, count in connection.execute(query, (candidate_id,)).fetchall():
            text = noun if table in ("candidate_version", "spectrum") else f"{count} {noun}"
            told.append(StoryLine(utc, what, source, "", text))
    query = (
        "SELECT load.utc, source, GROUP_CONCAT(band, ' '), SUM(EXISTS (SELECT 1 FROM measurement AS old "
        "JOIN load AS first ON first.id = old.load_id WHERE old.candidate_id = m.candidate_id AND old.band = m.band "
        "AND old.source = m.source AND old.epoch = m.epoch AND first.utc < load.utc)) "
        "FROM measurement AS m JOIN load ON load.id = m.load_id WHERE candidate_id = ? GROUP BY load.utc, source"
    )
    for utc, source, bands, corrected in connection.execute(query, (candidate_id,)).fetchall():
        told.append(StoryLine(utc, "corrected" if corrected else "measured", source, "", bands))
    return told
