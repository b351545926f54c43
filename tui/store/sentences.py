"""What SQLite's errors mean to the person at the queue."""

from __future__ import annotations

import os
import sqlite3

from tui.errors import StoreError

BUSY_SECONDS = 60.0


class plainly:  # noqa: N801 - reads as a word at its use
    """Turn an error of SQLite into a StoreError; cheaper than a generator, as it wraps every statement."""

    def __init__(self, connection: sqlite3.Connection) -> None:
        self.connection = connection

    def __enter__(self) -> None:
        return None

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, trace: object) -> None:
        if isinstance(error, sqlite3.Error):
            raise StoreError(told(self.connection, error)) from error
        if isinstance(error, UnicodeEncodeError):
            raise StoreError("Text with half a surrogate pair cannot be stored; mend its encoding.") from error


def told(connection: sqlite3.Connection, error: sqlite3.Error) -> str:
    """What went wrong at an open queue; one whose file was taken from under it is not the damaged one."""
    if has_moved(connection):
        return moved_sentence(connection, "nothing was recorded")
    return sentence(getattr(connection, "queue_path", ""), error)


def has_moved(connection: sqlite3.Connection) -> bool:
    """Whether the path of an open queue names another file than the open one, or none."""
    identity = getattr(connection, "identity", None)
    if identity is None:
        return False
    try:
        found = os.stat(connection.queue_path)
    except OSError:
        return True
    return (found.st_dev, found.st_ino) != identity


def moved_sentence(connection: sqlite3.Connection, outcome: str) -> str:
    """That the file was taken from under an open connection, and what that means to whoever asked."""
    return f"{connection.queue_path} was moved, deleted or replaced while open; {outcome}."


def sentence(path: str, error: sqlite3.Error) -> str:
    """What went wrong with the queue file, and the mend."""
    text = str(error)
    if "locked" in text or "busy" in text:
        return f"{path} stayed locked for {BUSY_SECONDS:.0f} s; nothing was written. Repeat it a little later."
    if "full" in text:
        return f"{path}: the disk is full; nothing was written. Make room and repeat."
    if "readonly" in text or "read-only" in text:
        return f"{path} cannot be written here; check its permissions and its directory's."
    if "malformed" in text or "not a database" in text or "disk image" in text:
        return f"{path} is damaged ({text}). Keep it, and start again from a backup."
    if "unable to open" in text:
        return f"{path} cannot be opened; check that it exists and may be read."
    return f"{path} refused: {text}."


def is_busy(error: BaseException | None) -> bool:
    """Whether SQLite refused because somebody else holds a lock."""
    return isinstance(error, sqlite3.Error) and getattr(error, "sqlite_errorcode", 0) & 0xFF == sqlite3.SQLITE_BUSY
