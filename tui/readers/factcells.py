"""Facts: cells turned into the unit and kind that tui/data/facts.csv gives each of them."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np

from tui.errors import InputError
from tui.model import FloatArray
from tui.readers.cells import SENTINELS, Bad, lost_digits, numbers, quoted, texts, truths
from tui.readers.plan import FactColumn
from tui.readers.records import Column
from tui.readers.units import parse_unit

LONGEST_TEXT = 500  # characters of a fact in words
JD_2000, MJD_2000, YEAR_DAYS = 2451545.0, 51544.5, 365.25  # Julian year: Lieske 1979, A&A 73, 282
SIGNED = ("ra", "dec")  # facts for which -99.99 may be meant


def fact_values(plan: FactColumn, column: Column, mapped_unit: str = "") -> tuple[Sequence[Any], Bad]:
    """One fact in all rows, None where there is none.

    Raises:
        InputError: the unit cannot be turned into the fact's own.
    """
    kind = plan.fact.kind
    if kind == "str":
        return _words(column)
    if kind == "bool":
        values, bad = truths(column)
        present = [bool(text) for text in texts(column)]
        return [
            bool(v) if p and i not in bad else None for i, (v, p) in enumerate(zip(values, present, strict=True))
        ], bad
    values, bad = _angles(plan, column) or numbers(column, SENTINELS)
    values = values * unit_factor(plan, column, mapped_unit)
    if plan.days:
        values = 2000.0 + (values - (JD_2000 if plan.days == "JD" else MJD_2000)) / YEAR_DAYS
    _check_range(plan.fact.name, values, bad)
    if kind == "int":
        return _integers(values, bad), bad
    return [None if math.isnan(value) else value for value in values.tolist()], bad


def unit_factor(plan: FactColumn, column: Column, mapped_unit: str = "") -> float:
    """What turns a number of the column into the fact's unit; a bare number has that unit already.

    Raises:
        InputError: the two units are of different kinds.
    """
    if plan.days or not plan.fact.unit:
        return 1.0
    text = mapped_unit or column.unit or plan.unit
    if not text or text.lower() in ("hms", "h:m:s", "dms", "d:m:s", '"h:m:s"', '"d:m:s"'):
        return 1.0
    given, own = parse_unit(text.replace("log(", "").replace("cm.s**-2)", "dex")), parse_unit(plan.fact.unit)
    if given is None or own is None:
        return 1.0 if plan.fact.unit in ("dex", "s-1") else _wrong_unit(plan, text)
    if plan.fact.unit in ("dex", "s-1"):
        return 1.0  # catalogues spell these as they like: log(cm.s**-2), 'electron'.s**-1
    return float(given.to(own)) if given.is_equivalent(own) else _wrong_unit(plan, text)


def _wrong_unit(plan: FactColumn, text: str) -> float:
    raise InputError(f"the unit {text!a} is not one of {plan.fact.name}, which is in {plan.fact.unit}")


def _words(column: Column) -> tuple[list[str | None], Bad]:
    if not column.is_text and lost_digits(column):
        raise InputError("its long numbers have lost their last digits: write it as text or whole numbers")
    bad: Bad = {}
    words: list[str | None] = []
    for index, text in enumerate(texts(column)):
        if len(text) > LONGEST_TEXT:
            bad[index] = f"a text of {len(text)} characters is too long for a fact"
        words.append(text if text and index not in bad else None)
    return words, bad


def _angles(plan: FactColumn, column: Column) -> tuple[FloatArray, Bad] | None:
    """Positions written as 12:34:56.7, in degrees; None where the column is not so written."""
    if plan.fact.name not in SIGNED or not column.is_text:
        return None
    cells = texts(column)
    if not any(":" in cell for cell in cells[:100]):
        return None
    values, bad = np.full(len(cells), math.nan), {}
    for index, cell in enumerate(cells):
        if cell:
            try:
                values[index] = sexagesimal(cell) * (15.0 if plan.fact.name == "ra" else 1.0)
            except ValueError:
                bad[index] = f"{quoted(cell)} is no position"
    return values, bad


def sexagesimal(text: str) -> float:
    """Hours or degrees of a text such as -12:34:56.7.

    >>> sexagesimal("-00:30:00")
    -0.5
    """
    parts = text.replace(" ", ":").split(":")
    if not 2 <= len(parts) <= 3:
        raise ValueError(text)
    whole, rest = float(parts[0]), [float(part) for part in parts[1:]]
    if not all(0 <= part < 60 for part in rest):
        raise ValueError(text)
    size = abs(whole) + sum(part / 60.0 ** (place + 1) for place, part in enumerate(rest))
    return -size if parts[0].strip().startswith("-") else size


def _check_range(name: str, values: FloatArray, bad: Bad) -> None:
    """Positions in range; right ascensions from -180 to 0 are turned round."""
    with np.errstate(invalid="ignore"):
        if name == "ra" or name.endswith("_ra"):
            values[(values < 0) & (values >= -180)] += 360.0
            wrong = (values < 0) | (values >= 360.0000001)
        elif name == "dec" or name.endswith("_dec"):
            wrong = np.abs(values) > 90
        else:
            wrong = np.abs(values) > 1e30
    for row in np.flatnonzero(wrong).tolist():
        bad[row] = f"{values[row]:g} is out of range for {name}"
        values[row] = math.nan


def _integers(values: FloatArray, bad: Bad) -> list[int | None]:
    whole: list[int | None] = []
    for index, value in enumerate(values.tolist()):
        if math.isnan(value):
            whole.append(None)
        elif value.is_integer() and abs(value) < 2**53:
            whole.append(int(value))
        else:
            bad[index] = f"{value:g} is no whole number"
            whole.append(None)
    return whole
