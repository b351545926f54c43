"""Small tables and lists of named values: columns aligned by the decimal point, names of any width kept in theirs."""

from __future__ import annotations

from collections.abc import Collection, Sequence

from rich.cells import cell_len

from tui.desk.text import decimal_aligned, fit
from tui.desk.widgets.rows import Row, Span, beside, fit_row, hanging, row, row_width

GAP = 2
INDENT = 2
SIDE_BY_SIDE = 58  # columns that one of several lists of named values needs
LEAST_LIST = 6  # values: fewer are not parted among columns


def table(
    heads: Sequence[str],
    lines: Sequence[Sequence[str]],
    width: int,
    texts: Collection[int] = (),
    styles: Sequence[str] = (),
) -> list[Row]:
    """A head and one row a line, the columns as wide as what they hold.

    Args:
        lines: cells, already safe; shape (N, len(heads)).
        texts: columns of words, which stand at the left; all others are numbers, aligned by the decimal point.
        styles: of the lines, where they differ.

    >>> from tui.desk.widgets.rows import row_text
    >>> [row_text(line) for line in table(("band", "mJy"), (("J", "121.4"), ("Ks", "8")), 40, texts=(0,))]
    ['  band    mJy', '  J     121.4', '  Ks      8  ']
    """
    columns = [
        _column(head, [line[place] for line in lines], place in texts, place == len(heads) - 1)
        for place, head in enumerate(heads)
    ]
    rows: list[Row] = []
    for place in range(len(lines) + 1):
        text = " " * INDENT + (" " * GAP).join(column[place] for column in columns)
        style = "head" if place == 0 else styles[place - 1] if styles else ""
        spans = row((text, style))
        rows.append(fit_row(spans, width) if row_width(spans) > width else spans)
    return rows


def _column(head: str, cells: Sequence[str], is_text: bool, is_last: bool) -> list[str]:
    """Head and cells in one width."""
    shown = list(cells) if is_text else decimal_aligned(cells)
    size = max(cell_len(text) for text in (head, *shown))
    if is_text:
        return [head, *shown] if is_last else [fit(text, size) for text in (head, *shown)]
    return [head.rjust(size), *(text.rjust(size) for text in shown)]


def pair_rows(pairs: Sequence[tuple[str, str]], width: int) -> list[Row]:
    """Named values, one under the other; in as many columns as there is room for, read downwards.

    Args:
        pairs: name and value, made safe.
    """
    columns = max(1, min(width // SIDE_BY_SIDE, 1 + len(pairs) // LEAST_LIST))
    each = -(-len(pairs) // columns) if pairs else 0
    blocks = [
        _list_rows(pairs[start : start + each], width // columns - GAP) for start in range(0, len(pairs), each or 1)
    ]
    rows = blocks[0] if blocks else []
    for place, block in enumerate(blocks[1:], start=1):
        rows = beside(rows, block, place * (width // columns) - GAP, GAP)
    return rows


def _list_rows(pairs: Sequence[tuple[str, str]], width: int) -> list[Row]:
    size = min(max((cell_len(name) for name, _ in pairs), default=0), width // 2)
    return [
        line
        for name, text in pairs
        for line in hanging([Span(" " * INDENT + fit(name, size) + " " * GAP, "quiet")], text, width)
    ]
