"""Waiting for one's turn at a queue that another program is writing."""

from __future__ import annotations

import sqlite3
from collections.abc import Callable
from random import random
from time import monotonic, sleep

from tui.errors import StoreError
from tui.store.sentences import BUSY_SECONDS, is_busy

LONGEST_PAUSE_S, SHORTEST_PAUSE_S = 0.008, 0.0005  # between two tries for the write lock; a ruling holds it for some ms
NOTICE_S = 2.0  # after which whoever waits is told so; a ruling waits some ms

Hook = Callable[[str], None]


class Patience:
    """One wait: it ends after `BUSY_SECONDS`, and is said once, after `NOTICE_S`."""

    def __init__(self, connection: sqlite3.Connection) -> None:
        self.connection = connection
        self.start = monotonic()
        self.is_said = False

    def wait(self, error: StoreError) -> None:
        """Pause before the next try; the error itself where it is no busy one, or has lasted too long.

        Who has waited longer asks more often: SQLite's own handler sleeps the longer the longer it has waited, so
        that late comers overtake and a few wait for seconds.
        """
        waited = monotonic() - self.start
        if not is_busy(error.__cause__) or waited > BUSY_SECONDS:
            raise error
        if waited > NOTICE_S and not self.is_said:
            self.is_said = True
            say_waiting(self.connection)
        sleep(random() * max(LONGEST_PAUSE_S - waited / 10, SHORTEST_PAUSE_S))


def say_waiting(connection: sqlite3.Connection) -> None:
    """Tell whoever listens at a connection that it waits."""
    hook: Hook | None = getattr(connection, "on_wait", None)
    if hook is not None:
        hook(f"{connection.queue_path} is in use by another program; waiting up to {BUSY_SECONDS:.0f} s")


def patiently(connection: sqlite3.Connection, statement: str) -> sqlite3.Cursor:
    """Execute a statement that takes a lock, as soon as nobody else holds it.

    Raises:
        StoreError: somebody held it for `BUSY_SECONDS`, or SQLite refused for another reason.
    """
    patience = Patience(connection)
    while True:
        connection.execute("PRAGMA busy_timeout = 0")
        try:
            return connection.execute(statement)
        except StoreError as error:
            patience.wait(error)
        finally:
            connection.execute(f"PRAGMA busy_timeout = {BUSY_SECONDS * 1000:.0f}")
