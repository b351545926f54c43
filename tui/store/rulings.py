"""The log of rulings: chained by hash, only ever added to.

Each row holds the hash of its reviewer's previous row and its own, the SHA-256 of the canonical JSON
of everything else in it. One reviewer who works on two copies makes two rows with one predecessor: a
fork, which is legal. A chain alone cannot show that its end was cut off, nor that a whole log was
made up anew; the receipts that reviewers hold can (audit.py).
"""

from __future__ import annotations

import secrets
import sqlite3
from collections.abc import Iterator
from dataclasses import replace

from tui.consensus.history import current_rulings
from tui.errors import StoreError, UnknownNameError
from tui.model import CHECKS, RULINGS, Ruling, digest
from tui.store import deriving
from tui.store.connect import immediate, refuse_moved
from tui.store.deriving import RULING_COLUMNS, ruling_from
from tui.store.names import checked_utc, findable, id_of, later_utc
from tui.store.settings import read_settings

MAX_NOTE = 4000  # characters: a page of text


def ruling_hash(ruling: Ruling) -> str:
    """The hash of one row: SHA-256 of the canonical JSON of all its fields but the hash."""
    return digest(
        {
            "id": ruling.id,
            "candidate": ruling.candidate,
            "check": ruling.check,
            "reviewer_id": ruling.reviewer_id,
            "ruling": ruling.ruling,
            "note": ruling.note,
            "evidence_digest": ruling.evidence_digest,
            "seen_others": ruling.seen_others,
            "replaces": ruling.replaces,
            "utc": ruling.utc,
            "previous_hash": ruling.previous_hash,
        }
    )


def append_ruling(connection: sqlite3.Connection, ruling: Ruling) -> Ruling:
    """Chain and add one ruling; when this returns, it is on disk and states and outcome follow it.

    The store itself sets what depends on the file at that moment: `seen_others`, `replaces` (the
    reviewer's newest row on this candidate and check), the chain, an id where none is given, the
    digest of today's evidence where none is given; and it moves `utc` past the reviewer's earlier
    rulings on this check, should the clock have run back.

    Raises:
        UnknownNameError: no such candidate, check, ruling or reviewer.
        StoreError: nothing to withdraw, an untestable check (which takes only `unclear`), evidence that
            the queue does not hold, a note too long, a file moved or replaced meanwhile; nothing is written then.
    """
    checked_words(ruling)
    refuse_moved(connection, "nothing was recorded; your note is kept on the screen")
    name = findable(ruling.candidate)
    deriving.ground_of(connection, id_of(connection, name))  # decodes evidence before the lock is held, not under it
    with immediate(connection):
        candidate_id = id_of(connection, name)
        if not connection.execute("SELECT 1 FROM reviewer WHERE id = ?", (ruling.reviewer_id,)).fetchone():
            raise UnknownNameError("reviewer", ruling.reviewer_id, "Join first: plainlight join QUEUE HANDLE.")
        settings = read_settings(connection)
        ground = deriving.ground_of(connection, candidate_id)
        head = newest_of(connection, name, ruling.check, ruling.reviewer_id)
        checked_against(ground, ruling, head)
        chained = replace(
            ruling,
            candidate=name,
            id=ruling.id or secrets.token_hex(16),
            evidence_digest=cited_digest(connection, candidate_id, ruling),
            seen_others=has_others_in_view(ground, ruling.reviewer_id),
            replaces=head.id if head else "",
            utc=later_utc(checked_utc(ruling.utc), head.utc if head else ""),
            previous_hash=last_hash(connection, ruling.reviewer_id),
            hash="",
        )
        chained = replace(chained, hash=ruling_hash(chained))
        insert_ruling(connection, chained)
        forget_draft(connection, candidate_id, chained)
        rulings = [*ground.rulings, chained]
        cited = ground.cited | deriving.cited_of(connection, candidate_id, [(ruling.check, chained.evidence_digest)])
        after = deriving.derive(replace(ground, rulings=rulings, cited=cited), settings)
        deriving.write(connection, candidate_id, after)
    return chained


def checked_words(ruling: Ruling) -> None:
    """Refuse words that the log does not know and notes that it cannot hold."""
    if ruling.check not in CHECKS:
        raise UnknownNameError("check", ruling.check, f"The checks are {', '.join(CHECKS)}.")
    if ruling.ruling not in RULINGS:
        raise UnknownNameError("ruling", ruling.ruling, f"A ruling is one of {', '.join(RULINGS)}.")
    if len(ruling.note) > MAX_NOTE:
        raise StoreError(f"The note has {len(ruling.note)} characters; {MAX_NOTE} is the most. Shorten it.")
    if "\0" in ruling.note:
        raise StoreError("The note holds a NUL character, which cannot be kept; take it out.")


def has_others_in_view(ground: deriving.Ground, reviewer_id: str) -> bool:
    """Whether a ruling made now has others' in view: the seal is open, and someone else has ruled here.

    Every standing that was written kept its open seals, so those on file are all.
    """
    if reviewer_id not in ground.opened:
        return False
    return any(owner != reviewer_id for _, owner in current_rulings(ground.rulings))


def checked_against(ground: deriving.Ground, ruling: Ruling, head: Ruling | None) -> None:
    """Refuse what the rules of the log do not allow at this moment."""
    if ruling.ruling == "withdrawn" and (head is None or head.ruling == "withdrawn"):
        raise StoreError(f"There is no ruling on {ruling.check} of {ruling.candidate} to withdraw.")
    evidence = ground.evidence.get(ruling.check)
    is_untestable = evidence is not None and evidence.adequate is None
    if is_untestable and ruling.ruling not in ("unclear", "withdrawn"):
        raise StoreError(
            f"{ruling.check} of {ruling.candidate} cannot be tested with these data; only unclear can be ruled there."
        )


def cited_digest(connection: sqlite3.Connection, candidate_id: int, ruling: Ruling) -> str:
    """The digest to cite: the one given, which must be on file, else today's, else none."""
    key = (candidate_id, ruling.check)
    if not ruling.evidence_digest:
        query = "SELECT digest FROM evidence WHERE candidate_id = ? AND kind = ? AND is_current = 1"
        row = connection.execute(query, key).fetchone()
        return row[0] if row else ""
    query = "SELECT 1 FROM evidence WHERE candidate_id = ? AND kind = ? AND digest = ?"
    if not connection.execute(query, (*key, ruling.evidence_digest)).fetchone():
        raise StoreError(
            f"The evidence on {ruling.check} of {ruling.candidate} was computed anew meanwhile; look again and repeat."
        )
    return ruling.evidence_digest


def newest_of(connection: sqlite3.Connection, name: str, check: str, reviewer_id: str) -> Ruling | None:
    """The reviewer's newest row on one check, a withdrawal too: not replaced, then latest UTC, then greater id."""
    query = (
        f'SELECT {RULING_COLUMNS} FROM ruling AS r WHERE candidate = ?1 AND "check" = ?2 AND reviewer_id = ?3 '
        'AND NOT EXISTS (SELECT 1 FROM ruling AS n WHERE n.candidate = ?1 AND n."check" = ?2 AND n.replaces = r.id) '
        "ORDER BY utc DESC, id DESC LIMIT 1"
    )
    row = connection.execute(query, (name, check, reviewer_id)).fetchone()
    return ruling_from(row) if row else None


def last_hash(connection: sqlite3.Connection, reviewer_id: str) -> str:
    """The hash that the reviewer's next row follows: of their last to arrive in this file, which no row follows yet."""
    query = "SELECT hash FROM ruling WHERE reviewer_id = ? ORDER BY seq DESC LIMIT 1"
    row = connection.execute(query, (reviewer_id,)).fetchone()
    return row[0] if row else ""


def insert_ruling(connection: sqlite3.Connection, ruling: Ruling) -> None:
    """Add one finished row."""
    connection.execute(
        f"INSERT INTO ruling ({RULING_COLUMNS}) VALUES (?{', ?' * 11})",
        (
            *(ruling.candidate, ruling.check, ruling.reviewer_id, ruling.ruling, ruling.note, ruling.evidence_digest),
            *(int(ruling.seen_others), ruling.replaces, ruling.utc, ruling.id, ruling.previous_hash, ruling.hash),
        ),
    )


def forget_draft(connection: sqlite3.Connection, candidate_id: int, ruling: Ruling) -> None:
    """Drop the draft that became this ruling's note; one that says something else stays."""
    connection.execute(
        'DELETE FROM draft WHERE reviewer_id = ? AND candidate_id = ? AND "check" = ? AND note = ?',
        (ruling.reviewer_id, candidate_id, ruling.check, ruling.note),
    )


def rulings_of(connection: sqlite3.Connection, name: str) -> list[Ruling]:
    """The whole log on one candidate, in order of arrival: the team's, for tally, export and audit."""
    return deriving.rulings_on(connection, id_of(connection, name))


def ruling_log(connection: sqlite3.Connection) -> Iterator[Ruling]:
    """Every ruling of the queue, in order of arrival: the team's, for tally, export and audit."""
    last = 0
    query = f"SELECT {RULING_COLUMNS}, seq FROM ruling WHERE seq > ? ORDER BY seq LIMIT 1000"
    while rows := connection.execute(query, (last,)).fetchall():
        last = rows[-1][-1]
        for *row, _ in rows:
            yield ruling_from(row)


def log_by_candidate(connection: sqlite3.Connection) -> dict[str, list[Ruling]]:
    """Candidate -> its log, for those with any: the team's, for tally and export."""
    log: dict[str, list[Ruling]] = {}
    for ruling in ruling_log(connection):
        log.setdefault(ruling.candidate, []).append(ruling)
    return log
