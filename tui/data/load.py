"""Reads the packaged tables; the one module that does, called by workflow alone.

A table is CSV under comment lines that state `# source:`, `# from:`, `# changed:` and `# units:`.
"""

from __future__ import annotations

import csv
import math
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from types import MappingProxyType

import numpy as np

from tui.errors import TableError
from tui.model import Band, FloatArray

ALIASES = MappingProxyType(
    {
        "G": "Gaia_G", "BP": "Gaia_BP", "RP": "Gaia_RP", "Gbp": "Gaia_BP", "Grp": "Gaia_RP",
        "u": "SDSS_u", "g": "SDSS_g", "r": "SDSS_r", "i": "SDSS_i", "z": "SDSS_z",
        "K": "Ks", "K_s": "Ks", "R": "Rc", "I": "Ic", "R_c": "Rc", "I_c": "Ic", "B_T": "BT", "V_T": "VT",
        "FUV": "GALEX_FUV", "NUV": "GALEX_NUV", "S9W": "AKARI_S9W", "L18W": "AKARI_L18W",
        "I1": "IRAC1", "I2": "IRAC2", "I3": "IRAC3", "I4": "IRAC4", "M24": "MIPS24", "M70": "MIPS70",
    }
)  # fmt: skip


@dataclass(frozen=True, slots=True, eq=False)
class DwarfTable:
    """The mean dwarf sequence, hottest first: shape (N,) each, magnitudes NaN where the source has none."""

    sp_type: tuple[str, ...]
    teff_k: FloatArray
    logl: FloatArray  # dex of the nominal solar luminosity
    mass_sun: FloatArray
    absolute_mag: Mapping[str, FloatArray]  # band -> (N,); `G_V` is the second route to Gaia G


def read_rows(relative: str) -> list[dict[str, str]]:
    """Rows of a packaged CSV table as text, comment lines passed over; TableError when it is not there."""
    path = files("tui.data").joinpath(relative)
    try:
        text = path.read_text(encoding="utf-8")
    except (OSError, UnicodeDecodeError) as error:
        raise TableError(f"tui/data/{relative}", f"the packaged table cannot be read ({error}); install again.") from error
    return list(csv.DictReader(line for line in text.splitlines() if line and not line.startswith("#")))


def number(text: str | None) -> float:
    """A cell as float, NaN where empty."""
    return float(text) if text else math.nan


def photon_response(relative: str) -> tuple[FloatArray, FloatArray]:
    """A bandpass as (wavelength, photon response); an energy response R is S = R/wavelength."""
    rows = read_rows(relative)
    wave = np.array([float(row["wavelength_um"]) for row in rows])
    response = np.array([float(row["response"]) for row in rows])
    text = files("tui.data").joinpath(relative).read_text(encoding="utf-8")
    return wave, response / wave if "energy response" in text else response


def box_response(low_um: float, high_um: float) -> tuple[FloatArray, FloatArray]:
    """A flat energy response between two wavelengths, as photon response."""
    wave = np.linspace(low_um, high_um, 41)
    return wave, 1.0 / wave


def pivot_of(wave_um: FloatArray, response: FloatArray) -> float:
    """Pivot wavelength, micron: the square root of int(S w dw) / int(S dw / w) (Koornneef 1986)."""
    fine = np.linspace(wave_um[0], wave_um[-1], 8001)
    photon = np.interp(fine, wave_um, response)
    return float(np.sqrt(np.trapezoid(photon * fine, fine) / np.trapezoid(photon / fine, fine)))


def _band(row: Mapping[str, str]) -> Band:
    name, low = row["band"], number(row["box_low_um"])
    if math.isfinite(low):
        wave, response = box_response(low, number(row["box_high_um"]))
    else:
        wave, response = photon_response(f"bandpasses/{name}.csv")
    return Band(
        name=name,
        pivot_um=pivot_of(wave, response),
        mag_system=row["mag_system"],
        zero_point_jy=float(row["zero_point_jy"]),
        floor=float(row["floor"]),
        instrument=row["instrument"],
        wave_um=wave,
        response=response,
        reference_spectrum=row["reference_spectrum"],
        reference_um=number(row["reference_um"]),
        beam_fwhm_arcsec=number(row["beam_fwhm_arcsec"]),
        saturation_mag=number(row["saturation_mag"]),
        limit_mag=number(row["limit_mag"]),
        source=row["source"],
    )


@cache
def bands() -> Mapping[str, Band]:
    """All packaged bands by name, in order of pivot wavelength."""
    rows = [_band(row) for row in read_rows("bands.csv")]
    return MappingProxyType({band.name: band for band in sorted(rows, key=lambda band: band.pivot_um)})


def band_aliases() -> Mapping[str, str]:
    """Short band names -> packaged names."""
    return ALIASES


@cache
def dwarfs() -> DwarfTable:
    """The packaged mean dwarf sequence."""
    rows = read_rows("dwarfs.csv")
    names = [key for key in rows[0] if key not in ("sp_type", "teff_k", "logl", "mass_sun")]
    column = {key: np.array([number(row[key]) for row in rows]) for key in ("teff_k", "logl", "mass_sun", *names)}
    return DwarfTable(
        sp_type=tuple(row["sp_type"] for row in rows),
        teff_k=column["teff_k"],
        logl=column["logl"],
        mass_sun=column["mass_sun"],
        absolute_mag=MappingProxyType({name: column[name] for name in names}),
    )


@cache
def spreads() -> tuple[dict[str, str], ...]:
    """Rows of the spread table: photosphere, bands, low_k, high_k, short_um, long_um, spread (text)."""
    return tuple(read_rows("spread.csv"))
