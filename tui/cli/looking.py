"""Commands that look at a queue: list, show, story. None reveals what the seal covers."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator
from itertools import islice
from typing import TYPE_CHECKING

import click

from tui.cli.arguments import (
    as_option,
    json_option,
    name_argument,
    needed_handle,
    outcome_option,
    queue_argument,
    reader,
    share_of,
    unresolved_option,
)
from tui.model import CHECKS
from tui.workflow.records import SORTS, Filter

if TYPE_CHECKING:
    from tui.workflow.records import QueueRow
    from tui.workflow.session import Session

UPWARD = ("name", "band", "outcome", "ruled", *CHECKS)  # sorts that begin with the smallest
PAGE = 1000  # rows fetched at a time
SHORT_HEADINGS = ("name", "odd", "most in", "star", "instr", "extin", "blend", "wdust", "outcome", "yours")
SHORT_STATES = {  # sign and word together: the sign compares the model with the data
    "explains": "=expl",
    "short": "<short",
    "unclear": "~uncl",
    "split": "/split",
    "open": ":open",
    "todo": ".todo",
    "nodata": "-nodata",
    "sealed": ".seal",
}
LIST_HEADINGS = ("name", "oddness", "odd_band", "odd_pull", *CHECKS, "outcome", "ruled", "to_rule")


@click.command("list")
@queue_argument
@as_option
@unresolved_option
@outcome_option
@click.option("--sort", type=click.Choice(SORTS), default="oddness", show_default=True, help="Order of the rows.")
@click.option("--next", "only_next", is_flag=True, help="Only the name of the candidate that needs you next.")
@click.option("--share", callback=share_of, metavar="I/N", help="Only the I-th of N shares, for copies kept apart.")
def list_command(queue, handle, unresolved, outcome, sort, only_next, share) -> int:
    """The queue as text: tab-separated with whole words when it goes to a file or a program.

    At a terminal: =expl explains, <short falls short, ~uncl unclear, /split split, :open open, .todo not ruled by
    you, -nodata untestable. A trailing * marks a stale ruling. Without --as, states and outcome read sealed.
    """
    from tui.cli.printing import line, remark
    from tui.workflow.session import READ_ONLY

    with reader(queue, needed_handle(handle) if only_next else handle, write=only_next) as session:
        if only_next:
            if session.read_only:
                remark(f"{queue} is {READ_ONLY}; the candidate is not claimed.")
            name = session.claim_next() if share is None else next_in_share(session, share)
            line(name) if name else remark("Nothing needs you now.")
            return 0
        where = Filter(unresolved=unresolved, outcome=outcome, share=share)
        print_rows(pages(session, session.order(sort=sort, descending=sort not in UPWARD, where=where)))
    return 0


def next_in_share(session: Session, share: tuple[int, int]) -> str | None:
    """The next candidate for this reviewer that falls in a share, claimed."""
    skipped: list[str] = []
    while (name := session.next_for_me(skip=skipped)) is not None:
        if session.order(where=Filter(share=share, names=frozenset((name,)))):
            session.claim(name)
            return name
        skipped.append(name)
    return None


def pages(session: Session, ids) -> Iterator[QueueRow]:
    """The rows of `ids`, fetched a page at a time."""
    for start in range(0, len(ids), PAGE):
        yield from session.rows(ids[start : start + PAGE])


def list_cells(row: QueueRow) -> tuple[str, ...]:
    """One candidate as cells of LIST_HEADINGS."""
    from tui.cli.printing import NOTHING, figure, signed

    states = (row.states.get(check, NOTHING) + ("*" if check in row.stale else "") for check in CHECKS)
    numbers = (figure(row.oddness, 3), row.odd_band or NOTHING, signed(row.odd_pull))
    return (row.name, *numbers, *states, row.outcome, str(row.ruled), str(row.to_rule))


def short_cells(row: QueueRow) -> tuple[str, ...]:
    """The same in the words that fit a terminal of 80 columns, as cells of SHORT_HEADINGS."""
    from tui.cli.printing import NOTHING, signed

    most = f"{row.odd_band} {signed(row.odd_pull)}" if row.odd_band else NOTHING
    words = {check: SHORT_STATES.get(row.states.get(check, ""), NOTHING) for check in CHECKS}
    states = (word + ("*" if check in row.stale else "") for check, word in words.items())
    odd = f"{row.oddness:.1f}" if math.isfinite(row.oddness) else NOTHING
    return (row.name, odd, most, *states, row.outcome, "done" if row.done else f"{row.ruled}/{row.to_rule}")


def print_rows(rows: Iterator[QueueRow]) -> None:
    """Tables of a page each at a terminal, tab-separated rows elsewhere; either way as they come."""
    from tui.cli.printing import is_terminal, tab_rows

    if not is_terminal():
        tab_rows(LIST_HEADINGS, map(list_cells, rows))
        return
    while page := list(islice(rows, PAGE)):
        print_short(page)


def print_short(rows: Iterable[QueueRow]) -> None:
    """Some rows as a table for people; only a name may be folded."""
    from tui.cli.printing import table

    table(SHORT_HEADINGS, map(short_cells, rows), numbers=(1,), folding=(0,), gap=1)


@click.command("show")
@queue_argument
@name_argument
@as_option
@json_option
def show_command(queue: str, name: str, handle: str | None, as_json: bool) -> int:
    """The evidence of one candidate; what lacks is computed for the occasion and not stored."""
    from tui.workflow.showing import dossier

    with reader(queue, handle, write=False) as session:
        found = dossier(session, name)
    if as_json:
        from tui.cli.printing import as_json as print_json

        print_json(found.as_dict())
    else:
        from tui.cli.dossier import print_dossier

        print_dossier(found)
    return 0


@click.command("story")
@queue_argument
@name_argument
@as_option
def story_command(queue: str, name: str, handle: str | None) -> int:
    """What happened to a candidate, in time order; others' rulings only where your seal is open."""
    from tui.cli.printing import NOTHING, line, remark, table

    with reader(queue, handle, write=False) as session:
        lines = session.story(name)
        if not session.view(name).seal_open:
            remark("Others' rulings stay sealed until your walk of this candidate ends.")
    if not lines:
        line("Nothing has happened to it yet.")
    else:
        rows = [(one.utc[:19] + "Z", one.who, one.what, one.check or NOTHING, one.text) for one in lines]
        table(("when (UTC)", "who", "what", "check", "bands, ruling, note"), rows)
    return 0
