"""Side tables: rows under a candidate's name that are no measurement of it: dips, neighbours, spectra."""

from __future__ import annotations

import math
import os
from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np

from tui.errors import TableError
from tui.model import Band, Dip, FloatArray, Neighbour, Spectrum
from tui.readers.archives import Archive
from tui.readers.cells import quoted
from tui.readers.columnmap import ColumnMap, read_column_map
from tui.readers.lightcurves import light_curve_dips
from tui.readers.measure import measure, measurements, refusals
from tui.readers.native import band_name
from tui.readers.recognise import Words, recognise
from tui.readers.records import Column, FactRow, RawTable, Refused, SideContents
from tui.readers.sidetable import SideTable
from tui.readers.units import parse_unit, relative_error
from tui.readers.windows import Windows

MOST_POINTS = 20_000  # points of one spectrum
SEPARATIONS = ("separation_arcsec", "separation", "sep", "angDist", "r_arcsec")
ANGLES = ("position_angle_deg", "position_angle", "pa", "posAng")


def read_dips(
    path: str | os.PathLike[str],
    bands: Mapping[str, Band],
    aliases: Mapping[str, str],
    *,
    columns: str | os.PathLike[str] | None = None,
    windows: Windows | None = None,
) -> SideContents:
    """Dips: `name, event, band, depth` and `error` (or `depth_error`), `epoch`; a row a band and event.

    A depth is a fraction of the flux lost, unless its unit says percent or mag. A table with `flux` or `mag` in place
    of `depth` is one of light curves, a row a point, where `event` names the window that the point lies in, or
    `time` is compared with the windows of tables of their own (`read_windows`).
    Raises:
        TableError: the file cannot be read or lacks a column.
    """
    optional = ("depth", "depth_error", "flux", "mag", "error", "event", "epoch", "time")
    side = SideTable(path, read_column_map(columns), ("name", "band"), optional)
    if "depth" not in side.columns:
        return light_curve_dips(side, bands, aliases, windows)
    depth = _fraction(side, "depth")
    key = "depth_error" if "depth_error" in side.columns else "error"
    error = _fraction(side, key, depth)
    events, given, epochs = side.texts("event"), side.texts("band"), side.texts("epoch")
    rows: dict[str, dict[tuple[str, str, str], Dip]] = defaultdict(dict)
    for row in range(len(side.table)):
        if not side.usable[row]:
            continue
        band = band_name(given[row], bands, aliases)
        if not band:
            side.refuse(row, "band", f"{quoted(given[row])} is no known band")
        elif not -1 < depth[row] <= 1:
            side.refuse(row, "depth", "a depth is a fraction of the flux, from -1 to 1")
        elif error[row] < 0:
            side.refuse(row, key, "an error is above zero, and empty where it is not known")
        else:
            event = events[row] or "1"
            sigma = error[row] if error[row] > 0 else math.nan
            mine = rows[side.names[row]]
            if (event, band, epochs[row]) in mine:
                side.refuse(row, "event", "an earlier row gives the same event, band and epoch")
            else:
                mine[event, band, epochs[row]] = Dip(event, band, float(depth[row]) + 0.0, float(sigma), epochs[row])
    found = {name: tuple(dips.values()) for name, dips in rows.items() if dips}
    return SideContents(found, side.refused, side.unknown)


def _fraction(side: SideTable, key: str, depth: FloatArray | None = None) -> FloatArray:
    """Depths, or errors of `depth`, as fractions: percent and magnitudes are turned into them."""
    values = side.numbers(key)
    unit = side.columns[key].unit.strip().lower() if key in side.columns else ""
    share = relative_error(unit)
    if share is not None:
        return values * share
    if unit in ("mag", "mmag"):
        mag = values * (0.001 if unit == "mmag" else 1.0)
        with np.errstate(over="ignore"):
            return 1 - 10.0 ** (-0.4 * mag) if depth is None else 0.4 * math.log(10) * mag * (1 - depth)
    return values


def read_neighbours(
    path: str | os.PathLike[str],
    bands: Mapping[str, Band],
    aliases: Mapping[str, str],
    facts: Mapping[str, FactRow],
    archives: Sequence[Archive],
    *,
    columns: str | os.PathLike[str] | None = None,
    source: str | None = None,
) -> SideContents:
    """Neighbours: `name, separation` (arcsec), `position_angle` (degrees), `source`, and bands as in any table.

    Raises:
        TableError: the file cannot be read or lacks a column.
    """
    column_map = read_column_map(columns)
    side = SideTable(path, column_map, ("name",), (*(key.lower() for key in (*SEPARATIONS, *ANGLES)), "source"))
    separation = _angle(side, SEPARATIONS, "arcsec")
    if separation is None:
        raise TableError(side.table.path, f"there is no separation: one of the columns {', '.join(SEPARATIONS)}.")
    angle = _angle(side, ANGLES, "deg")
    fluxes, refused, unknown, label = _fluxes(side, Words(bands, aliases, facts, archives, column_map, source or ""))
    sources = side.texts("source")
    rows: dict[str, list[Neighbour]] = defaultdict(list)
    for row in range(len(side.table)):
        if side.usable[row] and not 0 <= separation[row] < math.inf:
            side.refuse(row, "separation", "no separation is given, or a negative one")
        if side.usable[row]:
            place = math.nan if angle is None else float(angle[row])
            rows[side.names[row]].append(Neighbour(float(separation[row]), place, fluxes[row], sources[row] or label))
    found = {name: tuple(sorted(near, key=lambda n: n.separation_arcsec)) for name, near in rows.items()}
    return SideContents(found, [*side.refused, *refused], unknown)


def _angle(side: SideTable, keys: Sequence[str], own: str) -> FloatArray | None:
    """The first of some columns of angles, in `own`, which a bare number has already."""
    key = next((key.lower() for key in keys if key.lower() in side.columns), None)
    if key is None:
        return None
    unit = side.columns[key].unit
    parsed, wanted = parse_unit(unit) if unit else None, parse_unit(own)
    if unit and (parsed is None or wanted is None or not parsed.is_equivalent(wanted)):
        raise TableError(side.table.path, f"column {side.columns[key].name}: the unit {unit!a} is no angle.")
    return side.numbers(key) * (float(parsed.to(wanted)) if parsed is not None else 1.0)


def _fluxes(side: SideTable, words: Words) -> tuple[list[dict[str, float]], list[Refused], list[str], str]:
    """Flux densities of each row by band: detections only."""
    used = {column.name for key, column in side.columns.items() if key != "name"}
    rest = {name: column for name, column in side.table.columns.items() if name not in used}
    table = RawTable(side.table.path, rest, side.table.row_numbers)
    plan = recognise(table, replace(words, column_map=_map_of(words.column_map, rest)))
    fluxes: list[dict[str, float]] = [{} for _ in range(len(table))]
    refused: list[Refused] = list(plan.refused)
    for columns in plan.bands:
        out = measure(columns, table, plan.units)
        refused += refusals(out, table)
        for row, measurement in measurements(out, columns, table):
            if not measurement.limit:
                fluxes[row][measurement.band] = measurement.flux_jy
    label = plan.bands[0].source if plan.bands else words.label(side.table.path)
    return fluxes, refused, list(plan.unknown), label


def _map_of(column_map: ColumnMap, columns: Mapping[str, Column]) -> ColumnMap:
    """The part of a column map that speaks of these columns."""
    named = {target: column for target, column in column_map.columns.items() if column in columns}
    units = {
        target: unit for target, unit in column_map.units.items() if column_map.columns.get(target, target) in columns
    }
    return replace(column_map, columns=named, units=units)


def read_spectra(path: str | os.PathLike[str], *, columns: str | os.PathLike[str] | None = None) -> SideContents:
    """Spectra: `name, wavelength, flux, error`, a row a point; wavelength and flux must carry units.

    Raises:
        TableError: the file cannot be read, lacks a column or a unit.
    """
    side = SideTable(path, read_column_map(columns), ("name", "wavelength", "flux", "error"), ())
    wave, flux, error = side.numbers("wavelength"), side.numbers("flux"), side.numbers("error")
    wave_um, to_jy = _spectral_scale(side, wave)
    good = np.isfinite(wave_um) & (wave_um > 0) & np.isfinite(flux) & np.isfinite(error) & (error > 0)
    for row in np.flatnonzero(side.usable & ~good).tolist():
        side.refuse(row, "flux", "a point needs a wavelength and an error above zero, and a flux")
    rows: dict[str, list[int]] = defaultdict(list)
    for row in np.flatnonzero(side.usable).tolist():
        rows[side.names[row]].append(row)
    found = {}
    for name, places in rows.items():
        points = _in_order(side, wave_um, places)
        if len(points) > MOST_POINTS:
            side.refuse(points[0], "name", f"the spectrum has {len(points)} points, more than {MOST_POINTS}: bin it")
            continue
        found[name] = Spectrum(wave_um[points], (flux * to_jy)[points], (error * to_jy)[points])
    return SideContents(found, side.refused, side.unknown)


def _spectral_scale(side: SideTable, wave: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Wavelengths in micron, and what turns each flux into Jy."""
    from astropy import units

    given = {}
    for key in ("wavelength", "flux"):
        unit = parse_unit(side.columns[key].unit)
        if unit is None:
            mend = '[units] in a column map, such as wavelength = "um", flux = "mJy"'
            raise TableError(
                side.table.path, f"column {side.columns[key].name} has no unit that is known: give one in {mend}."
            )
        given[key] = unit
    try:
        wave_um = (wave * given["wavelength"]).to_value(units.um, equivalencies=units.spectral())
        at = np.where(wave_um > 0, wave_um, 1.0) * units.um
        to_jy = (np.ones_like(wave) * given["flux"]).to_value(units.Jy, equivalencies=units.spectral_density(at))
    except (units.UnitsError, TypeError) as error:
        raise TableError(
            side.table.path, "the units of wavelength and flux are no length and no flux density."
        ) from error
    return wave_um, to_jy


def _in_order(side: SideTable, wave_um: FloatArray, places: list[int]) -> list[int]:
    """Rows of one spectrum by wavelength; a second point at one wavelength is refused."""
    ordered = sorted(places, key=lambda row: wave_um[row])
    kept: list[int] = []
    for row in ordered:
        if kept and wave_um[row] == wave_um[kept[-1]]:
            side.refuse(row, "wavelength", "an earlier row has the same wavelength")
        else:
            kept.append(row)
    return kept
