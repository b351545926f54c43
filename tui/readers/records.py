"""What a reader takes in and hands on: a raw table, what was read of it, what was refused."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Any, Protocol

import numpy as np

from tui.model import Band, Candidate


class FactRow(Protocol):
    """What the readers need to know of a fact: a row of tui/data/facts.csv."""

    @property
    def name(self) -> str: ...  # noqa: D102

    @property
    def unit(self) -> str: ...  # noqa: D102

    @property
    def kind(self) -> str: ...  # noqa: D102


@dataclass(frozen=True, slots=True, eq=False)
class Column:
    """One column of a file: N cells, either texts ("" where empty) or a numeric array with a mask."""

    name: str
    cells: Sequence[str] | np.ndarray
    mask: np.ndarray | None = None  # shape (N,), True where the file says that the cell is empty
    unit: str = ""

    @property
    def is_text(self) -> bool:
        """Whether the cells are texts, as all cells of CSV files are."""
        return not isinstance(self.cells, np.ndarray) or self.cells.dtype.kind == "T"

    @property
    def texts(self) -> list[str]:
        """The cells of a column of texts, as they lie."""
        return self.cells.tolist() if isinstance(self.cells, np.ndarray) else list(self.cells)

    def part(self, start: int, stop: int) -> Column:
        """The rows from `start` up to `stop`."""
        mask = None if self.mask is None else self.mask[start:stop]
        return replace(self, cells=self.cells[start:stop], mask=mask)


@dataclass(frozen=True, slots=True)
class Refused:
    """A row, a cell or a whole column that could not be taken."""

    file: str
    row: int  # 1 is the first row of data; 0 is the table's head: the whole column is left out
    column: str  # "name": the row as a whole is left out; any other: that cell only
    reason: str

    def __str__(self) -> str:
        place = f"row {self.row}" if self.row else "head"
        return f"{self.file}, {place}, column {self.column}: {self.reason}"


@dataclass(frozen=True, slots=True, eq=False)
class RawTable:
    """A file as it lies: columns of equal length, the number of each row, and rows too broken to have cells."""

    path: str
    columns: Mapping[str, Column]
    row_numbers: np.ndarray  # shape (N,), 1 is the first row of data
    refused: tuple[Refused, ...] = ()
    cautions: tuple[str, ...] = ()
    unread: Mapping[str, str] = field(default_factory=dict)  # column without plain cells -> what it holds

    def __len__(self) -> int:
        return len(self.row_numbers)

    def part(self, start: int, stop: int) -> RawTable:
        """The rows from `start` up to `stop`, without the refusals, which belong to the whole."""
        columns = {name: column.part(start, stop) for name, column in self.columns.items()}
        return RawTable(self.path, columns, self.row_numbers[start:stop])


@dataclass(frozen=True, slots=True)
class TableContents:
    """What one table gave."""

    candidates: list[Candidate]
    refused: list[Refused] = field(default_factory=list)
    unknown_columns: list[str] = field(default_factory=list)
    cautions: list[str] = field(default_factory=list)
    source: str = ""  # the label of measurements that have no catalogue of their own
    user_bands: Mapping[str, Band] = field(default_factory=dict)  # bands that the column map defines


@dataclass(frozen=True, slots=True)
class SideContents:
    """What a side table gave: rows of one candidate each under its name."""

    rows: Mapping[str, Any]  # name -> tuple of Dip, tuple of Neighbour, or one Spectrum
    refused: list[Refused] = field(default_factory=list)
    unknown_columns: list[str] = field(default_factory=list)
    cautions: list[str] = field(default_factory=list)
