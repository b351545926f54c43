"""Long tables: one row a measurement, `name, band, value, error, unit` and more."""

from __future__ import annotations

import math
from collections import Counter, defaultdict
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np

from tui.errors import InputError, TableError
from tui.model import Candidate, Measurement
from tui.readers.cells import MAG_SENTINELS, SENTINELS, numbers, quoted, texts, truths
from tui.readers.factcells import fact_values
from tui.readers.measure import (
    NO_ERROR,
    Values,
    error_sentinels,
    finish,
    floor_caution,
    note_bad_errors,
    set_errors,
    set_levels,
    start,
)
from tui.readers.names import clean_names
from tui.readers.native import band_name, fact_column
from tui.readers.plan import FactColumn
from tui.readers.recognise import Words
from tui.readers.records import Column, RawTable, Refused
from tui.readers.units import Scale, relative_error, scale

NEEDED = ("name", "band", "value")
OPTIONAL = ("error", "unit", "error_unit", "limit", "nsigma", "flag", "epoch", "source", "exclude", "note")
TEXTS = ("name", "band", "unit", "error_unit", "flag", "epoch", "source", "note")
Group = tuple[str, str, str]  # band, unit, unit of the error


def long_columns(table: RawTable, words: Words) -> dict[str, str] | None:
    """What it is -> the table's column, of a long table; None where the table is not one."""
    mapped = {target: column for target, column in words.column_map.columns.items() if target in (*NEEDED, *OPTIONAL)}
    for name in table.columns:
        if name.lower() in (*NEEDED, *OPTIONAL):
            mapped.setdefault(name.lower(), name)
    for target, column in mapped.items():
        if column not in table.columns:
            raise TableError(words.column_map.path, f"[columns] {target} = {column!a}: the table has no such column.")
    return mapped if all(target in mapped for target in NEEDED) else None


class LongReader:
    """Reads a long table as a whole: the rows of one candidate may lie anywhere."""

    def __init__(self, table: RawTable, columns: Mapping[str, str], words: Words) -> None:
        self.table, self.columns, self.words = table, columns, words
        self.refused: list[Refused] = list(table.refused)
        self.cautions: list[str] = list(table.cautions)
        self.unknown: list[str] = []

    def candidates(self) -> list[Candidate]:
        """All candidates, in the order in which their names first stand."""
        texts_of = {key: texts(self._column(key)) for key in TEXTS if key in self.columns}
        names, reasons = clean_names(texts_of["name"])
        for row, why in reasons.items():
            self._refuse(row, "name", why)
        usable = np.array([row not in reasons for row in range(len(names))], dtype=bool)
        groups = self._groups(texts_of, usable)
        found: dict[str, dict[tuple[str, str, str], tuple[int, Measurement]]] = {
            name: {} for row, name in enumerate(names) if usable[row]
        }
        self._numbers = self._read_numbers()
        by_row: dict[int, Measurement] = {}
        for group, rows in groups.items():
            by_row.update(self._measure(group, rows, texts_of))
        self._keep(by_row, names, found)
        self._count_missing(by_row)
        facts = self._facts(names, usable)
        return [
            Candidate(name, tuple(m for _, m in rows.values()), facts.get(name, {})) for name, rows in found.items()
        ]

    def _column(self, key: str) -> Column:
        return self.table.columns[self.columns[key]]

    def _refuse(self, row: int, key: str, why: str) -> None:
        number = int(self.table.row_numbers[row])
        self.refused.append(Refused(self.table.path, number, self.columns.get(key, key), why))

    def _label(self, texts_of: Mapping[str, list[str]], row: int, band: str = "") -> str:
        own = texts_of["source"][row] if "source" in texts_of else ""
        mapped = self.words.column_map.sources.get(band) or self.words.column_map.label
        return own or mapped or self.words.source or Path(self.table.path).stem

    def _groups(self, texts_of: Mapping[str, list[str]], usable: np.ndarray) -> dict[Group, list[int]]:
        """Rows by band and unit; rows whose band is unknown are refused."""
        value_unit = self.words.column_map.units.get("value") or self._column("value").unit
        error_unit = self._column("error").unit if "error" in self.columns else ""
        groups: dict[Group, list[int]] = defaultdict(list)
        for row in np.flatnonzero(usable).tolist():
            given = texts_of["band"][row]
            label = (
                texts_of["source"][row] if "source" in texts_of else self.words.source or self.words.column_map.label
            )
            band = band_name(given, self.words.bands, self.words.aliases, label)
            if not band:
                why = (
                    f"{quoted(given)} is no known band: correct it, or add the band in a column map"
                    if given
                    else "no band is given"
                )
                self._refuse(row, "band", why)
                continue
            unit = (texts_of["unit"][row] if "unit" in texts_of else "") or value_unit
            own = (texts_of["error_unit"][row] if "error_unit" in texts_of else "") or error_unit
            groups[band, unit, own].append(row)
        return groups

    def _read_numbers(self) -> dict[str, Any]:
        found: dict[str, Any] = {}
        for key in ("value", "error", "nsigma"):
            if key in self.columns:
                found[key] = numbers(self._column(key))
        for key in ("limit", "exclude"):
            if key in self.columns:
                found[key] = truths(self._column(key))
        return found

    def _part(self, key: str, rows: list[int]) -> tuple[np.ndarray, dict[int, str]]:
        """A column's values in some rows, and its bad cells by their place among these."""
        values, bad = self._numbers[key]
        return values[rows].copy(), {place: bad[row] for place, row in enumerate(rows) if row in bad}

    def _measure(self, group: Group, rows: list[int], texts_of: Mapping[str, list[str]]) -> dict[int, Measurement]:
        band, unit, error_unit = group
        try:
            own = self._scale(band, unit)
            given = self._scale(band, error_unit) if error_unit and relative_error(error_unit) is None else None
        except InputError as error:
            for row in rows:
                self._refuse(row, "unit", str(error))
            return {}
        out = self._values(rows, own, given, relative_error(error_unit))
        for (place, key), why in sorted(out.bad.items()):
            self._refuse(rows[place], key, why)
        for place, row in enumerate(rows):
            if not out.present[place] and not any(at == place for at, _ in out.bad):
                self._refuse(row, "value", "no value is given")
        return self._records(band, rows, out, texts_of)

    def _scale(self, band: str, unit: str) -> Scale:
        return scale(unit, self.words.bands[band], is_mag=False)

    def _values(self, rows: list[int], own: Scale, given: Scale | None, share: float | None) -> Values:
        values, bad = self._part("value", rows)
        for sentinel in SENTINELS if own.kind == "linear" else MAG_SENTINELS:
            values[np.isclose(values, sentinel, rtol=1e-6, atol=0)] = math.nan
        out = start(values, bad, "value", own)
        if "error" in self.columns:
            error, wrong = self._part("error", rows)
            note_bad_errors(out, wrong, "error")
            for sentinel in error_sentinels(given or own, share):
                error[np.isclose(error, sentinel, rtol=1e-6, atol=0)] = math.nan
            set_errors(out, own, error, given, share)
        if "limit" in self.columns:
            out.limit, wrong = self._part("limit", rows)
            for place, why in wrong.items():
                out.bad[place, "limit"] = why
                out.present[place] = False
        if "nsigma" in self.columns:
            set_levels(out, *self._with_bad("nsigma", rows))
        finish(out, "value", "error")
        return out

    def _with_bad(self, key: str, rows: list[int]) -> tuple[np.ndarray, str, dict[int, str]]:
        values, bad = self._part(key, rows)
        return values, key, bad

    def _records(
        self, band: str, rows: list[int], out: Values, texts_of: Mapping[str, list[str]]
    ) -> dict[int, Measurement]:
        excluded, wrong = self._numbers.get("exclude", (None, {}))
        found = {}
        for place, row in enumerate(rows):
            if row in wrong:
                self._refuse(row, "exclude", wrong[row])
            elif out.present[place]:
                flag = texts_of["flag"][row] if "flag" in texts_of else ""
                note = texts_of["note"][row] if "note" in texts_of else ""
                found[row] = Measurement(
                    band,
                    float(out.flux_jy[place]),
                    float(out.error_jy[place]),
                    bool(out.limit[place]),
                    float(out.nsigma[place]) if out.limit[place] else 2.0,
                    self._label(texts_of, row, band),
                    texts_of["epoch"][row] if "epoch" in texts_of else "",
                    {"flag": flag} if flag else {},
                    bool(excluded[row]) if excluded is not None else False,
                    float(out.value[place]),
                    float(out.value_error[place]),
                    out.unit[place],
                    "; ".join(filter(None, (note, out.note[place]))),
                )
        return found

    def _keep(
        self,
        by_row: Mapping[int, Measurement],
        names: list[str],
        found: dict[str, dict[tuple[str, str, str], tuple[int, Measurement]]],
    ) -> None:
        """One measurement a candidate, band, source and epoch: a second one that differs is refused."""
        repeated = 0
        for row in sorted(by_row):
            measurement = by_row[row]
            mine = found[names[row]]
            key = (measurement.band, measurement.source, measurement.epoch)
            if key not in mine:
                mine[key] = (row, measurement)
            elif _same(mine[key][1], measurement):
                repeated += 1
            else:
                first = int(self.table.row_numbers[mine[key][0]])
                why = f"row {first} has another value of this band, source and epoch: give each its own source or epoch"
                self._refuse(row, "band", why)
        if repeated:
            self.cautions.append(f"{repeated} rows repeat earlier ones and add nothing")

    def _count_missing(self, by_row: Mapping[int, Measurement]) -> None:
        missing = Counter(m.band for m in by_row.values() if NO_ERROR in m.note)
        self.cautions += [floor_caution(band, count) for band, count in missing.items()]

    def _facts(self, names: list[str], usable: np.ndarray) -> dict[str, dict[str, Any]]:
        """Facts beside the measurements: the first row of a candidate that has one."""
        facts: dict[str, dict[str, Any]] = {}
        taken = set(self.columns.values())
        for column in (name for name in self.table.columns if name not in taken):
            fact, _ = fact_column(column, self.words.facts, column)
            if fact is None:
                self.unknown.append(column)
                continue
            try:
                values, bad = fact_values(FactColumn(fact, column), self.table.columns[column])
            except InputError as error:
                self.refused.append(Refused(self.table.path, 0, column, str(error)))
                continue
            for row, why in bad.items():
                self._refuse(row, column, why)
            for row in np.flatnonzero(usable).tolist():
                if values[row] is not None:
                    facts.setdefault(names[row], {}).setdefault(fact.name, values[row])
        return facts


def _same(one: Measurement, other: Measurement) -> bool:
    return (one.flux_jy, one.limit) == (other.flux_jy, other.limit) and (
        one.error_jy == other.error_jy or (math.isnan(one.error_jy) and math.isnan(other.error_jy))
    )
