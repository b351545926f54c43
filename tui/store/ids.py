"""Which candidates, and in which order: ids alone, a million at a time or just the first few.

The first few come straight from an index and without numpy, which takes longer to import than all else
that the first lines of a list need; whole lists are order.py's.
"""

from __future__ import annotations

import sqlite3
from array import array
from collections.abc import Sequence
from typing import Any

from tui.errors import InputError
from tui.store.names import folded
from tui.store.records import SORTS, Filter

FEW = 1000  # ids up to which reading row by row costs nothing
INDEXED = {  # sorts that are the order of an index
    "oddness": "oddness DESC, id",
    "name": "fold DESC, id DESC",
    "band": "odd_band DESC, oddness DESC, id",
    "pull": "odd_pull DESC, id",
}


def view_order(
    connection: sqlite3.Connection,
    reviewer_id: str | None,
    *,
    sort: str = "oddness",
    descending: bool = True,
    where: Filter | None = None,
    limit: int | None = None,
) -> array[int]:
    """Ids of the candidates that `where` lets through, sorted, as this reader may know them.

    Args:
        sort: one of `SORTS`; a check sorts by the state that the reader sees there. Ties fall by oddness.
        limit: only the first so many; at once where the sort is an index, descending, and nothing is filtered.
    Raises:
        InputError: no such sort or share.
        UnknownNameError: no such check or outcome in `where`.
    """
    if sort not in SORTS:
        raise InputError(f"There is no sort {sort!r}; there are {', '.join(SORTS)}.")
    query = f"SELECT id FROM queue_row ORDER BY {INDEXED.get(sort, INDEXED['oddness'])}"
    if limit is not None and where in (None, Filter()) and sort in INDEXED and descending:
        return listed(connection, query, (), limit)
    from tui.store.order import whole_order

    whole = whole_order(connection, reviewer_id, query, sort, where or Filter())
    return (whole if descending else whole[::-1])[:limit]


def find_prefix(connection: sqlite3.Connection, text: str, limit: int = -1) -> array[int]:
    """Ids of the candidates whose name starts with `text`, case ignored, by name; all for an empty text.

    Args:
        limit: only the first so many; -1 for all.
    """
    start = folded(text)
    query = "SELECT id FROM queue_row WHERE fold >= ? AND fold < ? ORDER BY fold, id"
    return listed(connection, query, (start, start + "\U0010ffff"), limit)


def find_substring(connection: sqlite3.Connection, text: str) -> array[int]:
    """Ids of the candidates whose name holds `text`, case ignored, by name."""
    query = "SELECT id FROM queue_row INDEXED BY queue_row_fold WHERE instr(fold, ?) > 0 ORDER BY fold, id"
    return listed(connection, query, (folded(text),))


def listed(connection: sqlite3.Connection, query: str, parameters: Sequence[Any], limit: int = -1) -> array[int]:
    """The ids that a query gives, in its order; the first `limit`, or all for -1."""
    if 0 <= limit <= FEW:
        return array("q", [one for (one,) in connection.execute(f"{query} LIMIT {int(limit)}", parameters).fetchall()])
    from tui.store.order import ids_from

    return array("q", ids_from(connection, f"{query} LIMIT {int(limit)}", parameters).tobytes())
