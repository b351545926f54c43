"""A grid of character cells with finer dots inside: braille where the terminal has it, plain marks where not."""

from __future__ import annotations

import math
import sys

import numpy as np
from rich.cells import cell_len

from tui.desk.widgets.rows import Row, Span
from tui.model import FloatArray

# Order is weight: where two things fall on one cell, the later one gives the cell its style.
STYLES = (
    "plain", "grid", "axis", "zero", "spectrum", "component-a", "component-b", "component-c", "component-d", "other",
    "total", "width", "bar", "stem", "cursor-line", "label", "limit", "dropped", "point", "far", "cursor",
)  # fmt: skip
INDEX = {name: index for index, name in enumerate(STYLES)}
PLAIN_MARKS = {"grid": ".", "axis": "|", "zero": "-", "spectrum": ",", "component-a": "a", "component-b": "b",
               "component-c": "c", "component-d": "d", "other": ":", "total": ".", "width": "-", "bar": "|",
               "stem": "|", "cursor-line": ":"}  # fmt: skip
BITS = np.array([[0x01, 0x08], [0x02, 0x10], [0x04, 0x20], [0x40, 0x80]], dtype=np.uint32)  # Unicode 15, braille block
BRAILLE = 0x2800
SPACE = 32


class Canvas:
    """`height` x `width` cells of 4 x 2 dots; row 0 is the top."""

    def __init__(self, width: int, height: int, unicode: bool = True) -> None:
        self.width, self.height, self.unicode = width, height, unicode
        self.dots = np.zeros((4 * height, 2 * width), dtype=np.uint8)
        self.codes = np.full((height, width), SPACE, dtype=np.uint32)
        self.text_styles = np.zeros((height, width), dtype=np.uint8)

    def stroke(self, y_dots: FloatArray, style: str, top: int, bottom: int, dash: tuple[int, int] = (1, 0)) -> None:
        """A line through one place per dot column, shape (2 width,); NaN breaks it; drawn in rows top <= row < bottom.

        `dash`: dots on and off, counted along the line, so that lines differ without colour.
        """
        near = np.clip(np.nan_to_num(y_dots, nan=-1e6), -1e4, 1e4)
        here = np.round(near).astype(int)
        after = np.append(here[1:], here[-1])
        after = np.where(np.append(np.isfinite(y_dots[1:]), True), after, here)
        low = np.where(after >= here, here, after + 1)
        high = np.where(after > here, after - 1, here)
        rows = np.arange(4 * top, 4 * bottom)[:, None]
        on = (rows >= low) & (rows <= high) & np.isfinite(y_dots)
        if dash[1]:
            length = np.cumsum(1.0 + 0.5 * np.minimum(np.abs(after - here), 4))
            on &= (length % sum(dash)) < dash[0]
        self._mark(slice(4 * top, 4 * bottom), slice(None), on, style)

    def vertical(
        self, x_dot: float, y_one: float, y_two: float, style: str, top: int, bottom: int, every: int = 1
    ) -> None:
        """A line down one dot column between two places in dots, kept to cell rows top <= row < bottom."""
        column = int(round(x_dot))
        if not 0 <= column < self.dots.shape[1]:
            return
        low, high = sorted((_clip(y_one), _clip(y_two)))
        low, high = max(low, 4 * top), min(high, 4 * bottom - 1)
        if high >= low:
            span = self.dots[low : high + 1 : every, column]
            np.maximum(span, INDEX[style], out=span)

    def horizontal(self, y_dot: float, x_one: float, x_two: float, style: str, every: int = 1) -> None:
        """A line along one dot row between two places in dots."""
        line = int(round(y_dot))
        if not 0 <= line < self.dots.shape[0]:
            return
        low, high = max(0, int(round(x_one))), min(self.dots.shape[1] - 1, int(round(x_two)))
        if high >= low:
            span = self.dots[line, low : high + 1 : every]
            np.maximum(span, INDEX[style], out=span)

    def put(self, line: int, column: int, text: str, style: str) -> None:
        """Plain text over whatever is drawn; what would fall outside is left out."""
        if not 0 <= line < self.height:
            return
        start, text = max(column, 0), text[max(0, -column) :][: max(0, self.width - max(column, 0))]
        if text:
            self.codes[line, start : start + len(text)] = [_code(character) for character in text]
            self.text_styles[line, start : start + len(text)] = INDEX[style]

    def wipe(self, line: int, column: int, size: int) -> None:
        """Take away whatever is drawn in these cells."""
        column = max(column, 0)
        self.codes[line, column : column + size] = SPACE
        self.dots[4 * line : 4 * line + 4, 2 * column : 2 * (column + size)] = 0

    def is_free(self, line: int, column: int, size: int) -> bool:
        """Whether no text stands at these cells, and all of them exist."""
        if not (0 <= line < self.height and 0 <= column and column + size <= self.width):
            return False
        return bool(np.all(self.codes[line, column : column + size] == SPACE))

    def rows(self) -> list[Row]:
        """The cells as rows of spans, neighbours of one style joined."""
        blocks = self.dots.reshape(self.height, 4, self.width, 2)
        weight = blocks.max(axis=(1, 3))
        if self.unicode:
            drawn = ((blocks > 0) * BITS[None, :, None, :]).sum(axis=(1, 3), dtype=np.uint32) + BRAILLE
        else:
            marks = np.array([ord(PLAIN_MARKS.get(name, " ")) for name in STYLES], dtype=np.uint32)
            drawn = marks[weight]
        written = self.codes != SPACE
        codes = np.where(written, self.codes, np.where(weight > 0, drawn, SPACE)).astype(np.uint32)
        styles = np.where(written, self.text_styles, weight)
        return [_runs(codes[line], styles[line]) for line in range(self.height)]

    def _mark(self, rows: slice, columns: slice, on: np.ndarray, style: str) -> None:
        part = self.dots[rows, columns]
        np.maximum(part, on.astype(np.uint8) * np.uint8(INDEX[style]), out=part)


def dash_sample(dash: tuple[int, int], cells: int = 3) -> str:
    """A short piece of a dashed line in braille, for a legend."""
    text = ""
    for cell in range(cells):
        left, right = (((2 * cell + half) % sum(dash)) < dash[0] for half in (0, 1))
        text += chr(BRAILLE + 0x04 * left + 0x20 * right)
    return text


def _code(character: str) -> int:
    """The character's code, or a question mark's where it would not take exactly one column."""
    return ord(character) if cell_len(character) == 1 and character.isprintable() else ord("?")


def _clip(value: float) -> int:
    return int(round(min(max(value, -1e4), 1e4))) if math.isfinite(value) else -10_000


def _runs(codes: np.ndarray, styles: np.ndarray) -> Row:
    text = codes.tobytes().decode("utf-32-le" if sys.byteorder == "little" else "utf-32-be")
    edges = [0, *(np.flatnonzero(np.diff(styles)) + 1).tolist(), len(text)]
    return [
        Span(text[start:end], STYLES[styles[start]])
        for start, end in zip(edges, edges[1:], strict=False)
        if end > start
    ]
