"""From the column names of a wide table (one row a candidate) to a plan of what each is for."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path

from tui.errors import InputError, TableError
from tui.model import Band
from tui.readers.archives import Archive, Entry
from tui.readers.cells import texts
from tui.readers.claims import Claim, claim_columns, stem_of
from tui.readers.columnmap import ColumnMap
from tui.readers.native import NativeColumn, fact_column, native_columns
from tui.readers.plan import BandColumns, FactColumn, FlagColumn, Plan
from tui.readers.records import FactRow, RawTable, Refused
from tui.readers.units import relative_error, scale

SAMPLE_ROWS = 200  # rows looked at to see how many letters a flag has
VALUE_ROLES = ("mag", "flux")
NAME_SPELLINGS = ("name", "Name", "NAME", "main_id", "MAIN_ID", "name_1", "Name_1")


@dataclass(frozen=True, slots=True)
class Words:
    """The names a reader may meet, handed in by the caller."""

    bands: Mapping[str, Band]
    aliases: Mapping[str, str]
    facts: Mapping[str, FactRow]
    archives: Sequence[Archive]
    column_map: ColumnMap = field(default_factory=ColumnMap)
    source: str = ""  # --source

    def label(self, path: str, band: str = "", archive: str = "") -> str:
        """The source label: column map, --source, the catalogue's name, the file's stem."""
        mapped = self.column_map.sources.get(band) or self.column_map.label
        return mapped or self.source or archive or Path(path).stem


@dataclass(slots=True)
class _Work:
    """A plan while it is being made."""

    table: RawTable
    words: Words
    used: set[str] = field(default_factory=set)
    bands: list[BandColumns] = field(default_factory=list)
    facts: dict[str, FactColumn] = field(default_factory=dict)
    cautions: list[str] = field(default_factory=list)
    refused: list[Refused] = field(default_factory=list)
    units: dict[str, str] = field(default_factory=dict)

    @property
    def free(self) -> list[str]:
        return [name for name in self.table.columns if name not in self.used]


def recognise(table: RawTable, words: Words) -> Plan:
    """The plan of a wide table.

    Raises:
        TableError: no column names the candidates, or the column map names what is not there.
    """
    work = _Work(table, words)
    mapped = _apply_map(work)
    native = [column for column in mapped if column.field]
    label = words.column_map.label or words.source
    native += native_columns(work.free, words.bands, words.aliases, label)
    _add_native(work, native)
    name, prefix = _own_name(work, mapped)
    claims = claim_columns(
        list(table.columns), words.archives, lambda column: _letters(table, column), frozenset(work.used)
    )
    work.cautions += claims.cautions
    for claim in claims.found:
        _add_archive(work, claim)
    if not name:
        name, prefix = _archive_name(work, claims.found)
    work.used.add(name)
    _add_facts(work)
    _add_native(work, native_columns(work.free, words.bands, words.aliases, label, folded=True))
    _add_position(work, claims.found)
    _tell_apart(work)
    return Plan(
        name, prefix, tuple(work.bands), tuple(work.facts.values()), tuple(work.free), tuple(work.cautions),
        tuple(work.refused), work.units,
    )  # fmt: skip


def _apply_map(work: _Work) -> list[NativeColumn]:
    """The columns that the map names, as native ones; facts and the name have no field."""
    column_map, mapped = work.words.column_map, []
    for target, column in column_map.columns.items():
        if column not in work.table.columns:
            raise TableError(column_map.path, f"[columns] {target} = {column!a}: the table has no such column.")
        native = native_columns([target], work.words.bands, work.words.aliases, column_map.label or work.words.source)
        if native:
            mapped.append(replace(native[0], column=column))
        elif target == "name":
            mapped.append(NativeColumn(column, "", ""))
        elif target in work.words.facts:
            work.facts[target] = FactColumn(work.words.facts[target], column)
        else:
            raise TableError(
                column_map.path, f"[columns] {target!a} is neither name, a fact, nor BAND_mag, BAND_flux, BAND_err ..."
            )
        work.used.add(column)
    for target, unit in column_map.units.items():
        column = column_map.columns.get(target, target)
        if column not in work.table.columns:
            raise TableError(column_map.path, f"[units] {target}: the table has no such column.")
        work.units[column] = unit
    return mapped


def _own_name(work: _Work, mapped: list[NativeColumn]) -> tuple[str, str]:
    named = [column.column for column in mapped if not column.field]
    found = named or [name for name in NAME_SPELLINGS if name in work.table.columns]
    work.used.update(found[:1])
    return (found[0], "") if found else ("", "")


def _archive_name(work: _Work, claims: Sequence[Claim]) -> tuple[str, str]:
    for claim in claims:
        for entry in claim.archive.entries:
            if entry.role == "name" and (column := claim.find(entry)):
                work.cautions.append(f"there is no column name: candidates are named by {column}")
                return column, entry.option("prefix")
    raise TableError(
        work.table.path, 'there is no column "name": rename one, or say which in a column map ([columns] name = "...").'
    )


def _letters(table: RawTable, column: str) -> int:
    """The usual number of letters in a column's cells."""
    cells = [cell for cell in texts(table.columns[column].part(0, SAMPLE_ROWS)) if cell]
    lengths = [len(cell) for cell in cells]
    return max(set(lengths), key=lengths.count) if lengths else 0


def _add_native(work: _Work, columns: Sequence[NativeColumn]) -> None:
    """Bands of native columns; one group a band and cross-match suffix."""
    groups: dict[tuple[str, str], dict[str, str]] = {}
    for column in columns:
        groups.setdefault((column.band, column.digit), {})[column.field] = column.column
    for (band, digit), fields in groups.items():
        value = fields.get("mag") or fields.get("flux")
        if value is None:
            continue  # an error without a value stays unknown, and is listed
        work.used.update(fields.values())
        if "mag" in fields and "flux" in fields:
            _refuse_column(work, fields["flux"], f"{fields['mag']} gives the same band: keep one of them")
        label = work.words.label(work.table.path, band)
        several = (
            sum(other == band and "mag" in f or "flux" in f for (other, _), f in groups.items() if other == band) > 1
        )
        _add_band(
            work, _native_band(work.words.bands[band], fields, f"{label} {digit}" if several and digit else label)
        )


def _native_band(band: Band, fields: Mapping[str, str], label: str) -> BandColumns:
    flags = (FlagColumn("flag", fields["flag"]),) if "flag" in fields else ()
    return BandColumns(
        band=band,
        source=label,
        value=fields.get("mag") or fields["flux"],
        is_mag="mag" in fields,
        unit="",
        error=fields.get("err", ""),
        limit=fields.get("limit", ""),
        nsigma=fields.get("nsigma", ""),
        epoch=fields.get("epoch", ""),
        exclude=fields.get("exclude", ""),
        note=fields.get("note", ""),
        source_column=fields.get("source", ""),
        flags=flags,
    )


def _add_band(work: _Work, band: BandColumns) -> None:
    """Keep a band if its units can be understood; else refuse the column, with the mend."""
    for column, planned, is_mag in (
        (band.value, band.unit, band.is_mag), (band.error, band.error_unit, True), (band.upper, band.upper_unit, True)
    ):  # fmt: skip
        if not column:
            continue
        unit = work.units.get(column) or work.table.columns[column].unit or planned
        try:
            if relative_error(unit) is None or column != band.error:
                scale(unit, band.band, is_mag=is_mag)
        except InputError as error:
            _refuse_column(work, column, str(error))
            if column == band.value:
                return
            band = replace(band, error="") if column == band.error else replace(band, upper="")
    work.bands.append(band)


def _tell_apart(work: _Work) -> None:
    """Two measurements of one band under one label get the column's name into it: they are two, not two versions."""
    met: set[tuple[str, str]] = set()
    for index, band in enumerate(work.bands):
        if (band.band.name, band.source) in met:
            work.bands[index] = band = replace(band, source=f"{band.source} {band.value or band.counts}")
        met.add((band.band.name, band.source))


def _refuse_column(work: _Work, column: str, reason: str) -> None:
    work.refused.append(Refused(work.table.path, 0, column, reason))


def _add_archive(work: _Work, claim: Claim) -> None:
    """The bands and facts of one catalogue."""
    by_band: dict[str, list[Entry]] = {}
    for entry in claim.archive.entries:
        condition = entry.option("with")
        if not claim.find(entry) or (condition and condition not in claim.columns):
            continue
        if entry.role == "fact":
            _add_archive_fact(work, claim, entry)
        elif entry.role != "name":
            for target in entry.targets:
                by_band.setdefault(target, []).append(entry)
    work.used.update(claim.columns.values())
    for name, entries in by_band.items():
        if name in work.words.bands and any(entry.role in (*VALUE_ROLES, "counts") for entry in entries):
            label = work.words.label(work.table.path, name, claim.archive.label)
            _add_band(work, _archive_band(work.words.bands[name], claim, entries, label))


def _add_archive_fact(work: _Work, claim: Claim, entry: Entry) -> None:
    name = entry.targets[0]
    if name in work.words.facts and name not in work.facts:
        days = entry.how if entry.how in ("MJD", "JD") else ""
        work.facts[name] = FactColumn(work.words.facts[name], claim.find(entry), entry.unit, days)


def _archive_band(band: Band, claim: Claim, entries: Sequence[Entry], label: str) -> BandColumns:
    first: dict[str, Entry] = {}
    for entry in entries:
        first.setdefault("value" if entry.role in VALUE_ROLES else entry.role, entry)

    def column(role: str) -> str:
        return claim.find(first[role]) if role in first else ""

    value, limit, sure, upper = (first.get(role) for role in ("value", "limit", "detection", "upper"))
    letters, _, level = limit.how.rpartition(" at ") if limit else ("", "", "2")
    return BandColumns(
        band=band,
        source=label,
        value=column("value"),
        is_mag=value is None or value.role == "mag",
        unit=value.unit if value else "mag",
        error=column("error"),
        error_unit=first["error"].unit if "error" in first else "",
        over_error=column("over_error"),
        snr=column("snr"),
        counts=column("counts") if "counts_error" in first else "",
        counts_error=column("counts_error"),
        counts_zero=float(first["counts"].option("zero")) if "counts" in first else float("nan"),
        limit_flag=_flag(band.name, claim, limit) if limit else None,
        limit_letters=letters.replace(" ", ""),
        limit_nsigma=float(level),
        sure_flag=_flag(band.name, claim, sure) if sure else None,
        sure_letters=sure.how if sure else "",
        upper=column("upper") if value else "",
        upper_unit=upper.unit if upper else "",
        upper_nsigma=float(upper.option("at")) if upper else 3.0,
        null_error=claim.archive.null_error,
        epoch=column("epoch"),
        epoch_word=first["epoch"].how if "epoch" in first else "",
        flags=tuple(_flag(band.name, claim, entry) for entry in entries if entry.role == "flag"),
    )


def _flag(band: str, claim: Claim, entry: Entry) -> FlagColumn:
    """A flag of one band; a split one, or a limit over several bands, is one letter of its text."""
    is_split = entry.how == "split" or (entry.role in ("limit", "detection") and len(entry.targets) > 1)
    if not is_split:
        return FlagColumn(entry.columns[0], claim.find(entry))
    return FlagColumn(entry.columns[0], claim.find(entry), entry.targets.index(band), len(entry.targets))


def _add_facts(work: _Work) -> None:
    """Facts in the native form; of a cross-match's `_1` and `_2` the first table's."""
    hidden: list[tuple[str, FactRow]] = []
    for name in work.free:
        fact, is_hidden = fact_column(name, work.words.facts, stem_of(name))
        if fact is None:
            continue
        if is_hidden:
            hidden.append((name, fact))
        elif fact.name not in work.facts:
            work.facts[fact.name] = FactColumn(fact, name)
            work.used.add(name)
    for name, fact in hidden:
        if fact.name not in work.facts:
            work.facts[fact.name] = FactColumn(fact, name)
            work.used.add(name)
            work.cautions.append(f"{name}: taken as {fact.name}")


def _add_position(work: _Work, claims: Sequence[Claim]) -> None:
    """Where nothing else gives ra and dec, the position of the first catalogue that has one."""
    if "ra" in work.facts or "dec" in work.facts:
        return
    for name, found in list(work.facts.items()):
        other = name.removesuffix("_ra") + "_dec"
        if name.endswith("_ra") and other in work.facts and {"ra", "dec"} <= work.words.facts.keys():
            work.facts["ra"] = replace(found, fact=work.words.facts["ra"])
            work.facts["dec"] = replace(work.facts[other], fact=work.words.facts["dec"])
            work.cautions.append(f"ra and dec are those of {found.column} and {work.facts[other].column}")
            return
