"""The columns of the queue: which fit a width, what their heads say, and one candidate's cells in them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING

from rich.cells import cell_len

from tui.desk.text import KEY_OF_CHECK, SHORT_CHECKS, fit, number, outcome_text, safe, short_band, signed
from tui.desk.text import state_text, thousands
from tui.model import CHECKS

if TYPE_CHECKING:
    from tui.workflow.records import QueueRow

Cell = tuple[str, str]  # text, the name of its style: `plain`, `quiet`, `attention` or a state
NAME_WIDEST = 30
NAME_NARROWEST = 9
LONGEST_PULL = 5  # cells; a longer one is written with an exponent
ROOMY = 92  # columns from which the oddness has room for its own word


@dataclass(frozen=True, slots=True)
class Columns:
    """Cells for each column at one width. Each is followed by its gap."""

    width: int
    name: int
    oddness: int
    check: int
    outcome: int = 11
    yours: int = 5
    band: int = 7  # the farthest band and its pull share their cells
    pull: int = 5
    gap: int = 1


@lru_cache(maxsize=32)
def columns_for(width: int) -> Columns:
    """The columns that a list `width` cells wide has room for.

    >>> columns_for(80).name, columns_for(80).oddness, columns_for(120).oddness
    (9, 5, 9)
    """
    check = 7 if width < 100 else 8
    gap = 1 if width < 100 else 2
    oddness, band, pull = (9, 7, 5) if width >= ROOMY else (5, 6, 4)
    used = 2 + gap + oddness + band + pull + gap + check * len(CHECKS) + 11 + gap + 5
    name = max(NAME_NARROWEST, min(NAME_WIDEST, width - used))
    return Columns(width, name, oddness, check, band=band, pull=pull, gap=gap)


def head_cells(
    columns: Columns, order: str, active: str | None, letters: Mapping[str, str] = KEY_OF_CHECK
) -> list[Cell]:
    """The words above the columns; in a check's word the letter that filters by it stands large.

    Args:
        order: the column that the list is ordered by: `name`, `oddness`, `ruled`, `outcome`.
        active: the check that the list is filtered by, or None.
        letters: the key that filters by each check.
    """
    gap = " " * columns.gap
    cells = [("  ", "quiet"), (fit("name", columns.name) + gap, _head("name", order))]
    cells.append((_beside_gap("oddness" if columns.width >= ROOMY else "odd", columns), _head("oddness", order)))
    cells.append((fit("most in", columns.band + columns.pull) + gap, "quiet"))
    for check in CHECKS:
        cells += _check_head(SHORT_CHECKS[check], letters.get(check, ""), columns.check, check == active)
    cells.append((fit("outcome", columns.outcome) + gap, _head("outcome", order)))
    cells.append((fit("yours", columns.yours), _head("ruled", order)))
    return cells


def count_cells(columns: Columns, unresolved: Mapping[str, int], active: str | None) -> list[Cell]:
    """The second line above the columns: how many candidates each check is unresolved for."""
    before = 2 + columns.name + columns.oddness + columns.band + columns.pull + 2 * columns.gap
    cells = [(fit("unresolved  ", before, align="right"), "quiet")]
    for check in CHECKS:
        text = compact(unresolved.get(check))
        cells.append((fit(f"[{text}]" if check == active else f" {text}", columns.check), _mark(check == active)))
    return cells


def row_cells(row: QueueRow, columns: Columns, chosen: bool) -> list[Cell]:
    """One candidate in its columns; every cell carries its meaning in text, and a style beside."""
    gap = " " * columns.gap
    cells = [("> " if chosen else "  ", "attention"), (fit(safe(row.name), columns.name, cut="middle") + gap, "name")]
    cells.append((_beside_gap(_sigma(row.oddness, columns.width >= ROOMY), columns), "plain"))
    cells.append((_most_text(row, columns.band + columns.pull) + gap, "plain"))
    for check in CHECKS:
        state = row.states.get(check, "")
        text = state_text(state, check in row.stale) if state else ""
        cells.append((fit(text[: columns.check - 1] if state == "nodata" else text, columns.check), state or "plain"))
    cells.append((fit(outcome_text(row.outcome), columns.outcome) + gap, row.outcome))
    cells.append((fit(yours_text(row), columns.yours), yours_style(row)))
    return cells


def yours_text(row: QueueRow) -> str:
    """What the row still asks of the reader: `2/5` ruled so far, `again` for a split or a stale ruling, `done`.

    A candidate that needs nobody, though this reader is not done with it, reads `--`.
    """
    if row.needs_me and (row.done or row.stale):
        return "again"
    if row.done:
        return "done"
    if row.needs_me:
        return f"{row.ruled}/{row.to_rule}"
    return "--"


def yours_style(row: QueueRow) -> str:
    """Loud where something is begun or asked again, plain where it waits, quiet where nothing is asked."""
    if not row.needs_me:
        return "quiet"
    return "attention" if row.done or row.stale or row.ruled else "plain"


def compact(count: int | None) -> str:
    """A count in at most 5 cells.

    >>> compact(941), compact(12_345), compact(1_000_000), compact(None)
    ('941', '12.3k', '1.00M', '')
    """
    if count is None:
        return ""
    if count < 10_000:
        return str(count)
    if count < 999_500:
        return f"{count / 1e3:.1f}k" if count < 99_950 else f"{count / 1e3:.0f}k"
    return f"{count / 1e6:.2f}M"


def _beside_gap(text: str, columns: Columns) -> str:
    """A number in the column of the oddness, or the word above it."""
    gap = 2 if columns.width >= ROOMY else 1
    return fit(text, columns.oddness - gap, align="right") + " " * gap


def _most_text(row: QueueRow, width: int) -> str:
    """The farthest band at the left, its pull at the right, which gives its decimal up before the band is cut."""
    if not row.odd_band:
        return fit("--", width)
    band = short_band(row.odd_band)
    pull = signed(row.odd_pull, 0 if abs(row.odd_pull) >= 99.95 else 1)
    if cell_len(band) + 1 + len(pull) > width:
        pull = signed(row.odd_pull, 0)
    if len(pull) > LONGEST_PULL:
        pull = f"{'+' if row.odd_pull > 0 else ''}{number(row.odd_pull, 1)}"
    return fit(band, width - 1 - len(pull)) + " " + pull


def _sigma(oddness: float | None, is_roomy: bool) -> str:
    """In at most 4 cells, or in 7 where there is room."""
    if oddness is None or oddness != oddness:
        return "--"
    if oddness < (1000 if is_roomy else 99.95):
        return f"{oddness:.1f}"
    if is_roomy:
        return thousands(round(oddness))
    return f"{oddness:.0f}" if oddness < 9999.5 else f"{oddness / 1e3:.0f}k"


def _check_head(word: str, letter: str, width: int, is_active: bool) -> list[Cell]:
    style = "active" if is_active else "quiet"
    place = word.find(letter) if len(letter) == 1 else -1
    if place < 0:
        return [(fit(word, width), style)]
    rest = [(word[place + 1 :], style), (" " * (width - len(word)), "quiet")]
    return [*([(word[:place], style)] if place else []), (letter.upper(), "key"), *rest]


def _head(column: str, order: str) -> str:
    return "active" if column == order else "quiet"


def _mark(is_marked: bool) -> str:
    return "attention" if is_marked else "quiet"
