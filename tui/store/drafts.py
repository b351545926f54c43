"""Notes begun and not yet recorded, and where a reviewer was: kept at every keystroke, never gathered."""

from __future__ import annotations

import sqlite3

from tui.errors import StoreError
from tui.store.connect import immediate
from tui.store.names import id_of
from tui.store.rulings import MAX_NOTE


def save_draft(connection: sqlite3.Connection, reviewer_id: str, name: str, check: str, text: str) -> None:
    """Keep what was typed so far; the empty text forgets it. StoreError if it is too long for a note."""
    if len(text) > MAX_NOTE:
        raise StoreError(f"The note has {len(text)} characters; {MAX_NOTE} is the most. Shorten it.")
    with immediate(connection):
        key = (reviewer_id, id_of(connection, name), check)
        if text:
            connection.execute("INSERT OR REPLACE INTO draft VALUES (?, ?, ?, ?)", (*key, text))
        else:
            connection.execute('DELETE FROM draft WHERE reviewer_id = ? AND candidate_id = ? AND "check" = ?', key)


def draft(connection: sqlite3.Connection, reviewer_id: str, name: str, check: str) -> str:
    """What was typed so far on one check; empty if nothing was."""
    return drafts(connection, reviewer_id, name).get(check, "")


def drafts(connection: sqlite3.Connection, reviewer_id: str, name: str) -> dict[str, str]:
    """Check -> what was typed so far, for one candidate."""
    query = 'SELECT "check", note FROM draft WHERE reviewer_id = ? AND candidate_id = ?'
    return dict(connection.execute(query, (reviewer_id, id_of(connection, name))).fetchall())


def save_position(connection: sqlite3.Connection, reviewer_id: str, name: str, check: str) -> None:
    """Keep the candidate and check that a reviewer is at."""
    with immediate(connection):
        row = (reviewer_id, id_of(connection, name), check)
        connection.execute("INSERT OR REPLACE INTO position VALUES (?, ?, ?)", row)


def position(connection: sqlite3.Connection, reviewer_id: str) -> tuple[str, str] | None:
    """The candidate and check that a reviewer was last at, or None."""
    query = 'SELECT name, "check" FROM position JOIN candidate ON candidate.id = candidate_id WHERE reviewer_id = ?'
    return connection.execute(query, (reviewer_id,)).fetchone()
