"""A side table opened: its columns by what they are, its names, its refusals."""

from __future__ import annotations

import math
import os
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from tui.errors import TableError
from tui.model import FloatArray
from tui.readers.cells import SENTINELS, numbers, texts
from tui.readers.columnmap import ColumnMap
from tui.readers.files import open_table
from tui.readers.names import clean_names
from tui.readers.records import Column, Refused


class SideTable:
    """A side table opened: its columns by what they are, its names, and what had to be refused."""

    def __init__(
        self, path: str | os.PathLike[str], column_map: ColumnMap, needed: Sequence[str], optional: Sequence[str]
    ) -> None:
        self.table = open_table(path)
        self.refused: list[Refused] = list(self.table.refused)
        self.units = dict(column_map.units)
        self.columns = self._columns(column_map, (*needed, *optional))
        for key in needed:
            if key not in self.columns:
                wanted = ", ".join(needed)
                raise TableError(self.table.path, f"there is no column {key!a}: this table needs {wanted}.")
        self.names, reasons = clean_names(self.texts("name"))
        self.usable = np.ones(len(self.table), dtype=bool)
        for row, why in reasons.items():
            self.refuse(row, "name", why)

    def _columns(self, column_map: ColumnMap, keys: Sequence[str]) -> dict[str, Column]:
        lowered = {name.lower(): column for name, column in self.table.columns.items()}
        found = {key: lowered[key] for key in keys if key in lowered}
        for key, name in column_map.columns.items():
            if key in keys:
                if name not in self.table.columns:
                    raise TableError(column_map.path, f"[columns] {key} = {name!a}: the table has no such column.")
                found[key] = self.table.columns[name]
        return {
            key: replace(column, unit=self.units.get(key) or self.units.get(column.name) or column.unit)
            for key, column in found.items()
        }

    @property
    def unknown(self) -> list[str]:
        """Columns that this table has and that are not read."""
        used = {column.name for column in self.columns.values()}
        return [name for name in self.table.columns if name not in used]

    def refuse(self, row: int, key: str, why: str) -> None:
        """Leave a row out and say why."""
        self.usable[row] = False
        column = self.columns[key].name if key in self.columns else key
        self.refused.append(Refused(self.table.path, int(self.table.row_numbers[row]), column, why))

    def texts(self, key: str) -> list[str]:
        """A column as texts; empty ones where the table has no such column."""
        return texts(self.columns[key]) if key in self.columns else [""] * len(self.table)

    def numbers(self, key: str) -> FloatArray:
        """A column as numbers; rows with a bad cell are refused."""
        if key not in self.columns:
            return np.full(len(self.table), math.nan)
        values, bad = numbers(self.columns[key], SENTINELS)
        for row, why in bad.items():
            self.refuse(row, key, why)
        return values
