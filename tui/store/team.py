"""Where the whole queue stands for the team, nothing sealed: for tally, export and audit only."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator

from tui.consensus.standing import CheckCount
from tui.model import CHECKS
from tui.store.records import TeamRow

PAGE = 1000
COLUMNS = ", ".join(("id", "name", "outcome", "cause", "pending_reason", "done", "touched", *CHECKS))
NO_COUNT = CheckCount()


def team_standing(connection: sqlite3.Connection) -> Iterator[TeamRow]:
    """Every candidate in order of loading, a thousand in memory at a time."""
    last = 0
    query = f"SELECT {COLUMNS} FROM queue_row WHERE id > ? ORDER BY id LIMIT {PAGE}"
    while rows := connection.execute(query, (last,)).fetchall():
        counts = counts_between(connection, last, rows[-1][0])
        last = rows[-1][0]
        for key, name, outcome, cause, reason, done, touched, *states in rows:
            yield TeamRow(
                id=key,
                name=name,
                outcome=outcome,
                cause=cause,
                pending_reason=reason,
                states=dict(zip(CHECKS, states, strict=True)),
                counts={check: counts.get((key, check), NO_COUNT) for check in CHECKS},
                done=done,
                touched=bool(touched),
            )


def counts_between(connection: sqlite3.Connection, after: int, last: int) -> dict[tuple[int, str], CheckCount]:
    """(candidate id, check) -> counts of current rulings, for ids in a range."""
    query = (
        'SELECT candidate_id, "check", explains, short, unclear, revised, stale FROM standing '
        "WHERE candidate_id > ? AND candidate_id <= ?"
    )
    rows = connection.execute(query, (after, last)).fetchall()
    return {(key, check): CheckCount(*rest) for key, check, *rest in rows}


def team_row(connection: sqlite3.Connection, candidate_id: int) -> TeamRow | None:
    """One candidate of `team_standing`, by id."""
    query = f"SELECT {COLUMNS} FROM queue_row WHERE id = ?"
    row = connection.execute(query, (candidate_id,)).fetchone()
    if row is None:
        return None
    counts = counts_between(connection, candidate_id - 1, candidate_id)
    key, name, outcome, cause, reason, done, touched, *states = row
    by_check = {check: counts.get((key, check), NO_COUNT) for check in CHECKS}
    return TeamRow(
        key, name, outcome, cause, reason, dict(zip(CHECKS, states, strict=True)), by_check, done, bool(touched)
    )


def open_to(connection: sqlite3.Connection, reviewer_id: str) -> frozenset[str]:
    """Names of the candidates whose seal is open to a reviewer: those that the desk's tally may name to them."""
    query = "SELECT name FROM seal_opened JOIN candidate ON candidate.id = candidate_id WHERE reviewer_id = ?"
    return frozenset(row[0] for row in connection.execute(query, (reviewer_id,)).fetchall())
