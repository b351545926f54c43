"""Tables of further catalogues in their own columns, and light curves with their event windows."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from making.catalogues import Observer
from making.sky import extinction, magnitude
from making.star import Star

ARCHIVE_TABLE, GLIMPSE_TABLE, CURVES, WINDOWS = "archives.csv", "glimpse.csv", "light_curves.csv", "windows.csv"
EVENT = ("2015 May", 57150.0, 57158.0)  # MJD
NIGHTS = (57120.0, 57190.0, 36)  # first, last and number of the nights of a light curve
NIGHT_ERROR = 0.009
CURVE_BANDS = ("B", "V", "Rc", "Ic", "J")


@dataclass(frozen=True, slots=True)
class Layout:
    """How one catalogue writes its measurements."""

    columns: Mapping[str, tuple[str, str]]  # band -> columns of value and error
    kind: str  # "mag", or the unit of a flux: "uJy", "Jy", or "Jy %" where the error is in percent
    usual: Mapping[str, Any] = field(default_factory=dict)  # flags of a sound measurement


def _pairs(names: Mapping[str, str], value: str, error: str) -> dict[str, tuple[str, str]]:
    return {band: (value.format(key), error.format(key)) for band, key in names.items()}


PS1 = {f"PS1_{letter}": letter for letter in "grizy"}
IRAC = {f"IRAC{number}": f"i{number}" for number in (1, 2)}
GLIMPSE = {"IRAC1": "3_6", "IRAC2": "4_5", "IRAC3": "5_8", "IRAC4": "8_0"}
LAYOUTS: Mapping[str, Layout] = {
    "Pan-STARRS": Layout(
        _pairs(PS1, "{}MeanPSFMag", "{}MeanPSFMagErr"), "mag", {f"{letter}QfPerfect": 0.998 for letter in "grizy"}
    ),
    "GALEX": Layout({"GALEX_NUV": ("nuv_mag", "nuv_magerr")}, "mag", {"nuv_artifact": 0}),
    "Tycho-2": Layout(_pairs({"BT": "BT", "VT": "VT"}, "{}mag", "e_{}mag"), "mag", {"prox": 999}),
    "Spitzer": Layout(
        _pairs(IRAC, "{}_f_ap1", "{}_df_ap1"), "uJy",
        {f"{key}_{flag}": 0 for key in IRAC.values() for flag in ("fluxflag", "softsatflag")},
    ),
    "AKARI": Layout(
        _pairs({"AKARI_S9W": "09", "AKARI_L18W": "18"}, "S{}", "e_S{}"), "Jy",
        {"q_S09": 3, "q_S18": 3, "f09": "0", "f18": "0"},
    ),
    "IRAS": Layout(
        _pairs({"IRAS12": "12", "IRAS25": "25"}, "Fnu_{}", "e_Fnu_{}"), "Jy %",
        {"q_Fnu_12": 3, "q_Fnu_25": 3, "Confuse": "0"},
    ),
    "GLIMPSE": Layout(
        {band: (f"mag{key}", f"d{key}m") for band, key in GLIMPSE.items()}, "mag",
        {"csf": 0} | {f"sqf_{key}": 0 for key in GLIMPSE.values()},
    ),
}  # fmt: skip


def archive_rows(stars: Sequence[Star], observer: Observer, names: Sequence[str]) -> list[dict[str, Any]]:
    """Rows of the stars that some of these catalogues saw."""
    rows = []
    for number, star in enumerate(stars, 1):
        wanted = [name for name in names if name in star.archives]
        if wanted:
            observer.turn_to(star, 7)
            row: dict[str, Any] = {"name": f"SM-{number:04d}"}
            for name in wanted:
                row |= seen_by(LAYOUTS[name], star, observer) | dict(star.archives[name])
            rows.append(row)
    return rows


def seen_by(layout: Layout, star: Star, observer: Observer) -> dict[str, Any]:
    """One catalogue's columns of a star."""
    row: dict[str, Any] = dict(layout.usual)
    for band, (value, error) in layout.columns.items():
        flux, sigma = observer.seen(star, band)
        if layout.kind == "mag":
            row[value] = round(magnitude(flux, observer.sky.bands[band]), 4)
            row[error] = round(float(1.0857 * sigma / flux), 4)
        else:
            scale = 1e6 if layout.kind == "uJy" else 1.0
            row[value] = float(f"{scale * flux:.6g}")
            row[error] = round(100 * sigma / flux) if "%" in layout.kind else float(f"{scale * sigma:.3g}")
    return row


def head_of(rows: Iterable[Mapping[str, Any]]) -> list[str]:
    """All columns of some rows, in the order in which they come."""
    return list(dict.fromkeys(key for row in rows for key in row))


def curve_rows(stars: Sequence[Star], observer: Observer, pivots: Mapping[str, float]) -> Iterable[list[Any]]:
    """Points of light curves, relative to the star's usual light: name, band, time, flux, error."""
    wave = np.array([pivots[band] for band in CURVE_BANDS])
    times = np.linspace(*NIGHTS[:2], NIGHTS[2]).round(2)
    inside = (EVENT[1] <= times) & (times <= EVENT[2])
    for number, star in enumerate(stars, 1):
        if not star.curves:
            continue
        observer.turn_to(star, 8)
        lost = 1 - 10 ** (-0.4 * star.dip[1] * extinction(wave, 3.1))
        for band, depth in zip(CURVE_BANDS, lost, strict=True):
            flux = 1 - depth * inside + NIGHT_ERROR * observer.rng.standard_normal(times.size)
            for time, value in zip(times, flux, strict=True):
                yield [f"SM-{number:04d}", band, float(time), round(float(value), 4), NIGHT_ERROR]


def window_rows(stars: Sequence[Star]) -> Iterable[list[Any]]:
    """The windows of the events: name, event, start, end."""
    for number, star in enumerate(stars, 1):
        if star.curves:
            yield [f"SM-{number:04d}", *EVENT]
