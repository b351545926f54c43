"""One row of the vetted list, what a column is, and the cells of all rows."""

from __future__ import annotations

import math
import sys
from array import array
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tui.model import Evidence, Fit

SHORT = 40  # characters up to which a text is likely to occur again


@dataclass(frozen=True, slots=True)
class VettedRow:
    """All that one row of the list is made of."""

    name: str
    facts: Mapping[str, Any]
    outcome: str
    pending_reason: str
    states: Mapping[str, str]
    counts: Mapping[str, Mapping[str, int]]  # check -> ruling -> how many current ones
    revised: Mapping[str, int]
    stale: Mapping[str, int]
    evidence: Mapping[str, Evidence]
    oddness: Mapping[str, Any] = field(default_factory=dict)  # sigma, band, pull
    photosphere: str = ""
    law: str = ""
    held_r_v: float | None = None  # of the settings, where R_V is not free

    def best(self, kind: str) -> Fit | None:
        """The best fit of one kind of evidence, or None."""
        found = self.evidence.get(kind)
        return found.best if found else None

    def fact(self, kind: str, name: str) -> Any:
        """A fact of one kind of evidence, or None."""
        found = self.evidence.get(kind)
        return found.facts.get(name) if found else None


@dataclass(frozen=True, slots=True)
class ExportColumn:
    """One column: `take` returns its value for a row, None where it is to be masked."""

    name: str
    kind: type  # str, int or float
    description: str
    take: Callable[[VettedRow], Any]
    unit: str = ""
    ucd: str = ""


INT_NULL = -2147483648  # no count or number of degrees of freedom; TNULL of FITS integer columns


class Cells:
    """The cells of the list, column by column, as small as numbers are: a million rows fit in memory."""

    def __init__(self, columns: Sequence[ExportColumn]) -> None:
        self.columns = tuple(columns)
        new = {float: lambda: array("d"), int: lambda: array("i"), str: list}
        self._values: dict[str, Any] = {column.name: new[column.kind]() for column in columns}

    def __len__(self) -> int:
        return len(self._values[self.columns[0].name])

    def add(self, row: VettedRow) -> None:
        """Take one row's cells."""
        for column in self.columns:
            value = column.take(row)
            if value is None:
                value = {float: math.nan, int: INT_NULL, str: None}[column.kind]
            elif column.kind is str:
                value = sys.intern(value) if len(value) < SHORT else value
            self._values[column.name].append(value)

    def column(
        self, column: ExportColumn, clean: Callable[[str], str] = str
    ) -> tuple[NDArray[Any], NDArray[np.bool_]]:
        """Values and mask of one column, shape (N,) each; a filler stands where masked, texts go through `clean`."""
        raw = self._values[column.name]
        if column.kind is str:
            filled = np.array(["" if value is None else clean(value) for value in raw], dtype=np.str_ if raw else "U1")
            return filled, np.array([value is None for value in raw], dtype=bool)
        values = np.array(raw, dtype=np.float64 if column.kind is float else np.int32)
        return values, np.isnan(values) if column.kind is float else values == INT_NULL

    def rows(self) -> Iterator[list[Any]]:
        """Each row's cells, None where masked."""
        for values in zip(*(self._values[column.name] for column in self.columns), strict=True):
            yield [None if value is None or value == INT_NULL or value != value else value for value in values]


def as_type(value: Any, type_: type) -> Any:
    """A fact as its column holds it; a list of names becomes one text."""
    if value is None:
        return None
    if type_ is str:
        return " ".join(map(str, value)) if isinstance(value, (list, tuple)) else str(value)
    number = finite(value)
    return None if number is None else type_(number)


def finite(value: Any) -> Any:
    """A number, or None where it is none or not finite; integers stay integers."""
    if isinstance(value, bool) or not isinstance(value, (int, float)):
        return None
    return value if math.isfinite(value) else None
