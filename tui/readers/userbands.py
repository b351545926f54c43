"""Bands that a user adds: a bandpass table, or a pivot wavelength and a zero point."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np

from tui.errors import InputError, TableError
from tui.model import Band, FloatArray
from tui.readers.cells import numbers
from tui.readers.files import open_table
from tui.readers.units import AB_ZERO_POINT_JY, parse_unit

BAND_NAME = re.compile(r"[A-Za-z][A-Za-z0-9_+-]{0,31}")
NUMBERS = ("pivot_um", "zero_point_jy", "floor", "beam_fwhm_arcsec", "saturation_mag", "limit_mag")
TEXTS = ("curve", "response", "mag_system", "instrument", "source")
USUAL_FLOOR = 0.03  # fraction: what a well-calibrated broad band reaches, where the user says nothing
FINE = 8001  # points of the grid on which a thinned curve is integrated


def user_band(name: str, entry: Mapping[str, Any], folder: Path) -> Band:
    """A band as the column map defines it.

    Args:
        entry: `pivot_um` or `curve` (a table beside the map: wavelength, response), `mag_system` (Vega or AB),
            `zero_point_jy` (needed for Vega), `response` (photon or energy; photon by default), `floor` (fraction),
            `instrument`, `source` and what else a band has.
    Raises:
        InputError: a part is missing, unknown or out of range.
    """
    _check_entry(name, entry)
    system = entry.get("mag_system", "Vega" if "zero_point_jy" in entry else "AB")
    zero_point = float(entry.get("zero_point_jy", AB_ZERO_POINT_JY if system == "AB" else math.nan))
    wave_um, response = _curve(name, entry, folder)
    return Band(
        name=name,
        pivot_um=pivot_of(wave_um, response) if len(wave_um) > 1 else float(wave_um[0]),
        mag_system=system,
        zero_point_jy=zero_point,
        floor=float(entry.get("floor", USUAL_FLOOR)),
        instrument=entry.get("instrument", name),
        wave_um=wave_um,
        response=response,
        beam_fwhm_arcsec=float(entry.get("beam_fwhm_arcsec", math.nan)),
        saturation_mag=float(entry.get("saturation_mag", math.nan)),
        limit_mag=float(entry.get("limit_mag", math.nan)),
        source=entry.get("source", "column map"),
    )


def _check_entry(name: str, entry: Any) -> None:
    if not BAND_NAME.fullmatch(name):
        raise InputError(f"[bands] {name!a} is no band name: letters, digits, _ + -, a letter first, at most 32.")
    if not isinstance(entry, Mapping):
        raise InputError(f"[bands.{name}] must hold pivot_um or curve.")
    for key, value in entry.items():
        is_number = isinstance(value, (int, float)) and not isinstance(value, bool)
        if key in NUMBERS and not (is_number and math.isfinite(value)):
            raise InputError(f"[bands.{name}] {key} must be a number.")
        if key in TEXTS and not isinstance(value, str):
            raise InputError(f"[bands.{name}] {key} must be a text in quotes.")
        if key not in NUMBERS and key not in TEXTS:
            raise InputError(f"[bands.{name}] has no part {key!a}; it may have {', '.join((*NUMBERS, *TEXTS))}.")
    if ("pivot_um" in entry) == ("curve" in entry):
        raise InputError(f"[bands.{name}] needs either pivot_um or curve.")
    for key in ("pivot_um", "zero_point_jy"):
        if key in entry and entry[key] <= 0:
            raise InputError(f"[bands.{name}] {key} must be above zero.")
    if entry.get("mag_system", "AB") not in ("AB", "Vega"):
        raise InputError(f'[bands.{name}] mag_system is "AB" or "Vega".')
    if not 0 <= entry.get("floor", 0) < 1:
        raise InputError(f"[bands.{name}] floor is a fraction from 0 to 1.")


def _curve(name: str, entry: Mapping[str, Any], folder: Path) -> tuple[FloatArray, FloatArray]:
    """The photon response on its own wavelengths; one point where only the pivot is known."""
    if "pivot_um" in entry:
        return np.array([float(entry["pivot_um"])]), np.array([1.0])
    path = str(folder / entry["curve"])
    table = open_table(path)
    if len(table.columns) < 2 or len(table) < 3:
        raise TableError(path, "a bandpass needs two columns, wavelength and response, and three rows or more.")
    wave_column, response_column = list(table.columns.values())[:2]
    (wave_um, bad_wave), (response, bad_response) = numbers(wave_column), numbers(response_column)
    if bad_wave or bad_response or not np.all(np.isfinite(wave_um + response)):
        raise TableError(path, "every cell of a bandpass must be a number.")
    wave_um = wave_um * _to_micron(path, wave_column.unit)
    if wave_um[0] > wave_um[-1]:
        wave_um, response = wave_um[::-1], response[::-1]
    if np.any(np.diff(wave_um) <= 0) or wave_um[0] <= 0 or np.any(response < 0) or not np.any(response > 0):
        raise TableError(path, "wavelengths must rise and responses must not be negative.")
    kind = entry.get("response", "photon")
    if kind not in ("photon", "energy"):
        raise InputError(f'[bands.{name}] response is "photon" or "energy".')
    return wave_um, response / wave_um if kind == "energy" else response


def _to_micron(path: str, unit: str) -> float:
    if not unit:
        return 1.0
    parsed = parse_unit(unit)
    from astropy import units

    if parsed is None or not parsed.is_equivalent(units.um):
        raise TableError(path, f"the wavelength's unit {unit!a} is no length.")
    return float(parsed.to(units.um))


def pivot_of(wave_um: FloatArray, response: FloatArray) -> float:
    """Pivot wavelength, micron: sqrt of int(S w dw) / int(S dw / w), S the photon response (Koornneef 1986)."""
    fine = np.linspace(wave_um[0], wave_um[-1], FINE)
    photon = np.interp(fine, wave_um, response)
    return float(np.sqrt(np.trapezoid(photon * fine, fine) / np.trapezoid(photon / fine, fine)))
