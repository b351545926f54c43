"""Columns as arrays of numbers, truth values or texts, with every cell that is none of these named."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from tui.model import FloatArray
from tui.readers.records import Column

EMPTY_CELLS = frozenset({"", "null", "nan", "--", "-", "n/a", "na", "none", "masked", "\\n", "..."})
TRUE_CELLS = frozenset({"1", "true", "t", "yes", "y"})
FALSE_CELLS = frozenset({"0", "false", "f", "no", "n"})
EXACT_INTEGER = 2**53  # above it a decimal number no longer holds every integer
SHOWN = 30  # characters of a bad cell that a message repeats

# Sentinels of the public catalogues: Gaia has none, 2MASS -99.99, SDSS -999 -1000 -9999, PS1 -999, GALEX -999 -99,
# AKARI -999.9 -1000, ground-based reductions 99 99.9 99.99.
SENTINELS = (-999.0, -999.9, -999.99, -1000.0, -9999.0, -99.99, -99.999)
MAG_SENTINELS = (*SENTINELS, -99.0, -99.9, 99.0, 99.9, 99.99, 99.999, 999.0, 9999.0)
# What an error column holds where there is no error: the same, and 2MASS 8.888 and 9.999 (ph_qual F, Explanatory
# Supplement II.2.a), DAOPHOT 9.999, and -9.999995e8 in the archives of wide near-infrared surveys.
ERROR_SENTINELS = (*SENTINELS, -99.0, -99.9, -9.999995e8)
MAG_ERROR_SENTINELS = (*MAG_SENTINELS, 8.888, 9.99, 9.999, 9.9999, -9.999995e8)

Bad = dict[int, str]  # index of the cell -> why it cannot be taken


def quoted(text: str) -> str:
    """A bad cell as a message repeats it: short, and with nothing that a terminal obeys."""
    return ascii(text if len(text) <= SHOWN else text[:SHOWN] + "...")


def number(text: str) -> float:
    """One cell as a number; NaN where empty.

    Raises:
        ValueError: the text is no number.
    """
    try:
        if "_" in text:
            raise ValueError
        return float(text)
    except ValueError:
        if text.strip().lower() in EMPTY_CELLS:
            return math.nan
        raise ValueError(f"{quoted(text)} is no number") from None


def _text_numbers(cells: Sequence[str]) -> tuple[FloatArray, Bad]:
    try:
        if "_" in "".join(cells):
            raise ValueError
        return np.array([float(text) if text else math.nan for text in cells], dtype=np.float64), {}
    except ValueError:
        return _text_numbers_one_by_one(cells)


def _text_numbers_one_by_one(cells: Sequence[str]) -> tuple[FloatArray, Bad]:
    bad: Bad = {}
    values = np.empty(len(cells))
    for index, text in enumerate(cells):
        try:
            values[index] = number(text)
        except ValueError as error:
            values[index] = math.nan
            bad[index] = str(error)
    return values, bad


def numbers(column: Column, sentinels: tuple[float, ...] = ()) -> tuple[FloatArray, Bad]:
    """A column as float64, shape (N,); NaN where empty, where a sentinel stands, and where the cell is bad.

    A minus zero comes out as zero: SQLite keeps no other, and digests must be those of what is kept.
    """
    bad: Bad = {}
    if column.is_text:
        values, bad = _text_numbers(column.texts if column.mask is None else texts(column))
    elif column.cells.dtype.kind == "c" or column.cells.ndim != 1:
        return np.full(len(column.cells), math.nan), {0: "the cells are not plain numbers"}
    else:
        values = column.cells.astype(np.float64)
        if column.mask is not None:
            values[column.mask] = math.nan
    for sentinel in sentinels:
        values[np.isclose(values, sentinel, rtol=1e-6, atol=0)] = math.nan
    for index in np.flatnonzero(np.isinf(values)).tolist():
        values[index] = math.nan
        bad[index] = "the number is infinite"
    return values + 0.0, bad


def _text_of(value: object) -> str:
    if isinstance(value, str):
        text = value.strip()
        return "" if text.lower() in EMPTY_CELLS and text != "-" else text
    if isinstance(value, float):
        return (
            "" if math.isnan(value) else (str(int(value)) if value.is_integer() and abs(value) < 1e15 else repr(value))
        )
    return str(value)


def texts(column: Column) -> list[str]:
    """A column as texts without blanks at the ends; "" where empty. Whole numbers have no decimal point."""
    if column.is_text:
        cells = column.texts
    elif column.cells.dtype == np.float32:
        cells = [float(f"{value:.7g}") for value in column.cells]
    else:
        cells = column.cells.tolist()
    spelled = {cell: _text_of(cell) for cell in set(cells)}  # flags repeat: each spelling is made once
    found = [spelled[cell] for cell in cells]
    if column.mask is not None:
        return ["" if masked else cell for cell, masked in zip(found, column.mask.tolist(), strict=True)]
    return found


def truths(column: Column) -> tuple[np.ndarray, Bad]:
    """A column as truth values, shape (N,); empty cells are False."""
    bad: Bad = {}
    if not column.is_text and column.cells.dtype.kind == "b":
        values = column.cells.copy()
        if column.mask is not None:
            values[column.mask] = False
        return values, bad
    values = np.zeros(len(column.cells), dtype=bool)
    for index, text in enumerate(texts(column)):
        word = text.lower()
        if word in TRUE_CELLS:
            values[index] = True
        elif word and word not in FALSE_CELLS:
            bad[index] = f"{quoted(text)} is neither true nor false"
    return values, bad


def lost_digits(column: Column) -> bool:
    """Whether integers of this column were rounded on the way: decimal numbers beyond 2^53."""
    if column.is_text:
        return any("e+" in cell.lower() for cell in column.part(0, 1000).texts)
    if column.cells.dtype.kind != "f":
        return False
    with np.errstate(invalid="ignore"):
        return bool(np.any(np.abs(column.cells) > EXACT_INTEGER))
