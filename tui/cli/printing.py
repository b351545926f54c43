"""Printing for people and for programs: tables that fit the terminal, plain text where there is none."""

from __future__ import annotations

import json
import math
import os
import sys
from collections.abc import Callable, Iterable, Sequence
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any

from tui.workflow.safe_text import safe

if TYPE_CHECKING:
    from rich.console import Console

WIDE = 10_000  # columns, where no terminal sets a width: nothing is ever cut or folded there
NARROWEST = 40  # columns: shorter lines never need folding
NOTHING = "-"  # a cell without a value


def is_terminal() -> bool:
    """Whether a person's terminal reads standard output."""
    return sys.stdout.isatty() and os.environ.get("TERM") != "dumb"


def console() -> Console:
    """A console on standard output: the terminal's width and colours, or plain and as wide as the text."""
    from rich.console import Console

    if is_terminal():
        return Console(markup=False, emoji=False, highlight=False, soft_wrap=False)
    return Console(markup=False, emoji=False, highlight=False, width=WIDE, color_system=None, force_terminal=False)


def line(text: object = "") -> None:
    """One line of text, safe; at a terminal it is folded between words."""
    if not is_terminal() or len(safe(text)) < NARROWEST:
        print(safe(text))
        return
    from rich.text import Text

    console().print(Text(safe(text)))


def heading(text: str) -> None:
    """A heading: bold at a terminal, and set off by an empty line everywhere."""
    from rich.text import Text

    print()
    console().print(Text(safe(text), style="bold"))


def table(
    headings: Sequence[str],
    rows: Iterable[Sequence[object]],
    numbers: Iterable[int] = (),
    folding: Iterable[int] | None = None,
    gap: int = 2,
) -> None:
    """A table that folds long cells at a terminal and never cuts one; plain aligned columns elsewhere.

    Args:
        numbers: columns to set flush right.
        folding: columns that may be folded where the terminal is narrow; None: all.
        gap: blanks between columns.
    """
    from rich.table import Table
    from rich.text import Text

    right = frozenset(numbers)
    fold = frozenset(range(len(headings)) if folding is None else folding)
    drawn = Table(box=None, pad_edge=False, padding=(0, gap, 0, 0), show_edge=False, header_style="bold")
    for index, title in enumerate(headings):
        side = "right" if index in right else "left"
        drawn.add_column(Text(title), justify=side, overflow="fold", no_wrap=index not in fold)
    for row in rows:
        drawn.add_row(*(Text(safe(cell)) for cell in row))
    target = console()
    if is_terminal():
        target.print(drawn)
        return
    with target.capture() as captured:
        target.print(drawn)
    for text in captured.get().splitlines():
        print(text.rstrip())


def tab_rows(headings: Sequence[str], rows: Iterable[Sequence[object]]) -> None:
    """Rows for other programs: a heading line, cells parted by tabs, one line a row, written as they come."""
    print("\t".join(headings))
    for row in rows:
        print("\t".join(safe(cell) for cell in row))


def as_json(value: Any) -> None:
    """One JSON document, keys in the order given, no NaN, everything beyond ASCII escaped."""
    print(json.dumps(value, indent=2, ensure_ascii=True, allow_nan=False))


def figure(value: float | None, digits: int = 4) -> str:
    """A number to `digits` significant digits, '-' where there is none.

    >>> figure(1234.5678), figure(0.000123456), figure(float("nan")), figure(None)
    ('1235', '0.0001235', '-', '-')
    """
    if value is None or not math.isfinite(value):
        return NOTHING
    if value and not 1e-4 <= abs(value) < 1e7:
        return f"{value:.{digits - 1}e}"
    places = digits - 1 - (math.floor(math.log10(abs(value))) if value else 0)
    return f"{value:.{max(0, min(places, 9))}f}"


def signed(value: float | None) -> str:
    """A pull in sigma with its sign: '+8.2'."""
    return NOTHING if value is None or not math.isfinite(value) else f"{value:+.1f}"


def remark(text: object) -> None:
    """One line on standard error: what is not part of the answer."""
    print(safe(text), file=sys.stderr)


@contextmanager
def progress(label: str) -> Iterable[Callable[[int, int], None]]:
    """A bar on standard error while at a terminal; yields `report(done, total)`, silent elsewhere."""
    if not sys.stderr.isatty() or os.environ.get("TERM") == "dumb":
        yield lambda done, total: None
        return
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeRemainingColumn

    columns = (TextColumn("{task.description}", markup=False), BarColumn(), MofNCompleteColumn(), TimeRemainingColumn())
    with Progress(*columns, console=Console(stderr=True), transient=True, refresh_per_second=10) as bar:
        task = bar.add_task(label, total=None)
        yield lambda done, total: bar.update(task, completed=done, total=total)
