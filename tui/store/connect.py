"""The only place that opens a queue file.

The header is read as bytes before SQLite touches the file, so that what is no queue, or is newer
than the program, stays as it is to the byte.
"""

from __future__ import annotations

import os
import shutil
import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from random import random
from threading import RLock
from time import monotonic, sleep
from typing import Any
from weakref import WeakSet

from tui.errors import StoreError
from tui.store.filesystem import network_type
from tui.store.schema import APPLICATION_ID, SCHEMA_VERSION, migrate
from tui.store.sentences import BUSY_SECONDS, is_busy, plainly, sentence

MAGIC = b"SQLite format 3\x00"  # sqlite.org/fileformat2.html, section 1.3; the two numbers: offsets 60 and 68
LONGEST_PAUSE_S, SHORTEST_PAUSE_S = 0.008, 0.0005  # between two tries for the write lock; a ruling holds it for some ms


# Closing any descriptor of a file drops all locks that the process holds on it (POSIX; "How To Corrupt An SQLite
# Database File", sqlite.org, section 2.2), and then another process may clear away the log that we still write.
# So a file that this process has open as a queue is never opened and closed beside it: its header was read before.
OPENING = RLock()
OPEN: dict[tuple[int, int], WeakSet[QueueConnection]] = {}  # device and inode -> connections of this process


@dataclass(frozen=True, slots=True)
class Header:
    """What the first hundred bytes of a queue file say."""

    application_id: int
    user_version: int


class Cursor(sqlite3.Cursor):
    """A cursor whose errors are ours: one plain sentence that names the file."""

    def execute(self, *args: Any) -> sqlite3.Cursor:
        with plainly(self.connection):
            return super().execute(*args)

    def executemany(self, *args: Any) -> sqlite3.Cursor:
        with plainly(self.connection):
            return super().executemany(*args)

    def fetchone(self) -> Any:
        with plainly(self.connection):
            return super().fetchone()

    def fetchall(self) -> list[Any]:
        with plainly(self.connection):
            return super().fetchall()


class QueueConnection(sqlite3.Connection):
    """A connection to a queue; errors of SQLite arrive as StoreError."""

    queue_path = ""

    def close(self) -> None:
        with OPENING:
            super().close()
            for held in OPEN.values():
                held.discard(self)

    def cursor(self, factory: type[sqlite3.Cursor] = Cursor) -> sqlite3.Cursor:
        return super().cursor(factory)

    def execute(self, *args: Any) -> sqlite3.Cursor:
        return self.cursor().execute(*args)

    def executemany(self, *args: Any) -> sqlite3.Cursor:
        return self.cursor().executemany(*args)


def open_queue(path: str | os.PathLike[str], *, create: bool = False, write: bool = True) -> QueueConnection:
    """Open a queue, bringing an older one up to date first.

    Args:
        create: make the file if there is none.
        write: False opens it for reading; nothing can be written through the connection.
    Raises:
        StoreError: no such file, no queue, newer than the program, or, for writing, on a network filesystem.
    """
    path = os.fspath(path)
    with OPENING:
        return opened(path, read_header(path, create), write)


def opened(path: str, header: Header | None, write: bool) -> QueueConnection:
    """The rest of `open_queue`, once the header is known."""
    kind = network_type(path)
    if kind and write:
        raise StoreError(
            f"{path} lies on a network filesystem ({kind}), where several writers would damage it. Copy it to a "
            "local disk, review there, and bring the copies together with: plainlight gather."
        )
    if header is None or header.user_version < SCHEMA_VERSION:
        if not write and not os.access(path, os.W_OK):
            raise StoreError(f"{path} is of an older Plainlight and cannot be written here; copy it and open the copy.")
        bring_up_to_date(path, is_new=header is None)
    return connected(path, write=write, shared=not kind)


def read_header(path: str, create: bool = False) -> Header | None:
    """What the file says it is, read as bytes; None where it is to be created.

    Raises:
        StoreError: it is missing (and not to be created), unreadable, no queue, or newer than the program.
    """
    try:
        with OPENING:
            if is_held_open(path):  # read when it was opened; `prepare` sees whether it is still of this version
                return Header(APPLICATION_ID, SCHEMA_VERSION)
            with open(path, "rb") as file:
                head = file.read(100)
    except FileNotFoundError:
        if not create:
            raise StoreError(f"There is no queue {path}. Make one with: plainlight load {path} TABLE.") from None
        if not os.path.isdir(os.path.dirname(os.path.abspath(path))):
            raise StoreError(f"{path}: its directory does not exist; make it first.") from None
        return None
    except OSError as error:
        raise StoreError(f"{path} cannot be read: {error.strerror}.") from error
    if not head and create:
        return None
    header = Header(int.from_bytes(head[68:72], "big"), int.from_bytes(head[60:64], "big"))
    if len(head) < 100 or not head.startswith(MAGIC) or header.application_id != APPLICATION_ID:
        raise StoreError(f"{path} is not a Plainlight queue; it was left untouched.")
    return not_newer(path, header)


def is_held_open(path: str) -> bool:
    """Whether this process has a connection to the file, in whatever thread."""
    try:
        found = os.stat(path)
    except OSError:
        return False
    return bool(OPEN.get((found.st_dev, found.st_ino)))


def not_newer(path: str, header: Header) -> Header:
    """The header itself; StoreError if it is of a newer program."""
    if header.user_version > SCHEMA_VERSION:
        raise StoreError(
            f"{path} was written by a newer Plainlight (file version {header.user_version}, this program knows "
            f"{SCHEMA_VERSION}); it was left untouched. Bring the program up to date."
        )
    return header


def connected(path: str, *, write: bool, shared: bool = True) -> QueueConnection:
    """A connection to a queue that is up to date."""
    quoted = Path(path).absolute().as_uri()
    writable = os.access(path, os.W_OK) and os.access(os.path.dirname(os.path.abspath(path)), os.W_OK)
    if write or (writable and shared):
        query = "?mode=rw"
    else:
        query = "?mode=ro" if os.path.exists(path + "-wal") else "?immutable=1"
    try:
        connection = sqlite3.connect(
            quoted + query, uri=True, timeout=BUSY_SECONDS, isolation_level=None, factory=QueueConnection
        )
    except sqlite3.Error as error:
        raise StoreError(sentence(path, error)) from error
    connection.queue_path = path
    found = os.stat(path)
    OPEN.setdefault((found.st_dev, found.st_ino), WeakSet()).add(connection)
    try:
        prepare(connection, write)
    except BaseException:
        connection.close()
        raise
    return connection


def prepare(connection: QueueConnection, write: bool) -> None:
    """Set what every connection to a queue keeps to; StoreError where another program made it newer meanwhile."""
    version = connection.execute("PRAGMA user_version").fetchone()[0]
    not_newer(connection.queue_path, Header(APPLICATION_ID, version))
    connection.execute("PRAGMA foreign_keys = ON")
    connection.execute("PRAGMA recursive_triggers = ON")
    connection.execute("PRAGMA synchronous = FULL")
    connection.execute("PRAGMA cache_size = -32768")  # KiB
    if not write:
        connection.execute("PRAGMA query_only = ON")
    elif connection.execute("PRAGMA journal_mode").fetchone()[0] != "wal":  # a backup starts without a log
        use_log(connection)


def use_log(connection: QueueConnection) -> None:
    """Turn on the write-ahead log; SQLite does not wait for others who do the same, so this does."""
    deadline = monotonic() + BUSY_SECONDS
    while True:
        try:
            connection.execute("PRAGMA journal_mode = WAL").fetchone()
            return
        except StoreError as error:
            if not is_busy(error.__cause__) or monotonic() > deadline:
                raise
            sleep(0.01)


def bring_up_to_date(path: str, *, is_new: bool) -> None:
    """Create the tables, or copy an older file to NAME.vN.bak and run the migrations it lacks."""
    try:
        where = os.path.abspath(path)  # so that no name of a file has a meaning of its own to SQLite
        connection = sqlite3.connect(where, timeout=BUSY_SECONDS, isolation_level=None, factory=QueueConnection)
    except sqlite3.Error as error:
        raise StoreError(sentence(path, error)) from error
    connection.queue_path = path
    try:
        if is_new:  # on disk before the log is: whoever looks at the header meanwhile sees a queue
            connection.execute(f"PRAGMA application_id = {APPLICATION_ID}")
        use_log(connection)
        with immediate(connection):
            version = connection.execute("PRAGMA user_version").fetchone()[0]
            if 0 < version < SCHEMA_VERSION:
                keep_copy(path, version)
            if version < SCHEMA_VERSION:
                migrate(connection)
        connection.execute("PRAGMA wal_checkpoint(TRUNCATE)").fetchone()  # so that the header in the file tells
    finally:
        connection.close()


def keep_copy(path: str, version: int) -> str:
    """Copy a queue beside itself as NAME.vN.bak, never over an earlier copy; the path of the copy."""
    copy = f"{path}.v{version}.bak"
    number = 1
    while os.path.exists(copy):
        number += 1
        copy = f"{path}.v{version}.{number}.bak"
    source = read_only(path)
    try:
        write_copy(source, copy)
        flush(copy)
    except sqlite3.Error as error:
        raise StoreError(f"{copy} cannot be written ({error}), so {path} was not brought up to date.") from error
    finally:
        source.close()
    shutil.copymode(path, copy)
    return copy


def read_only(path: str) -> sqlite3.Connection:
    """A bare connection for copying; sqlite3.Error where the file cannot be opened.

    Where no log lies beside the file it may make one, so that it can clear it away again at the end.
    """
    folder = os.path.dirname(os.path.abspath(path))
    leaves_nothing = not os.path.exists(path + "-wal") and os.access(path, os.W_OK) and os.access(folder, os.W_OK)
    mode = "rw" if leaves_nothing else "ro"
    connection = sqlite3.connect(f"{Path(path).absolute().as_uri()}?mode={mode}", uri=True, timeout=BUSY_SECONDS)
    connection.execute("PRAGMA query_only = ON")
    return connection


def in_memory() -> sqlite3.Connection:
    """A bare connection to nothing, for making a schema to compare with."""
    return sqlite3.connect(":memory:", isolation_level=None)


def write_copy(source: sqlite3.Connection, path: str) -> None:
    """Write one state of a queue to one file of its own, while others go on writing; sqlite3.Error if it fails.

    Whoever means to keep the file calls `flush` on it.
    """
    target = sqlite3.connect(path, isolation_level=None)
    try:
        target.execute("PRAGMA synchronous = OFF")
        source.backup(target)  # all pages in one step: one state
        target.execute("PRAGMA journal_mode = DELETE").fetchone()  # nothing beside the one file
    finally:
        target.close()


def flush(path: str) -> None:
    """Make sure that a file is on disk."""
    with open(path, "rb") as file:
        os.fsync(file.fileno())


@contextmanager
def immediate(connection: sqlite3.Connection) -> Iterator[None]:
    """One transaction that holds the write lock from its start: COMMIT at the end, else ROLLBACK.

    Within another such transaction it joins that one, which alone commits.
    """
    if connection.in_transaction:
        yield
        return
    begin(connection)
    try:
        yield
        connection.execute("COMMIT")
    except BaseException:
        if connection.in_transaction:  # a full disk may have rolled it back already
            connection.execute("ROLLBACK")
        raise


def begin(connection: sqlite3.Connection) -> None:
    """BEGIN IMMEDIATE, in a fairer order than SQLite's own waiting gives.

    SQLite's busy handler sleeps the longer the longer it has waited, so that late comers overtake and
    a few wait for seconds. Here who has waited longer asks more often.
    """
    start = monotonic()
    connection.execute("PRAGMA busy_timeout = 0")
    try:
        while True:
            try:
                connection.execute("BEGIN IMMEDIATE")
                return
            except StoreError as error:
                waited = monotonic() - start
                if not is_busy(error.__cause__) or waited > BUSY_SECONDS:
                    raise
            sleep(random() * max(LONGEST_PAUSE_S - waited / 10, SHORTEST_PAUSE_S))
    finally:
        connection.execute(f"PRAGMA busy_timeout = {BUSY_SECONDS * 1000:.0f}")


@contextmanager
def snapshot(connection: sqlite3.Connection) -> Iterator[None]:
    """Several reads of one state of the file, whatever others write meanwhile."""
    if connection.in_transaction:
        yield
        return
    connection.execute("BEGIN")
    try:
        yield
    finally:
        if connection.in_transaction:
            connection.execute("ROLLBACK")


def data_version(connection: sqlite3.Connection) -> int:
    """A number that changes when another connection has written to the queue."""
    return connection.execute("PRAGMA data_version").fetchone()[0]
