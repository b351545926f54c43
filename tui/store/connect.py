"""The only place that opens a queue file.

The header is read as bytes before SQLite touches the file, so that what is no queue, or is newer
than the program, stays as it is to the byte.
"""

from __future__ import annotations

import os
import shutil
import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from pathlib import Path
from threading import RLock
from typing import Any
from weakref import WeakSet

from tui.errors import StoreError
from tui.store.filesystem import network_type
from tui.store.schema import APPLICATION_ID, SCHEMA_VERSION, migrate
from tui.store.sentences import BUSY_SECONDS, has_moved, moved_sentence, plainly, sentence
from tui.store.waiting import Hook, patiently

MAGIC = b"SQLite format 3\x00"  # sqlite.org/fileformat2.html, section 1.3; the two numbers: offsets 60 and 68


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
    identity: tuple[int, int] | None = None  # device and inode of the file; None where they do not matter
    on_wait: Hook | None = None  # told, in the waiting thread, once a wait for another program has lasted a while

    def close(self) -> None:
        """Close; what SQLite then finds wrong with the file is no news: every answer given was on disk before."""
        with OPENING:
            with suppress(sqlite3.Error):
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
        return bool(OPEN.get(identity_of(path)))
    except StoreError:
        return False


def identity_of(path: str) -> tuple[int, int]:
    """Device and inode of a file. StoreError where there is none any more."""
    try:
        found = os.stat(path)
    except OSError as error:
        raise StoreError(f"{path} cannot be read: {error.strerror}.") from error
    return found.st_dev, found.st_ino


def refuse_moved(connection: sqlite3.Connection, outcome: str = "nothing was recorded") -> None:
    """StoreError where the path of an open queue names another file by now, or none.

    What was written then would lie in a file that nobody finds again.

    Args:
        outcome: what that means to whoever asked.
    """
    if has_moved(connection):
        raise StoreError(moved_sentence(connection, outcome))


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
    if write or (is_writable(path) and shared):
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
    try:
        connection.identity = identity_of(path)
        OPEN.setdefault(connection.identity, WeakSet()).add(connection)
        prepare(connection, write)
    except BaseException:
        connection.close()
        raise
    return connection


def is_writable(path: str) -> bool:
    """Whether this user may write the file, and beside it, where its log lies."""
    return os.access(path, os.W_OK) and os.access(os.path.dirname(os.path.abspath(path)), os.W_OK)


def prepare(connection: QueueConnection, write: bool) -> None:
    """Set what every connection to a queue keeps to; StoreError where another program made it newer meanwhile."""
    version = patiently(connection, "PRAGMA user_version").fetchone()[0]
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
    patiently(connection, "PRAGMA journal_mode = WAL").fetchone()


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
        why = f"{copy} cannot be written, so {path} was not brought up to date; make room beside it."
        raise StoreError(why) from error
    finally:
        source.close()
    shutil.copymode(path, copy)
    return copy


def read_only(path: str) -> sqlite3.Connection:
    """A bare connection for copying; sqlite3.Error where the file cannot be opened.

    Where no log lies beside the file it may make one, so that it can clear it away again at the end.
    """
    leaves_nothing = not os.path.exists(path + "-wal") and is_writable(path)
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
    patiently(connection, "BEGIN IMMEDIATE")
    try:
        refuse_moved(connection)
        yield
        connection.execute("COMMIT")
    except BaseException:
        roll_back(connection)
        raise


def roll_back(connection: sqlite3.Connection) -> None:
    """End a transaction without its changes; a file too damaged even for that keeps them out all the same."""
    if connection.in_transaction:  # a full disk may have rolled it back already
        with suppress(StoreError):
            connection.execute("ROLLBACK")


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
        roll_back(connection)


def listen(hook: Hook | None, connection: sqlite3.Connection | None = None) -> None:
    """Have `hook` told when a connection waits for another program.

    Args:
        connection: None: every connection of this process that has no hook of its own.
    """
    if isinstance(connection, QueueConnection):
        connection.on_wait = hook
    else:
        QueueConnection.on_wait = staticmethod(hook) if hook else None


def data_version(connection: sqlite3.Connection) -> int:
    """A number that changes when another connection has written to the queue."""
    return connection.execute("PRAGMA data_version").fetchone()[0]
