"""From a number with a unit to a flux density in Jy.

A magnitude is in the band's own system unless its unit says otherwise; nothing is ever guessed.
"""

from __future__ import annotations

import math
import re
import warnings
from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np

from tui.errors import InputError
from tui.model import Band, FloatArray

AB_ZERO_POINT_JY = 3631.0  # Oke & Gunn 1983, ApJ 266, 713
MAG_PER_RATIO = 2.5 / math.log(10.0)
BRIGHTEST_MAG, FAINTEST_MAG = -40.0, 60.0  # beyond: no magnitude of a star but a slip or an unknown sentinel
LARGEST_JY = 1e20

# Softening b of the SDSS asinh magnitudes: Lupton, Gunn & Szalay 1999, AJ 118, 1406;
# Stoughton et al. 2002, AJ 123, 485, Table 21.
SOFTENING: Mapping[str, float] = {
    "SDSS_u": 1.4e-10, "SDSS_g": 0.9e-10, "SDSS_r": 1.2e-10, "SDSS_i": 1.8e-10, "SDSS_z": 7.4e-10,
}  # fmt: skip

LONGEST_UNIT = 60  # characters
# Powers that no unit has: astropy multiplies them out, which for a great one never ends.
GREAT_POWER = re.compile(r"(\*\*|\^)\s*\(?\s*[-+]?(\d{3,}|\d*\.?\d*e|\d+\.\d{3,})|[a-z)]\s*[-+]?\d{3,}", re.IGNORECASE)
PLAIN_MAG = frozenset({"mag", "mags", "magnitude", "magnitudes"})
AB_MAG = frozenset({"mag(ab)", "abmag", "ab", "ab mag", "mag ab", "mag_ab", "mag (ab)", "m_ab"})
VEGA_MAG = frozenset({"mag(vega)", "vegamag", "vega", "vega mag", "mag vega", "mag (vega)"})
ASINH_MAG = frozenset({"mag(asinh)", "asinh", "asinh mag", "luptitude", "luptitudes"})
MAGGIES: Mapping[str, float] = {
    "nmgy": 1e-9, "nanomaggy": 1e-9, "nanomaggies": 1e-9, "nanomaggie": 1e-9, "nmaggy": 1e-9,
    "mgy": 1.0, "maggy": 1.0, "maggies": 1.0,
}  # fmt: skip


@dataclass(frozen=True, slots=True)
class Scale:
    """How the numbers of one column become Jy in one band."""

    kind: str  # "mag", "asinh" or "linear"
    factor_jy: float  # flux density at magnitude 0, or Jy in one unit
    unit: str  # as shown
    step: float = 1.0  # magnitudes in one unit: 0.001 for mmag
    softening: float = 0.0

    def flux(self, value: FloatArray) -> FloatArray:
        """Flux density in Jy; any shape."""
        if self.kind == "linear":
            return value * self.factor_jy
        mag = value * self.step
        if self.kind == "mag":
            return self.factor_jy * 10.0 ** (-0.4 * mag)
        return self.factor_jy * 2 * self.softening * np.sinh(-mag / MAG_PER_RATIO - math.log(self.softening))

    def flux_error(self, flux_jy: FloatArray, error: FloatArray) -> FloatArray:
        """1 sigma in Jy of an error given in the same unit as the value."""
        if self.kind == "linear":
            return error * self.factor_jy
        sigma = error * self.step / MAG_PER_RATIO
        if self.kind == "mag":
            return sigma * flux_jy
        return sigma * np.sqrt(flux_jy**2 + (2 * self.softening * self.factor_jy) ** 2)


def scale(unit: str, band: Band, *, is_mag: bool) -> Scale:
    """The scale of a column in `band`.

    Args:
        unit: as the file gives it; "" where it gives none, which means magnitudes only for a column of magnitudes.
        is_mag: whether the column's name promises magnitudes.
    Raises:
        InputError: the unit is unknown, no flux density, or cannot be guessed.
    """
    text = " ".join(unit.split())
    if len(text) > LONGEST_UNIT:
        raise InputError(f"a unit of {len(text)} characters is no unit")
    if not text:
        if is_mag:
            return Scale("mag", _own_zero_point(band), "mag")
        raise InputError(
            "it has no unit and none is guessed: give one in the column, or in the column map under [units], "
            'such as "mJy"'
        )
    named = _named_scale(text, band)
    return named if named is not None else _parsed_scale(text, band)


def _own_zero_point(band: Band) -> float:
    if not math.isfinite(band.zero_point_jy):
        raise InputError(f"{band.name} has no magnitude zero point here: give flux densities")
    return band.zero_point_jy


def _named_scale(text: str, band: Band) -> Scale | None:
    lowered = text.lower()
    if lowered in PLAIN_MAG:
        return Scale("mag", _own_zero_point(band), "mag")
    if lowered in AB_MAG:
        return Scale("mag", AB_ZERO_POINT_JY, "mag(AB)")
    if lowered in VEGA_MAG:
        if band.mag_system != "Vega":
            raise InputError(f"{band.name} magnitudes are AB here: give mag(AB) or a flux density")
        return Scale("mag", _own_zero_point(band), "mag")
    if lowered in ASINH_MAG:
        if band.name not in SOFTENING:
            raise InputError(f"asinh magnitudes are known for {' '.join(SOFTENING)}, not for {band.name}")
        return Scale("asinh", band.zero_point_jy, "mag(asinh)", softening=SOFTENING[band.name])
    said_ab = lowered.endswith("(ab)")
    maggies = MAGGIES.get(lowered.removesuffix("(ab)").strip())
    if maggies is None:
        return None
    if band.mag_system != "AB" and not said_ab:
        raise InputError(f"{text} in {band.name} may be Vega or AB: say {text}(AB), or give Jy")
    return Scale("linear", maggies * (AB_ZERO_POINT_JY if said_ab else band.zero_point_jy), text)


def _parsed_scale(text: str, band: Band) -> Scale:
    from astropy import units

    parsed = parse_unit(text)
    if parsed is None:
        raise InputError(f"{text!a} is no unit that astropy knows: correct it in the column map under [units]")
    equivalencies = units.spectral_density(band.pivot_um * units.um)
    try:
        if isinstance(parsed, units.LogUnit):
            if not isinstance(parsed, units.MagUnit):
                raise units.UnitConversionError
            zero_point = parsed.physical_unit.to(units.Jy, equivalencies=equivalencies)
            return Scale("mag", float(zero_point), text, step=float(parsed.function_unit.to(units.mag)))
        if parsed.is_equivalent(units.mag):
            return Scale("mag", _own_zero_point(band), text, step=float(parsed.to(units.mag)))
        return Scale("linear", float(parsed.to(units.Jy, equivalencies=equivalencies)), text)
    except units.UnitsError:
        raise InputError(f"{text!a} is neither a magnitude nor a flux density") from None


@lru_cache(maxsize=512)
def parse_unit(text: str) -> Any | None:
    """An astropy unit, read in any of the spellings tables use; None where there is no such unit."""
    from astropy import units

    if not text or len(text) > LONGEST_UNIT or GREAT_POWER.search(text):
        return None
    spelled = text.replace("micron", "um").replace("microJy", "uJy").replace("muJy", "uJy")
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        for form in ("generic", "cds", "vounit", "ogip"):
            try:
                return units.Unit(spelled, format=form)
            except (ValueError, TypeError, OverflowError, ZeroDivisionError, AttributeError, KeyError):
                continue
    return None


def relative_error(unit: str) -> float | None:
    """The factor that makes an error of this unit a share of the value: 0.01 for percent; None where it is none."""
    return 0.01 if unit.strip().lower() in ("%", "percent", "pct") else None
