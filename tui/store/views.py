"""The queue as one reader may see it.

The seal is kept by construction. States come from `reviewer_row`, which holds only what that reviewer
may read, or, where the reviewer has no row, read `todo` (`nodata` where the evidence is untestable);
the team's outcome is looked at behind `seal_open = 1` alone; a reader without a handle gets constants.
Sorts, filters and counts are built from the same expressions as the rows.
"""

from __future__ import annotations

import math
import sqlite3
from array import array
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

from tui.consensus.seal import SEALED, TODO
from tui.errors import InputError, UnknownNameError
from tui.model import CHECKS, OUTCOMES
from tui.store.candidate_view import standing_for, story
from tui.store.deriving import checks_of
from tui.store.names import RING_STEPS, folded
from tui.store.records import SORTS, Filter, QueueRow
from tui.store.team import team_standing
from tui.store.turns import next_for

__all__ = [
    "find_prefix", "find_substring", "next_for", "standing_for", "story", "team_standing", "view_counts", "view_order",
    "view_rows",
]  # fmt: skip

UNRESOLVED = ("open", "split", TODO, SEALED)
RANKS = (SEALED, TODO, "open", "split", "unclear", "short", "explains", "nodata")  # order of states in a sort
OUTCOME_RANKS = (SEALED, "pending", "unexplained", "explained", "ordinary")
TESTABLE = f"({len(CHECKS)} - " + " - ".join(f"(q.untestable >> {bit} & 1)" for bit in range(len(CHECKS))) + ")"


@dataclass(frozen=True, slots=True)
class Sight:
    """The SQL of what one reader may see: the joined tables and one expression a column."""

    tables: str
    parameters: tuple[Any, ...]
    states: dict[str, str]
    outcome: str
    mine: str
    ruled: str
    stale: str
    needs_me: str
    done: str
    seal_open: str


def sight(reviewer_id: str | None) -> Sight:
    """What a reviewer, or a reader without a handle, may see."""
    if reviewer_id is None:
        sealed = f"'{SEALED}'"
        return Sight("queue_row AS q", (), dict.fromkeys(CHECKS, sealed), sealed, *["(0 + 0)"] * 6)  # no bare number: ORDER BY would take it for a column
    states = {
        check: f"COALESCE(v.{check}, CASE WHEN q.untestable >> {bit} & 1 THEN 'nodata' ELSE '{TODO}' END)"
        for bit, check in enumerate(CHECKS)
    }
    return Sight(
        tables="queue_row AS q LEFT JOIN reviewer_row AS v ON v.reviewer_id = ? AND v.candidate_id = q.id",
        parameters=(reviewer_id,),
        states=states,
        outcome=f"CASE WHEN v.seal_open = 1 THEN q.outcome ELSE '{SEALED}' END",
        mine="(v.reviewer_id IS NOT NULL)",
        ruled="COALESCE(v.ruled, 0)",
        stale="COALESCE(v.stale, 0)",
        needs_me="COALESCE(v.needs_me, q.needs)",
        done="COALESCE(v.done, 0)",
        seal_open="COALESCE(v.seal_open, 0)",
    )


def view_order(
    connection: sqlite3.Connection,
    reviewer_id: str | None,
    *,
    sort: str = "oddness",
    descending: bool = True,
    where: Filter | None = None,
) -> array[int]:
    """Ids of the candidates that `where` lets through, sorted, as this reader may know them.

    Args:
        sort: one of `SORTS`; a check sorts by the state that the reader sees there.
    Raises:
        InputError: no such sort, check or outcome.
    """
    seen = sight(reviewer_id)
    tests, parameters = conditions(seen, where or Filter(), reviewer_id)
    query = f"SELECT q.id FROM {tables_for(seen, sort, tests)}"
    bound = seen.parameters if "reviewer_row" in query else ()
    if tests:
        query += " WHERE " + " AND ".join(tests)
    return ids_from(connection, f"{query} ORDER BY {ordering(seen, sort, descending)}", (*bound, *parameters))


def tables_for(seen: Sight, sort: str, tests: Iterable[str]) -> str:
    """The tables that a query needs: the reader's own only where a sort or a test looks at it."""
    needs_own = any("v." in test for test in (*tests, *sort_keys(seen, sort)))
    return seen.tables if needs_own else "queue_row AS q"


def sort_keys(seen: Sight, sort: str) -> tuple[str, ...]:
    """The expressions that a sort compares."""
    if sort not in SORTS:
        raise InputError(f"There is no sort {sort!r}; there are {', '.join(SORTS)}.")
    if sort in CHECKS:
        return (ranked(seen.states[sort], RANKS),)
    return {
        "oddness": ("q.oddness",),
        "name": ("q.fold",),
        "band": ("q.odd_band", "q.oddness"),
        "pull": ("q.odd_pull",),
        "outcome": (ranked(seen.outcome, OUTCOME_RANKS),),
        "ruled": (seen.ruled,),
        "needs": (seen.needs_me, "q.oddness"),
    }[sort]


def ordering(seen: Sight, sort: str, descending: bool) -> str:
    """The ORDER BY of a sort; ties fall in order of loading, reversed with the rest."""
    way, ties = ("DESC", "ASC") if descending else ("ASC", "DESC")
    if sort == "name":
        ties = way
    return ", ".join([*(f"{key} {way}" for key in sort_keys(seen, sort)), f"q.id {ties}"])


def ranked(expression: str, order: Sequence[str]) -> str:
    """An expression whose words sort in a given order."""
    cases = " ".join(f"WHEN '{word}' THEN {place}" for place, word in enumerate(order))
    return f"CASE {expression} {cases} END"


def conditions(seen: Sight, where: Filter, reviewer_id: str | None) -> tuple[list[str], list[Any]]:
    """The tests of a filter, each of what the reader may see, and their parameters in order."""
    tests: list[str] = []
    parameters: list[Any] = []

    def test(sql: str, *values: Any) -> None:
        tests.append(sql)
        parameters.extend(values)

    if where.unresolved is not None:
        words = ", ".join(f"'{word}'" for word in UNRESOLVED)
        test(f"{seen.states[checked(where.unresolved, CHECKS, 'check')]} IN ({words})")
    if where.outcome is not None:
        test(f"{seen.outcome} = ?", checked(where.outcome, (*OUTCOMES, SEALED), "outcome"))
    if where.needs_me:
        test(f"{seen.needs_me} = 1")
    if where.stale:
        test(f"{seen.stale} > 0")
    if where.mine is not None:
        test(f"{seen.mine} = {int(where.mine)}")
    if where.done is not None:
        test(f"{seen.done} = {int(where.done)}")
    if where.later:
        test("q.id IN (SELECT candidate_id FROM later WHERE reviewer_id = ?)", reviewer_id or "")
    if where.text:
        test("instr(q.fold, ?) > 0", folded(where.text))
    if where.share is not None:
        test(*share_test(*where.share))
    if where.names is not None:
        marks = ", ".join("?" * len(where.names))
        test(f"q.name IN ({marks})", *sorted(where.names))
    return tests, parameters


def checked(word: str, words: Sequence[str], what: str) -> str:
    """The word itself; UnknownNameError if it is none of `words`."""
    if word not in words:
        raise UnknownNameError(what, word, f"There are {', '.join(words)}.")
    return word


def share_test(index: int, of: int) -> tuple[str, int, int, int, int, int]:
    """The test that a candidate falls in the I-th of N shares: its place on the ring, read without sign, modulo N."""
    if not 1 <= index <= of <= 1_000_000:
        raise InputError(f"A share is I of N with I from 1 to N, not {index} of {of}.")
    return "((q.ring % ?) + ? + (q.ring < 0) * ?) % ? = ?", of, of, RING_STEPS % of, of, index - 1


def ids_from(connection: sqlite3.Connection, query: str, parameters: Sequence[Any]) -> array[int]:
    """The ids that a query gives, 8 bytes each."""
    ids: array[int] = array("q")
    cursor = connection.execute(query, parameters)
    while rows := cursor.fetchmany(20_000):
        ids.extend(row[0] for row in rows)
    return ids


def find_prefix(connection: sqlite3.Connection, text: str) -> array[int]:
    """Ids of the candidates whose name starts with `text`, case ignored, by name; all for an empty text."""
    start = folded(text)
    query = "SELECT id FROM queue_row WHERE fold >= ? AND fold < ? ORDER BY fold, id"
    return ids_from(connection, query, (start, start + "\U0010ffff"))


def find_substring(connection: sqlite3.Connection, text: str) -> array[int]:
    """Ids of the candidates whose name holds `text`, case ignored, by name."""
    query = "SELECT id FROM queue_row INDEXED BY queue_row_fold WHERE instr(fold, ?) > 0 ORDER BY fold, id"
    return ids_from(connection, query, (folded(text),))


def view_rows(connection: sqlite3.Connection, reviewer_id: str | None, ids: Sequence[int]) -> list[QueueRow]:
    """One row for each id, in the order asked; ids that the file lacks are left out."""
    seen = sight(reviewer_id)
    columns = ", ".join(
        [
            *("q.id", "q.name", "q.oddness", "q.odd_band", "q.odd_pull", seen.outcome, seen.ruled, TESTABLE),
            *(seen.needs_me, seen.done, seen.seal_open, seen.stale, *seen.states.values()),
        ]
    )
    found: dict[int, QueueRow] = {}
    for start in range(0, len(ids), 500):
        page = list(ids[start : start + 500])
        query = f"SELECT {columns} FROM {seen.tables} WHERE q.id IN ({', '.join('?' * len(page))})"
        for row in connection.execute(query, (*seen.parameters, *page)).fetchall():
            found[row[0]] = queue_row(row)
    return [found[one] for one in ids if one in found]


def queue_row(row: Sequence[Any]) -> QueueRow:
    """One row of the query of `view_rows`."""
    key, name, odd, band, pull, outcome, ruled, to_rule, needs_me, done, seal_open, stale, *states = row
    return QueueRow(
        id=key,
        name=name,
        oddness=math.nan if odd is None else odd,
        odd_band=band,
        odd_pull=math.nan if pull is None else pull,
        states=dict(zip(CHECKS, states, strict=True)),
        stale=frozenset(checks_of(stale)),
        outcome=outcome,
        ruled=ruled,
        to_rule=to_rule,
        needs_me=bool(needs_me),
        done=bool(done),
        seal_open=bool(seal_open),
    )


def view_counts(connection: sqlite3.Connection, reviewer_id: str | None) -> dict[str, int]:
    """How many candidates each filter would show this reader.

    Keys: `all`, `needs_me`, `done`, `mine`, `stale`, `later`, `unresolved:CHECK`, `outcome:WORD`. Counted from the
    reader's own rows and from what all other rows have in common, not row by row.
    """
    total = scalar(connection, "SELECT COUNT(*) FROM queue_row")
    if reviewer_id is None:
        counts = {"all": total, "needs_me": 0, "done": 0, "mine": 0, "stale": 0, "later": 0}
        return counts | {f"unresolved:{check}": total for check in CHECKS} | {f"outcome:{SEALED}": total}
    own = own_counts(connection, reviewer_id)
    counts = {"all": total, "done": own["done"], "mine": own["mine"], "stale": own["stale"]}
    counts["later"] = scalar(connection, "SELECT COUNT(*) FROM later WHERE reviewer_id = ?", reviewer_id)
    counts["needs_me"] = scalar(connection, "SELECT COUNT(*) FROM queue_row WHERE needs = 1")
    counts["needs_me"] += own["needs_me"] - own["needs"]
    for bit, check in enumerate(CHECKS):
        untestable = f"SELECT COUNT(*) FROM queue_row WHERE untestable > 0 AND untestable >> {bit} & 1"
        elsewhere = total - own["mine"] - (scalar(connection, untestable) - own[f"untestable:{check}"])
        counts[f"unresolved:{check}"] = elsewhere + own[f"unresolved:{check}"]
    for outcome in OUTCOMES:
        counts[f"outcome:{outcome}"] = own[f"outcome:{outcome}"]
    counts[f"outcome:{SEALED}"] = total - sum(own[f"outcome:{outcome}"] for outcome in OUTCOMES)
    return counts


def own_counts(connection: sqlite3.Connection, reviewer_id: str) -> dict[str, int]:
    """The same over the candidates on which the reviewer has a row; with what `queue_row` says of those."""
    seen = sight(reviewer_id)
    words = ", ".join(f"'{word}'" for word in UNRESOLVED)
    sums = {
        "mine": "1",
        "done": "v.done",
        "stale": "v.stale > 0",
        "needs_me": "v.needs_me",
        "needs": "q.needs",
        **{f"untestable:{check}": f"q.untestable >> {bit} & 1" for bit, check in enumerate(CHECKS)},
        **{f"unresolved:{check}": f"v.{check} IN ({words})" for check in CHECKS},
        **{f"outcome:{outcome}": f"{seen.outcome} = '{outcome}'" for outcome in OUTCOMES},
    }
    columns = ", ".join(f"COALESCE(SUM({expression}), 0)" for expression in sums.values())
    query = (
        f"SELECT {columns} FROM reviewer_row AS v CROSS JOIN queue_row AS q ON q.id = v.candidate_id "
        "WHERE v.reviewer_id = ?"
    )
    return dict(zip(sums, connection.execute(query, (reviewer_id,)).fetchone(), strict=True))


def scalar(connection: sqlite3.Connection, query: str, *parameters: Any) -> int:
    """The one number that a query gives."""
    return connection.execute(query, parameters).fetchone()[0]
