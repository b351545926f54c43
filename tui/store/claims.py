"""Who is looking at what, so that two people are not sent to one candidate; and what a reviewer put off.

A claim is advice, not a lock: it runs out after 15 minutes, and anybody may open and rule a claimed
candidate by name. Claims are never gathered.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Collection
from datetime import datetime, timedelta

from tui.store.connect import immediate
from tui.store.names import UTC_FORM, checked_utc, id_of
from tui.store.reviewers import handles

CLAIM_MINUTES = 15


def claim(connection: sqlite3.Connection, name: str, reviewer_id: str, now: str) -> bool:
    """Say that a reviewer looks at a candidate from `now` on; whether nobody else was looking."""
    moment = datetime.strptime(checked_utc(now), UTC_FORM)
    until = (moment + timedelta(minutes=CLAIM_MINUTES)).strftime(UTC_FORM)
    with immediate(connection):
        candidate_id = id_of(connection, name)
        connection.execute("DELETE FROM claim WHERE expires_utc <= ?", (now,))
        others = "SELECT 1 FROM claim WHERE candidate_id = ? AND reviewer_id <> ? LIMIT 1"
        is_alone = connection.execute(others, (candidate_id, reviewer_id)).fetchone() is None
        connection.execute("INSERT OR REPLACE INTO claim VALUES (?, ?, ?)", (candidate_id, reviewer_id, until))
    return is_alone


def release(connection: sqlite3.Connection, name: str, reviewer_id: str) -> None:
    """Say that a reviewer looks at a candidate no longer."""
    with immediate(connection):
        row = (id_of(connection, name), reviewer_id)
        connection.execute("DELETE FROM claim WHERE candidate_id = ? AND reviewer_id = ?", row)


def release_all(connection: sqlite3.Connection, reviewer_id: str) -> None:
    """Say that a reviewer looks at nothing any more."""
    with immediate(connection):
        connection.execute("DELETE FROM claim WHERE reviewer_id = ?", (reviewer_id,))


def claimed(connection: sqlite3.Connection, now: str) -> dict[str, tuple[str, ...]]:
    """Candidate name -> ids of the reviewers who are looking at it."""
    query = (
        "SELECT name, reviewer_id FROM claim JOIN candidate ON candidate.id = candidate_id "
        "WHERE expires_utc > ? ORDER BY name, reviewer_id"
    )
    found: dict[str, tuple[str, ...]] = {}
    for name, reviewer_id in connection.execute(query, (now,)).fetchall():
        found[name] = (*found.get(name, ()), reviewer_id)
    return found


def others_looking(connection: sqlite3.Connection, name: str, reviewer_id: str | None, now: str) -> list[str]:
    """Handles of the others who are looking at a candidate; a claim says nothing of what anyone ruled."""
    found = handles(connection)
    query = "SELECT reviewer_id FROM claim WHERE candidate_id = ? AND reviewer_id IS NOT ? AND expires_utc > ?"
    rows = connection.execute(query, (id_of(connection, name), reviewer_id, now)).fetchall()
    return sorted(found.get(other, other) for (other,) in rows)


def claim_next(
    connection: sqlite3.Connection, reviewer_id: str, now: str, skip: Collection[str] = ()
) -> str | None:
    """Find the next candidate for a reviewer and claim it in one transaction: two at once get different ones."""
    from tui.store.turns import next_for

    with immediate(connection):
        name = next_for(connection, reviewer_id, now, skip)
        if name is not None:
            claim(connection, name, reviewer_id, now)
    return name


def put_off(connection: sqlite3.Connection, reviewer_id: str, name: str) -> None:
    """Come back to a candidate later: it is offered after all others, until `take_up`."""
    with immediate(connection):
        row = (reviewer_id, id_of(connection, name))
        connection.execute("INSERT OR REPLACE INTO later VALUES (?, ?)", row)


def take_up(connection: sqlite3.Connection, reviewer_id: str, name: str) -> None:
    """Undo `put_off`."""
    with immediate(connection):
        row = (reviewer_id, id_of(connection, name))
        connection.execute("DELETE FROM later WHERE reviewer_id = ? AND candidate_id = ?", row)


def put_off_names(connection: sqlite3.Connection, reviewer_id: str) -> list[str]:
    """What the reviewer put off, by name."""
    query = "SELECT name FROM later JOIN candidate ON candidate.id = candidate_id WHERE reviewer_id = ? ORDER BY name"
    return [row[0] for row in connection.execute(query, (reviewer_id,)).fetchall()]
