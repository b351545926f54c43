"""How names are kept, found and spread over a queue."""

from __future__ import annotations

import hashlib
import sqlite3
import unicodedata
from datetime import datetime, timedelta

from tui.errors import InputError, UnknownNameError

LAST_YEAR = 8999  # so that there is always a later time
MAX_NAME = 200  # characters
RING_STEPS = 1 << 64
UTC_FORM = "%Y-%m-%dT%H:%M:%S.%fZ"


def normal_name(text: str) -> str:
    """A candidate's name as the queue keeps it: NFC, case kept.

    Raises:
        InputError: empty, longer than 200 characters, or with a NUL or half a surrogate pair in it.
    """
    name = unicodedata.normalize("NFC", text)
    if not name.strip():
        raise InputError("A candidate needs a name; this one is empty.")
    if len(name) > MAX_NAME:
        raise InputError(f"The name {name[:40]!r}... has {len(name)} characters; {MAX_NAME} is the most.")
    if "\0" in name or any("\ud800" <= char <= "\udfff" for char in name):
        raise InputError(f"The name {name!r} holds a character that cannot be stored; mend its encoding.")
    return name


def folded(text: str) -> str:
    """The form in which names are searched: NFC and case folded."""
    return unicodedata.normalize("NFC", text).casefold()


def ring(text: str) -> int:
    """A place on a ring of `RING_STEPS`, from the text alone: signed, as SQLite holds integers."""
    return int.from_bytes(hashlib.sha256(text.encode("utf-8", "surrogatepass")).digest()[:8], "big", signed=True)


def id_of(connection: sqlite3.Connection, name: str) -> int:
    """The id of a candidate in this file; UnknownNameError if it holds none of that name."""
    row = connection.execute("SELECT id FROM candidate WHERE name = ?", (findable(name),)).fetchone()
    if row is None:
        raise UnknownNameError("candidate", name, "plainlight list QUEUE shows the names.")
    return row[0]


def findable(name: str) -> str:
    """A name as typed, in the form that could be in the file; text that cannot be a name is none of its names."""
    try:
        return normal_name(name)
    except InputError:
        raise UnknownNameError("candidate", name) from None


def later_utc(utc: str, than: str) -> str:
    """`utc`, or one microsecond after `than` where that is no earlier: logs of one file never run backwards.

    >>> later_utc("2026-01-01T00:00:00.000000Z", "2026-01-01T00:00:00.000000Z")
    '2026-01-01T00:00:00.000001Z'
    """
    if not than or utc > than:
        return utc
    return (datetime.strptime(than, UTC_FORM) + timedelta(microseconds=1)).strftime(UTC_FORM)


def is_time(utc: str) -> bool:
    """Whether a text is a time as the logs keep it."""
    try:
        return checked_utc(utc) == utc
    except InputError:
        return False


def checked_utc(utc: str) -> str:
    """`utc` itself; InputError unless it is like 2026-01-31T23:59:59.000000Z, which sorts as text."""
    try:
        moment = datetime.strptime(utc, UTC_FORM)
        if moment.year > LAST_YEAR:
            raise ValueError(utc)
    except ValueError:
        raise InputError(f"A time is written like 2026-01-31T23:59:59.000000Z, not {utc!r}.") from None
    return moment.strftime(UTC_FORM)
