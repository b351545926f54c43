"""Rows of styled text, the one thing that every drawing function of the desk's candidate page returns.

A row is a list of spans; a span is text, the name of a style and, where a click does something, an action. Names
of styles are turned into colours by the widget that shows the rows, so that drawing needs no terminal.
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import NamedTuple

from rich.cells import cell_len, set_cell_size

from tui.desk.text import safe_lines, wrap


class Span(NamedTuple):
    """Some text of one style; `action` is what a click on it does, in the words of the screen's own actions."""

    text: str
    style: str = ""
    action: str = ""


Row = list[Span]
LEAST_BESIDE = 8  # columns: a head that leaves less room lets its text run over rather than stand letter by letter


def row(*parts: str | Span | tuple[str, str]) -> Row:
    """A row of its parts: bare text takes the plain style."""
    return [Span(part) if isinstance(part, str) else Span(*part) for part in parts]


def row_width(spans: Iterable[Span]) -> int:
    """Columns that a row takes on the terminal, wide characters counted as two."""
    return sum(cell_len(span.text) for span in spans)


def row_text(spans: Iterable[Span]) -> str:
    """The bare text of a row."""
    return "".join(span.text for span in spans)


def fit_row(spans: Iterable[Span], width: int, more: str = "~") -> Row:
    """The row in exactly `width` columns: padded, or cut with `more` at the cut so that nobody takes it for whole.

    >>> row_text(fit_row(row("falls short"), 6))
    'falls~'
    """
    spans = list(spans)
    missing = width - row_width(spans)
    if missing >= 0:
        return [*spans, Span(" " * missing)] if missing else spans
    kept: Row = []
    left = max(0, width - cell_len(more))
    for span in spans:
        if cell_len(span.text) >= left:
            kept.append(span._replace(text=set_cell_size(span.text, left)))
            kept.append(Span(set_cell_size(more, min(width, cell_len(more))), span.style))
            return kept
        kept.append(span)
        left -= cell_len(span.text)
    return kept


def fit_rows(rows: Iterable[Row], width: int, height: int) -> list[Row]:
    """Exactly `height` rows of exactly `width` columns; what does not fit below is cut."""
    fitted = [fit_row(spans, width) for spans in list(rows)[:height]]
    return fitted + [[Span(" " * width)] for _ in range(height - len(fitted))]


def paragraph(text: str, width: int, style: str = "", indent: int = 0, lead: str = "") -> list[Row]:
    """`text`, made safe, as rows no wider than `width` columns; its own line ends are kept.

    Args:
        indent: columns by which every row but the first stands in.
        lead: what the first row begins with, spaces mostly.

    >>> [row_text(line) for line in paragraph("one two three", 9, lead="* ", indent=2)]
    ['* one two', '  three']
    """
    rows: list[Row] = []
    for line in safe_lines(text):
        start = lead if not rows else " " * indent
        first, *rest = wrap(line, max(1, width - cell_len(start)))
        rows.append([Span(start + first, style)])
        if rest:
            rest = wrap(" ".join(rest), max(1, width - indent))
        rows += [[Span(" " * indent + part, style)] for part in rest]
    return rows


def hanging(head: Row, text: str, width: int, style: str = "") -> list[Row]:
    """`text`, made safe, beside a head: its further lines stand under its first, none wider than `width` columns.

    >>> [row_text(line) for line in hanging(row("a key  "), "what it does", 15)]
    ['a key  what it', '       does']
    """
    wide = row_width(head)
    lines = paragraph(text, max(LEAST_BESIDE, width - wide), style)
    return [[*(head if first is lines[0] else [Span(" " * wide)]), *first] for first in lines]


def beside(left: list[Row], right: list[Row], left_width: int, gap: int = 1) -> list[Row]:
    """Two blocks side by side, the left one padded or cut to `left_width` columns."""
    height = max(len(left), len(right))
    left = left + [[] for _ in range(height - len(left))]
    right = right + [[] for _ in range(height - len(right))]
    return [[*fit_row(a, left_width), Span(" " * gap), *b] for a, b in zip(left, right, strict=True)]
