"""The queue as one reader may see it.

The seal is kept by construction, here and in order.py. States come from `reviewer_row`, which holds
only what that reviewer may read, or, where the reviewer has no row, read `todo` (`nodata` where the
evidence is untestable);
the team's outcome is looked at behind `seal_open = 1` alone; a reader without a handle gets constants.
Filters, sorts (ids.py, order.py) and counts read the same rows in the same way.
"""

from __future__ import annotations

import math
import sqlite3
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from tui.model import CHECKS, OUTCOMES
from tui.store.candidate_view import standing_for, story
from tui.store.connect import snapshot
from tui.store.deriving import checks_of
from tui.store.ids import find_prefix, find_substring, view_order
from tui.store.records import NOT_RULED, SEALED, UNRESOLVED, QueueRow
from tui.store.team import team_standing
from tui.store.turns import next_for

__all__ = [
    "find_prefix", "find_substring", "next_for", "standing_for", "story", "team_standing", "view_counts", "view_order",
    "view_rows",
]  # fmt: skip

TESTABLE = f"({len(CHECKS)} - " + " - ".join(f"(q.untestable >> {bit} & 1)" for bit in range(len(CHECKS))) + ")"



@dataclass(frozen=True, slots=True)
class Sight:
    """The SQL of what one reader may see: the joined tables and one expression a column."""

    tables: str
    parameters: tuple[Any, ...]
    states: dict[str, str]
    outcome: str
    ruled: str
    stale: str
    needs_me: str
    done: str
    seal_open: str


def sight(reviewer_id: str | None) -> Sight:
    """What a reviewer, or a reader without a handle, may see."""
    if reviewer_id is None:
        sealed = f"'{SEALED}'"
        return Sight("queue_row AS q", (), dict.fromkeys(CHECKS, sealed), sealed, *["0"] * 5)
    states = {
        check: f"COALESCE(v.{check}, CASE WHEN q.untestable >> {bit} & 1 THEN 'nodata' ELSE '{NOT_RULED}' END)"
        for bit, check in enumerate(CHECKS)
    }
    return Sight(
        tables="queue_row AS q LEFT JOIN reviewer_row AS v ON v.reviewer_id = ? AND v.candidate_id = q.id",
        parameters=(reviewer_id,),
        states=states,
        outcome=f"CASE WHEN v.seal_open = 1 THEN q.outcome ELSE '{SEALED}' END",
        ruled="COALESCE(v.ruled, 0)",
        stale="COALESCE(v.stale, 0)",
        needs_me="COALESCE(v.needs_me, q.needs)",
        done="COALESCE(v.done, 0)",
        seal_open="COALESCE(v.seal_open, 0)",
    )


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
    if reviewer_id is None:
        total = scalar(connection, "SELECT COUNT(*) FROM queue_row")
        counts = {"all": total, "needs_me": 0, "done": 0, "mine": 0, "stale": 0, "later": 0}
        return counts | {f"unresolved:{check}": total for check in CHECKS} | {f"outcome:{SEALED}": total}
    with snapshot(connection):
        return counts_for(connection, reviewer_id)


def counts_for(connection: sqlite3.Connection, reviewer_id: str) -> dict[str, int]:
    """The counts of one reviewer, from one state of the file."""
    total = scalar(connection, "SELECT COUNT(*) FROM queue_row")
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
