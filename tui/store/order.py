"""Sorting and filtering a million rows for one reader in a fraction of a second.

What a reader sees of a candidate that they never touched follows from very little: every check reads
`todo` or `nodata`, the outcome `sealed`. So a property of all rows is one array with a common value,
overwritten at the exceptions (the reader's own rows, the untestable ones), and a sort is the order of
an index, filtered by such arrays and, where it sorts by one, sorted stably by it. The seal is kept as
in views.py: own rows hold what the reader may read, outcomes are looked at behind `seal_open = 1`.
"""

from __future__ import annotations

import sqlite3
from array import array
from collections.abc import Iterator, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tui.errors import InputError, UnknownNameError
from tui.model import CHECKS, OUTCOMES
from tui.store.connect import snapshot
from tui.store.ids import INDEXED
from tui.store.names import RING_STEPS, folded
from tui.store.records import NOT_RULED, SEALED, UNRESOLVED, Filter

# the order of states in a sort
STATE_RANKS = (SEALED, NOT_RULED, "open", "split", "unclear", "short", "explains", "nodata")
OUTCOME_RANKS = (SEALED, "pending", "unexplained", "explained", "ordinary")
Ids = NDArray[np.int64]
Ranks = NDArray[np.int8]


def whole_order(
    connection: sqlite3.Connection, reviewer_id: str | None, query: str, sort: str, where: Filter
) -> array[int]:
    """The ids that `query` gives in the order of an index, filtered, and sorted by what is no index.

    Raises:
        InputError: no such share.
        UnknownNameError: no such check or outcome in `where`.
    """
    with snapshot(connection):
        ids = ordered(Eyes(connection, reviewer_id), ids_from(connection, query), sort, where)
    return array("q", np.ascontiguousarray(ids).tobytes())


def ordered(eyes: Eyes, ids: Ids, sort: str, where: Filter) -> Ids:
    """Ids in the order of an index, filtered, and sorted by what is no index."""
    for keep in masks(eyes, where):
        ids = ids[keep[ids]]
    if sort not in INDEXED:
        ids = ids[np.argsort(-sort_ranks(eyes, sort)[ids], kind="stable")]
    return ids


def ids_from(connection: sqlite3.Connection, query: str, parameters: Sequence[Any] = ()) -> Ids:
    """The ids that a query gives, in its order; as one text, which is thrice as fast as row by row."""
    text = connection.execute(f"SELECT group_concat(id) FROM ({query})", parameters).fetchone()[0]
    return np.fromstring(text, dtype=np.int64, sep=",") if text else np.zeros(0, dtype=np.int64)


def masks(eyes: Eyes, where: Filter) -> Iterator[NDArray[np.bool_]]:
    """One array over all ids for each test of a filter, each of what the reader may see."""
    if where.unresolved is not None:
        ranks = eyes.states(checked(where.unresolved, CHECKS, "check"))
        yield np.isin(ranks, [STATE_RANKS.index(word) for word in UNRESOLVED])
    if where.outcome is not None:
        yield eyes.outcomes() == OUTCOME_RANKS.index(checked(where.outcome, (*OUTCOMES, SEALED), "outcome"))
    if where.needs_me:
        yield eyes.needs_me() == 1
    if where.stale:
        yield eyes.own("stale > 0") == 1
    if where.mine is not None:
        yield eyes.own("1") == int(where.mine)
    if where.done is not None:
        yield eyes.own("done") == int(where.done)
    if where.later:
        yield eyes.only("SELECT candidate_id AS id FROM later WHERE reviewer_id = ?", eyes.reviewer_id or "")
    if where.text:
        yield eyes.only("SELECT id FROM queue_row WHERE instr(fold, ?) > 0", folded(where.text))
    if where.share is not None:
        yield eyes.only(*share_query(*where.share))
    if where.names is not None:
        yield eyes.named(sorted(where.names))


def checked(word: str, words: Sequence[str], what: str) -> str:
    """The word itself; UnknownNameError if it is none of `words`."""
    if word not in words:
        raise UnknownNameError(what, word, f"There are {', '.join(words)}.")
    return word


def share_query(index: int, of: int) -> tuple[str, int, int, int, int, int]:
    """The candidates of the I-th of N shares: their place on the ring, read without sign, modulo N."""
    if not 1 <= index <= of <= 1_000_000:
        raise InputError(f"A share is I of N with I from 1 to N, not {index} of {of}.")
    query = "SELECT id FROM queue_row WHERE ((ring % ?) + ? + (ring < 0) * ?) % ? = ?"
    return query, of, of, RING_STEPS % of, of, index - 1


def sort_ranks(eyes: Eyes, sort: str) -> Ranks:
    """What a sort compares, over all ids."""
    if sort in CHECKS:
        return eyes.states(sort)
    return {"outcome": eyes.outcomes, "ruled": lambda: eyes.own("ruled"), "needs": eyes.needs_me}[sort]()


class Eyes:
    """Properties of all candidates as one reader may see them, each an int8 array indexed by candidate id."""

    def __init__(self, connection: sqlite3.Connection, reviewer_id: str | None) -> None:
        self.connection = connection
        self.reviewer_id = reviewer_id
        last = connection.execute("SELECT COALESCE(MAX(id), 0) FROM queue_row").fetchone()[0]
        self.size = last + 1

    def states(self, check: str) -> Ranks:
        """Ranks in STATE_RANKS of what the reader sees on a check."""
        if self.reviewer_id is None:
            return np.zeros(self.size, dtype=np.int8)
        ranks = np.full(self.size, STATE_RANKS.index(NOT_RULED), dtype=np.int8)
        untestable = f"SELECT id FROM queue_row WHERE untestable > 0 AND untestable >> {CHECKS.index(check)} & 1"
        ranks[ids_from(self.connection, untestable)] = STATE_RANKS.index("nodata")
        query = f"SELECT candidate_id, {check} FROM reviewer_row WHERE reviewer_id = ?"
        self.overwrite(ranks, query, STATE_RANKS)
        return ranks

    def outcomes(self) -> Ranks:
        """Ranks in OUTCOME_RANKS of the outcome, `sealed` unless the reader's seal is open."""
        ranks = np.zeros(self.size, dtype=np.int8)
        query = (
            "SELECT v.candidate_id, q.outcome FROM reviewer_row AS v "
            "CROSS JOIN queue_row AS q ON q.id = v.candidate_id WHERE v.reviewer_id = ? AND v.seal_open = 1"
        )
        self.overwrite(ranks, query, OUTCOME_RANKS)
        return ranks

    def needs_me(self) -> Ranks:
        """1 where the candidate needs the reader."""
        if self.reviewer_id is None:
            return np.zeros(self.size, dtype=np.int8)
        needs = np.ones(self.size, dtype=np.int8)
        needs[ids_from(self.connection, "SELECT id FROM queue_row WHERE needs = 0")] = 0
        self.overwrite(needs, "SELECT candidate_id, needs_me FROM reviewer_row WHERE reviewer_id = ?")
        return needs

    def own(self, expression: str) -> Ranks:
        """The value of an expression on the reader's own rows, 0 where they have none."""
        values = np.zeros(self.size, dtype=np.int8)
        self.overwrite(values, f"SELECT candidate_id, {expression} FROM reviewer_row WHERE reviewer_id = ?")
        return values

    def overwrite(self, values: Ranks, query: str, words: Sequence[str] = ()) -> None:
        """Put what `query` (id, value) says of the reader's own rows into `values`; words become their ranks."""
        rows = self.connection.execute(query, (self.reviewer_id or "",)).fetchall()
        ranks = {word: rank for rank, word in enumerate(words)}
        for candidate_id, value in rows:
            values[candidate_id] = ranks[value] if words else value

    def only(self, query: str, *parameters: Any) -> NDArray[np.bool_]:
        """True at the ids that a query gives."""
        keep = np.zeros(self.size, dtype=np.bool_)
        keep[ids_from(self.connection, query, parameters)] = True
        return keep

    def named(self, names: Sequence[str]) -> NDArray[np.bool_]:
        """True at the candidates of some names; names that the file lacks are passed over."""
        keep = np.zeros(self.size, dtype=np.bool_)
        for start in range(0, len(names), 500):
            page = names[start : start + 500]
            query = f"SELECT id FROM candidate WHERE name IN ({', '.join('?' * len(page))})"
            keep[ids_from(self.connection, query, page)] = True
        return keep
