"""One band's columns, cell by cell at once, to flux densities with errors or upper limits (physics.md §1)."""

from __future__ import annotations

import math
from dataclasses import dataclass, field, replace

import numpy as np

from tui.model import FloatArray, Measurement
from tui.readers.cells import (
    ERROR_SENTINELS,
    MAG_ERROR_SENTINELS,
    MAG_SENTINELS,
    SENTINELS,
    Bad,
    numbers,
    texts,
    truths,
)
from tui.readers.plan import BandColumns, FlagColumn
from tui.readers.records import Column, RawTable, Refused
from tui.readers.units import BRIGHTEST_MAG, FAINTEST_MAG, LARGEST_JY, MAG_PER_RATIO, Scale, relative_error, scale

NO_ERROR = "no error given: the band's floor stands in"
FROM_COUNTS = "flux from {}: the catalogue has no magnitude with an error"
FROM_SNR = "flux from the catalogue's limit and its signal-to-noise"
NO_ERROR_MAG = 8.0  # in a catalogue's own column an error of so many mag is a flag: 2MASS ph_qual F
LEFT_OUT = "{}; the measurement is left out"


@dataclass(slots=True)
class Values:
    """The measurements of one band in N rows: shape (N,) each; rows without one have `present` False."""

    flux_jy: FloatArray
    error_jy: FloatArray  # NaN for limits and where no error is given
    value: FloatArray
    value_error: FloatArray
    present: np.ndarray
    limit: np.ndarray
    nsigma: FloatArray
    unit: list[str]
    note: list[str]
    bad: dict[tuple[int, str], str]  # (row, column) -> why the cell cannot be taken
    wrong_error: dict[int, str] = field(default_factory=dict)  # row -> why what is given as its error is none

    def bad_rows(self, column: str) -> np.ndarray:
        """Rows whose cell in a column cannot be taken."""
        rows = np.zeros(len(self.flux_jy), dtype=bool)
        rows[[row for row, name in self.bad if name == column]] = True
        return rows


def unit_of(column: Column | None, plan_unit: str, mapped: str = "") -> str:
    """The unit of a column: the column map's, the file's, the archive's."""
    return mapped or (column.unit if column is not None else "") or plan_unit


def start(values: FloatArray, bad: dict[int, str], column: str, unit: Scale) -> Values:
    """Fluxes of the values; magnitudes and fluxes out of any range are bad cells."""
    size = len(values)
    if unit.kind != "linear":
        mag = values * unit.step
        for row in np.flatnonzero((mag < BRIGHTEST_MAG) | (mag > FAINTEST_MAG)).tolist():
            bad[row] = f"{values[row]:g} is no magnitude"
            values[row] = math.nan
    with np.errstate(over="ignore", invalid="ignore"):
        flux = unit.flux(values)
        wild = np.abs(flux) > LARGEST_JY
    for row in np.flatnonzero(wild).tolist():
        bad[row] = f"{values[row]:g} {unit.unit} is no flux density of a star"
    values[wild] = math.nan
    flux[wild] = math.nan
    return Values(
        flux,
        np.full(size, math.nan),
        values,
        np.full(size, math.nan),
        np.isfinite(flux),
        np.zeros(size, dtype=bool),
        np.full(size, 2.0),
        [unit.unit] * size,
        [""] * size,
        {(row, column): why for row, why in bad.items()},
    )


def set_errors(out: Values, unit: Scale, error: FloatArray, error_scale: Scale | None, share: float | None) -> None:
    """Errors in Jy and in the value's unit; NaN where none is given (an empty cell, zero), and where it is wrong.

    An error is never made smaller than it is: one of more than a magnitude is kept, so that the point weighs little.

    Args:
        error_scale: of the error where it differs in kind or unit from the value's.
        share: factor that makes the error a share of the value (percent), else None.
    """
    with np.errstate(invalid="ignore", over="ignore"):
        _note_wrong(out, error < 0, "an error is above zero, and empty where it is not known")
        error = np.where(error > 0, error, math.nan)
        given = error_scale or unit
        if share is not None:
            jy = error * share * np.abs(out.flux_jy)
        elif given.kind == "linear":
            jy = error * given.factor_jy
        else:
            own = given if unit.kind == "linear" else replace(unit, step=given.step)
            jy = own.flux_error(np.abs(out.flux_jy), error)
        is_sound = np.isfinite(jy) & (jy < LARGEST_JY)
        _note_wrong(out, np.isfinite(error) & out.present & ~is_sound, "the error is beyond that of any flux density")
        jy = np.where(is_sound, jy, math.nan)
        out.error_jy = jy
        out.value_error = (
            jy / unit.factor_jy if unit.kind == "linear" else _mag_error(out, unit, jy, error, given, share)
        )


def _note_wrong(out: Values, rows: np.ndarray, why: str) -> None:
    for row in np.flatnonzero(rows).tolist():
        out.wrong_error.setdefault(row, why)


def _mag_error(
    out: Values, unit: Scale, jy: FloatArray, error: FloatArray, given: Scale, share: float | None
) -> FloatArray:
    if share is None and given.kind != "linear":
        return np.where(np.isfinite(jy), error * given.step / unit.step, math.nan)
    return MAG_PER_RATIO * jy / np.abs(out.flux_jy) / unit.step


def measure(columns: BandColumns, table: RawTable, mapped_units: dict[str, str]) -> Values:
    """The measurements of one band in all rows of a wide table."""
    out, unit = _start_band(columns, table, mapped_units)
    if columns.over_error:
        ratio, out.wrong_error = numbers(table.columns[columns.over_error], SENTINELS)
        with np.errstate(divide="ignore", invalid="ignore"):
            set_errors(out, unit, 1.0 / ratio, None, 1.0)
    elif columns.error:
        _errors_of_column(out, columns, table, mapped_units, unit)
    elif columns.counts:
        counts, _ = numbers(table.columns[columns.counts], SENTINELS)
        sigma, out.wrong_error = numbers(table.columns[columns.counts_error], ERROR_SENTINELS)
        with np.errstate(divide="ignore", invalid="ignore"):
            set_errors(out, unit, sigma / np.abs(counts), None, 1.0)
    _limits(out, columns, table)
    _below_the_limit(out, columns, table)
    _uppers(out, columns, table, mapped_units)
    finish(out, columns.value, columns.error or columns.over_error or columns.counts_error)
    return out


def _start_band(columns: BandColumns, table: RawTable, mapped_units: dict[str, str]) -> tuple[Values, Scale]:
    column = table.columns.get(columns.value)
    unit = scale(
        unit_of(column, columns.unit, mapped_units.get(columns.value, "")), columns.band, is_mag=columns.is_mag
    )
    if column is None:
        return start(np.full(len(table), math.nan), {}, columns.counts, unit), unit
    values, bad = numbers(column, SENTINELS if unit.kind == "linear" else MAG_SENTINELS)
    return start(values, bad, columns.value, unit), unit


def _errors_of_column(
    out: Values, columns: BandColumns, table: RawTable, mapped_units: dict[str, str], unit: Scale
) -> None:
    column = table.columns[columns.error]
    text = unit_of(column, columns.error_unit, mapped_units.get(columns.error, ""))
    share = relative_error(text)
    given = scale(text, columns.band, is_mag=True) if text and share is None else None
    error, bad = numbers(column, error_sentinels(given or unit, share))
    note_bad_errors(out, bad, columns.error)
    if columns.error_unit == "mag":  # a catalogue's: a native column has none planned
        with np.errstate(invalid="ignore"):
            error[error > NO_ERROR_MAG] = math.nan
    set_errors(out, unit, error, given, share)


def error_sentinels(given: Scale, share: float | None) -> tuple[float, ...]:
    """The numbers that stand for no error in a column of this kind; 99 may be an error where it is no magnitude's."""
    return ERROR_SENTINELS if given.kind == "linear" or share is not None else MAG_ERROR_SENTINELS


def note_bad_errors(out: Values, bad: Bad, column: str) -> None:
    """Cells of a column of errors that are no numbers: bad cells, and wrong errors of their detections."""
    out.bad.update({(row, column): why for row, why in bad.items()})
    out.wrong_error.update(bad)


def _limits(out: Values, columns: BandColumns, table: RawTable) -> None:
    """Limits that the table or the catalogue's flag names."""
    if columns.limit:
        out.limit, bad = truths(table.columns[columns.limit])
        _drop(out, columns.limit, bad)  # a value that may be a limit is no detection
    if columns.exclude:
        _drop(out, columns.exclude, truths(table.columns[columns.exclude])[1])
    if columns.nsigma:
        level, bad = numbers(table.columns[columns.nsigma])
        set_levels(out, level, columns.nsigma, bad)
    if columns.limit_flag is not None:
        letters = letters_of(columns.limit_flag, table)
        named = np.array([bool(letter) and letter in columns.limit_letters for letter in letters], dtype=bool)
        out.limit |= named
        out.nsigma[named] = columns.limit_nsigma


def _drop(out: Values, column: str, bad: dict[int, str]) -> None:
    """Take no measurement where a cell that decides its use cannot be read."""
    for row, why in bad.items():
        out.bad[(row, column)] = why
        out.present[row] = False


def set_levels(out: Values, level: FloatArray, column: str, bad: dict[int, str]) -> None:
    """The n of each limit, where one is given."""
    with np.errstate(invalid="ignore"):
        wrong = out.limit & ~np.isnan(level) & ~(level > 0)
    bad = {**bad, **{row: "the level of a limit must be above zero" for row in np.flatnonzero(wrong).tolist()}}
    for row, why in bad.items():
        out.bad[(row, column)] = why
        out.present[row] &= not out.limit[row]
    out.nsigma = np.where(level > 0, level, out.nsigma)


def _below_the_limit(out: Values, columns: BandColumns, table: RawTable) -> None:
    """A null error where that means a limit: the measurement behind it where there is one, else the limit."""
    lost = out.present & np.isnan(out.error_jy) & ~out.limit
    lost[list(out.wrong_error)] = False
    if columns.limit_flag is not None:  # the flag says which are limits: others are detections without an error
        lost &= np.array([not letter for letter in letters_of(columns.limit_flag, table)], dtype=bool)
    if columns.sure_flag is not None:
        sure = set(columns.sure_letters)
        lost &= np.array([letter not in sure for letter in letters_of(columns.sure_flag, table)], dtype=bool)
    if columns.counts:
        lost = _from_counts(out, columns, table, lost | ~out.present)
    if columns.null_error is None or not (columns.error or columns.over_error):
        return  # without a column of errors nothing tells a limit from a detection
    lost &= out.present
    if columns.snr:
        lost = _from_snr(out, columns, table, lost)
    out.limit |= lost
    out.nsigma[lost] = columns.null_error


def _from_counts(out: Values, columns: BandColumns, table: RawTable, lost: np.ndarray) -> np.ndarray:
    """Fluxes from counts (AllWISE w?flux, even negative; Gaia mean fluxes); what is still lost after it."""
    counts, _ = numbers(table.columns[columns.counts], SENTINELS)
    sigma, _ = numbers(table.columns[columns.counts_error], SENTINELS)
    with np.errstate(invalid="ignore"):
        found = lost & np.isfinite(counts) & (sigma > 0) & (np.abs(counts) < LARGEST_JY)
    count_jy = columns.band.zero_point_jy * 10.0 ** (-0.4 * columns.counts_zero)
    out.flux_jy[found] = counts[found] * count_jy
    out.error_jy[found] = sigma[found] * count_jy
    out.value[found], out.value_error[found] = counts[found], sigma[found]
    out.present |= found
    unit = table.columns[columns.counts].unit or "counts"
    for row in np.flatnonzero(found).tolist():
        out.wrong_error.pop(row, None)
        out.unit[row] = unit
        out.note[row] = FROM_COUNTS.format(columns.counts)
    return lost & ~found


def _from_snr(out: Values, columns: BandColumns, table: RawTable, lost: np.ndarray) -> np.ndarray:
    """sigma = F_lim / (max(snr, 0) + n), F = snr sigma; what is still lost after it."""
    ratio, _ = numbers(table.columns[columns.snr], SENTINELS)
    found = lost & np.isfinite(ratio)
    sigma = out.flux_jy[found] / (np.maximum(ratio[found], 0.0) + columns.null_error)
    out.error_jy[found] = sigma
    out.flux_jy[found] = ratio[found] * sigma
    for row in np.flatnonzero(found).tolist():
        out.note[row] = FROM_SNR
    return lost & ~found


def _uppers(out: Values, columns: BandColumns, table: RawTable, mapped_units: dict[str, str]) -> None:
    """Limits of a column of their own, in rows where the band has no value and no bad cell."""
    if not columns.upper:
        return
    column = table.columns[columns.upper]
    level, bad = numbers(column, SENTINELS)
    unit = scale(
        unit_of(column, columns.upper_unit, mapped_units.get(columns.upper, "")), columns.band, is_mag=columns.is_mag
    )
    other = start(level, bad, columns.upper, unit)
    used = other.present & ~out.present & ~out.bad_rows(columns.value)
    out.bad.update(other.bad)
    out.flux_jy[used], out.value[used] = other.flux_jy[used], other.value[used]
    out.nsigma[used] = columns.upper_nsigma
    out.limit |= used
    out.present |= used
    for row in np.flatnonzero(used).tolist():
        out.unit[row] = other.unit[row]


def finish(out: Values, column: str, error_column: str = "") -> None:
    """In the end limits are positive and have no error, detections without error say so, and no zero has a sign.

    A detection with a wrong error is refused: neither its error nor the floor would say how well it is known.
    """
    for row, why in out.wrong_error.items():
        if out.present[row] and not out.limit[row]:
            out.bad[(row, error_column)] = LEFT_OUT.format(why)
            out.present[row] = False
    wrong = out.present & out.limit & ~(out.flux_jy > 0)
    for row in np.flatnonzero(wrong).tolist():
        out.bad[(row, column)] = "an upper limit must be above zero"
    out.present &= ~wrong
    out.error_jy[out.limit] = math.nan
    out.value_error[out.limit] = math.nan
    out.flux_jy += 0.0
    out.value += 0.0
    for row in np.flatnonzero(out.present & ~out.limit & np.isnan(out.error_jy)).tolist():
        out.note[row] = out.note[row] or NO_ERROR


def floor_caution(band: str, count: int) -> str:
    """What is said once of the detections of a band that came without an error."""
    words = "detection has no error and takes" if count == 1 else "detections have no error and take"
    return f"{band}: {count} {words} the band's floor"


def letters_of(flag: FlagColumn, table: RawTable) -> list[str]:
    """A flag's text in each row: its letter for a split one, "" where the text is not as long as it must be."""
    cells = texts(table.columns[flag.column])
    if flag.position is None:
        return cells
    letter = {cell: cell[flag.position].strip() if len(cell) == flag.width else "" for cell in set(cells)}
    return [letter[cell] for cell in cells]


def refusals(out: Values, table: RawTable) -> list[Refused]:
    """The bad cells of a band, as refusals."""
    return [
        Refused(table.path, int(table.row_numbers[row]), column, why) for (row, column), why in sorted(out.bad.items())
    ]


def measurements(out: Values, columns: BandColumns, table: RawTable) -> list[tuple[int, Measurement]]:
    """(row, measurement) of every row that has one."""
    rows = np.flatnonzero(out.present).tolist()
    flags = _flags(columns, table)
    epochs = _epochs(columns, table)
    excluded = truths(table.columns[columns.exclude])[0].tolist() if columns.exclude else None
    notes = texts(table.columns[columns.note]) if columns.note else None
    sources = texts(table.columns[columns.source_column]) if columns.source_column else None
    band, label = columns.band.name, columns.source
    flux, error, limit, nsigma = (a.tolist() for a in (out.flux_jy, out.error_jy, out.limit, out.nsigma))
    value, value_error, unit, note = out.value.tolist(), out.value_error.tolist(), out.unit, out.note
    return [
        (
            row,
            Measurement(
                band,
                flux[row],
                error[row],
                limit[row],
                nsigma[row] if limit[row] else 2.0,
                (sources[row] or label) if sources else label,
                epochs[row] if epochs else "",
                flags[row] if flags else {},
                excluded[row] if excluded else False,
                value[row],
                value_error[row],
                unit[row],
                "; ".join(filter(None, (notes[row], note[row]))) if notes else note[row],
            ),
        )
        for row in rows
    ]


def _epochs(columns: BandColumns, table: RawTable) -> list[str] | None:
    if not columns.epoch:
        return None
    word = columns.epoch_word
    return [f"{word} {cell}" if word and cell else cell for cell in texts(table.columns[columns.epoch])]


def _flags(columns: BandColumns, table: RawTable) -> list[dict[str, str]] | None:
    """The flags of each row; rows with the same ones share one mapping."""
    if not columns.flags:
        return None
    keys = [flag.key for flag in columns.flags]
    shared: dict[tuple[str, ...], dict[str, str]] = {}
    rows = []
    for cells in zip(*(letters_of(flag, table) for flag in columns.flags), strict=True):
        if cells not in shared:
            shared[cells] = {key: cell for key, cell in zip(keys, cells, strict=True) if cell}
        rows.append(shared[cells])
    return rows
