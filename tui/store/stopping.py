"""Long questions to a queue, given up once nobody waits for the answer."""

from __future__ import annotations

import sqlite3
from collections.abc import Callable, Iterator
from contextlib import contextmanager

STEPS = 50_000  # of SQLite's machine between two looks; under a millisecond's work


@contextmanager
def while_wanted(connection: sqlite3.Connection, is_wanted: Callable[[], bool]) -> Iterator[None]:
    """Within it a question that is no longer wanted ends early, with StoreError; the connection stays good.

    Args:
        is_wanted: asked again and again, in the thread that asks the question.
    """
    was_within = connection.in_transaction
    connection.set_progress_handler(lambda: not is_wanted(), STEPS)
    try:
        yield
    finally:
        connection.set_progress_handler(None, STEPS)
        if connection.in_transaction and not was_within:  # the end of one can be given up too
            connection.execute("ROLLBACK")
