"""Who joined the queue. A person is a random id; the handle is a label on it and may change by a further row."""

from __future__ import annotations

import re
import secrets
import sqlite3

from tui.errors import HandleError, UnknownNameError
from tui.model import Reviewer
from tui.store.connect import immediate
from tui.store.names import checked_utc, later_utc

HANDLE_FORM = re.compile(r"[a-z0-9_-]{1,32}")


def checked_handle(handle: str) -> str:
    """The handle itself; HandleError unless it is 1 to 32 of a-z, 0-9, _ and -."""
    if not HANDLE_FORM.fullmatch(handle):
        raise HandleError(handle, f"A handle is 1 to 32 of a-z, 0-9, _ and -; {handle!r} is not.")
    return handle


def add_reviewer(connection: sqlite3.Connection, handle: str, utc: str) -> Reviewer:
    """Join under a handle; the id is random, so that two queues never give one id to two people.

    Raises:
        HandleError: malformed, or somebody has it.
    """
    reviewer = Reviewer(secrets.token_hex(8), checked_handle(handle), checked_utc(utc))
    with immediate(connection):
        if handle in handles(connection).values():
            reason = f"{handle} has joined this queue already; review with --as {handle}, or take another handle."
            raise HandleError(handle, reason)
        connection.execute("INSERT INTO reviewer VALUES (?, ?, ?)", (reviewer.id, handle, reviewer.joined_utc))
    return reviewer


def rename_reviewer(connection: sqlite3.Connection, reviewer_id: str, handle: str, utc: str) -> Reviewer:
    """Give a reviewer another handle, from now on.

    Raises:
        UnknownNameError: nobody has that id.
        HandleError: malformed, or somebody else has it.
    """
    checked_handle(handle)
    with immediate(connection):
        by = handles(connection)
        if reviewer_id not in by:
            raise UnknownNameError("reviewer", reviewer_id)
        if any(held == handle and owner != reviewer_id for owner, held in by.items()):
            raise HandleError(handle, f"{handle} is another reviewer's handle; take another.")
        if by[reviewer_id] != handle:
            query = "SELECT COALESCE(MAX(utc), '') FROM reviewer_rename WHERE reviewer_id = ?"
            last = connection.execute(query, (reviewer_id,)).fetchone()[0]
            row = (reviewer_id, handle, later_utc(checked_utc(utc), last))
            connection.execute("INSERT INTO reviewer_rename VALUES (?, ?, ?)", row)
    return next(one for one in reviewers(connection) if one.id == reviewer_id)


def reviewers(connection: sqlite3.Connection) -> list[Reviewer]:
    """Everyone who joined, by handle; the handle is today's."""
    by = handles(connection)
    rows = connection.execute("SELECT id, joined_utc FROM reviewer").fetchall()
    return sorted((Reviewer(key, by[key], joined) for key, joined in rows), key=lambda one: (one.handle, one.id))


def handles(connection: sqlite3.Connection) -> dict[str, str]:
    """Reviewer id -> today's handle."""
    by = dict(connection.execute("SELECT id, handle FROM reviewer").fetchall())
    by.update(connection.execute("SELECT reviewer_id, handle FROM reviewer_rename ORDER BY utc, handle").fetchall())
    return by


def reviewer_by_handle(connection: sqlite3.Connection, handle: str) -> Reviewer | None:
    """Who has that handle today, or None."""
    return next((one for one in reviewers(connection) if one.handle == handle), None)
