"""Whose turn is what: the candidate that one reviewer is sent to next."""

from __future__ import annotations

import sqlite3
from collections.abc import Collection, Iterator

from tui.store.names import RING_STEPS, ring
from tui.store.settings import read_settings

ON_ANOTHER_SCREEN = (
    "EXISTS (SELECT 1 FROM claim WHERE claim.candidate_id = q.id AND claim.reviewer_id <> :reviewer "
    "AND claim.expires_utc > :now)"
)
PUT_OFF = "EXISTS (SELECT 1 FROM later WHERE later.reviewer_id = :reviewer AND later.candidate_id = q.id)"
Turn = tuple[int, int, str]  # done reviewers, steps on the ring from the reviewer, name


def next_for(connection: sqlite3.Connection, reviewer_id: str, now: str, skip: Collection[str] = ()) -> str | None:
    """The candidate that needs this reviewer most and is on nobody else's screen; None when nothing does.

    Fewest done reviewers first; among equals the one that follows the reviewer on a ring of hashes of
    names, so that people who work at once start far apart. What the reviewer put off comes after all else.
    From quorum - 1 done reviewers on all count as equal: only a candidate whose rulings part needs anyone beyond
    the quorum, and the order would tell that through the seal.
    """
    equal = read_settings(connection).quorum - 1
    for put_off in (0, 1):
        bound = {"reviewer": reviewer_id, "now": now, "put_off": put_off, "start": ring(reviewer_id), "equal": equal}
        turns = [turn for turn in (own_turn(connection, bound, skip), new_turn(connection, bound, skip)) if turn]
        if turns:
            return min(turns)[2]
    return None


def own_turn(connection: sqlite3.Connection, bound: dict[str, object], skip: Collection[str]) -> Turn | None:
    """The first among the candidates that the reviewer began, or has a split to rule again on."""
    query = (
        "SELECT q.done, q.ring, q.name FROM reviewer_row AS v CROSS JOIN queue_row AS q ON q.id = v.candidate_id "
        f"WHERE v.reviewer_id = :reviewer AND v.needs_me = 1 AND NOT {ON_ANOTHER_SCREEN} AND {PUT_OFF} = :put_off"
    )
    rows = connection.execute(query, bound).fetchall()
    return min((turn_of(row, bound) for row in rows if row[2] not in skip), default=None)


def new_turn(connection: sqlite3.Connection, bound: dict[str, object], skip: Collection[str]) -> Turn | None:
    """The first among the candidates that the reviewer never touched: level by level of done reviewers."""
    first: Turn | None = None
    for level in levels(connection):
        if first is not None and level > bound["equal"]:
            first = min(first, first_of_level(connection, bound, level, skip) or first)
        elif first is None:
            first = first_of_level(connection, bound, level, skip)
        if first is not None and first[0] < bound["equal"]:
            return first
    return first


def levels(connection: sqlite3.Connection) -> Iterator[int]:
    """Numbers of done reviewers that candidates in need have, from the lowest."""
    level = -1
    while True:
        row = connection.execute("SELECT MIN(done) FROM queue_row WHERE needs = 1 AND done > ?", (level,)).fetchone()
        if row[0] is None:
            return
        level = row[0]
        yield level


def first_of_level(
    connection: sqlite3.Connection, bound: dict[str, object], level: int, skip: Collection[str]
) -> Turn | None:
    """The first untouched candidate at one number of done reviewers."""
    found = along_the_ring(connection, bound | {"level": level})
    return next((turn_of(row, bound) for row in found if row[2] not in skip), None)


def along_the_ring(connection: sqlite3.Connection, bound: dict[str, object]) -> Iterator[tuple[int, int, str]]:
    """(done, ring, name) of untouched candidates at one level, from the reviewer's place once around."""
    for part in (">=", "<"):
        query = (
            f"SELECT q.done, q.ring, q.name FROM queue_row AS q WHERE q.needs = 1 AND q.done = :level "
            f"AND q.ring {part} :start AND NOT {ON_ANOTHER_SCREEN} AND {PUT_OFF} = :put_off AND NOT EXISTS "
            "(SELECT 1 FROM reviewer_row AS v WHERE v.reviewer_id = :reviewer AND v.candidate_id = q.id) "
            "ORDER BY q.ring"
        )
        cursor = connection.execute(query, bound)
        while (row := cursor.fetchone()) is not None:
            yield row


def turn_of(row: tuple[int, int, str], bound: dict[str, object]) -> Turn:
    """What candidates are compared by."""
    done, place, name = row
    return min(done, bound["equal"]), (place - bound["start"]) % RING_STEPS, name
