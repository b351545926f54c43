"""Tables of one row a candidate."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator
from typing import Any

import numpy as np

from tui.errors import InputError, TableError
from tui.model import Candidate, Measurement
from tui.readers.cells import lost_digits, texts
from tui.readers.collector import collector_at_rest
from tui.readers.factcells import fact_values
from tui.readers.measure import NO_ERROR, floor_caution, measure, measurements, refusals
from tui.readers.names import clean_names
from tui.readers.plan import Plan
from tui.readers.records import RawTable, Refused


class WideReader:
    """Reads a wide table in parts, keeping in mind which names it has met."""

    def __init__(self, table: RawTable, plan: Plan) -> None:
        self.table = table
        self.plan = plan
        self.refused: list[Refused] = [*table.refused, *plan.refused]
        self.met: dict[str, int] = {}  # name -> row
        self.without_error: Counter[str] = Counter()
        self._wrong_facts: set[str] = set()
        self.cautions: list[str] = [*table.cautions, *plan.cautions]
        if lost_digits(table.columns[plan.name]):
            if plan.name_prefix:
                mend = "write the column as text or whole numbers, not through a spreadsheet"
                raise TableError(table.path, f"the long numbers of {plan.name} have lost their last digits: {mend}.")
            self.cautions.append(
                f"{plan.name}: long numbers in this column have lost their last digits; store them as text or integers"
            )

    def parts(self, size: int) -> Iterator[list[Candidate]]:
        """The candidates, `size` rows at a time; refusals are added as they are met."""
        for begin in range(0, len(self.table), size):
            with collector_at_rest():
                found = self._candidates(self.table.part(begin, begin + size))
            yield found

    def closing_cautions(self) -> list[str]:
        """All cautions, once every part was read."""
        counted = [floor_caution(band, count) for band, count in self.without_error.items()]
        return [*self.cautions, *counted]

    def _candidates(self, table: RawTable) -> list[Candidate]:
        names, keep = self._names(table)
        found: list[list[Measurement]] = [[] for _ in names]
        for columns in self.plan.bands:
            out = measure(columns, table, self.plan.units)
            self._note_refusals(refusals(out, table), keep, table)
            if missing := out.note.count(NO_ERROR):
                self.without_error[columns.band.name] += missing
            for row, measurement in measurements(out, columns, table):
                found[row].append(measurement)
        facts = self._facts(table, keep)
        return [Candidate(names[row], tuple(found[row]), facts[row]) for row in np.flatnonzero(keep).tolist()]

    def _names(self, table: RawTable) -> tuple[list[str], np.ndarray]:
        """The names, and which rows have one that is usable and new."""
        cells = texts(table.columns[self.plan.name])
        if self.plan.name_prefix:
            cells = [
                f"{self.plan.name_prefix}{'' if self.plan.name_prefix.endswith('J') else ' '}{cell}" if cell else ""
                for cell in cells
            ]
        names, reasons = clean_names(cells)
        keep = np.ones(len(names), dtype=bool)
        for row, name in enumerate(names):
            number = int(table.row_numbers[row])
            reason = reasons.get(row, "")
            if not reason and name in self.met:
                reason = f"row {self.met[name]} has the same name"
            if reason:
                keep[row] = False
                self.refused.append(Refused(table.path, number, "name", reason))
            else:
                self.met[name] = number
        return names, keep

    def _note_refusals(self, refused: list[Refused], keep: np.ndarray, table: RawTable) -> None:
        """Bad cells of rows that are kept: those of refused rows need no second mention."""
        if refused:
            kept = set(table.row_numbers[keep].tolist())
            self.refused += [entry for entry in refused if entry.row in kept]

    def _facts(self, table: RawTable, keep: np.ndarray) -> list[dict[str, Any]]:
        facts: list[dict[str, Any]] = [{} for _ in range(len(table))]
        for plan in self.plan.facts:
            column = table.columns[plan.column]
            try:
                values, bad = fact_values(plan, column, self.plan.units.get(plan.column, ""))
            except InputError as error:
                if plan.column not in self._wrong_facts:
                    self._wrong_facts.add(plan.column)
                    self.refused.append(Refused(table.path, 0, plan.column, str(error)))
                continue
            cells = [
                Refused(table.path, int(table.row_numbers[row]), plan.column, why) for row, why in sorted(bad.items())
            ]
            self._note_refusals(cells, keep, table)
            name = plan.fact.name
            for row, value in enumerate(values):
                if value is not None:
                    facts[row][name] = value
        return facts
