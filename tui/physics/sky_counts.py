"""How many stars and galaxies lie on a square degree of sky, roughly, where no local count was given."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

ARCSEC2_PER_DEG2 = 3600.0**2
# Bahcall & Soneira 1980, ApJS 44, 73, Eq. B1, constants for integrated counts in V
DISC = (925.0, -0.132, 0.035, 3.0, 15.75)  # C1, alpha, beta, delta, m*
SPHEROID = (1050.0, -0.18, 0.087, 2.5, 17.5)  # C2, kappa, eta, lambda, m-dagger
LOWEST_LATITUDE_DEG = 20.0  # the formula holds from here to the poles
# V minus the magnitude in a band beyond 1 micron of the G and K dwarfs that make up high-latitude counts
# (Pecaut & Mamajek 2013, ApJS 208, 9: V - Ks is 1.5 for G2V, 2.2 for K2V)
V_MINUS_INFRARED = 2.0


@dataclass(frozen=True, slots=True)
class GalaxyAnchor:
    """Galaxies brighter than one magnitude in one band, counted on the whole sky."""

    band: str
    wave_um: float
    mag: float  # in the band's own system
    per_deg2: float
    turn_mag: float  # up to here the counts rise with slope 0.6
    faint_slope: float  # and beyond with this one


def galaxy_anchors(rows: Sequence[Mapping[str, str]]) -> tuple[GalaxyAnchor, ...]:
    """Anchors held by the rows of the packaged table `galaxy_counts`."""
    keys = ("wave_um", "mag", "per_deg2", "turn_mag", "faint_slope")
    return tuple(GalaxyAnchor(row["band"], *(float(row[key]) for key in keys)) for row in rows)


def galaxies_per_deg2(mag: float, anchor: GalaxyAnchor) -> float:
    """Galaxies per square degree brighter than `mag`; good to a factor of 3, clustering left out."""
    bright = min(mag, anchor.turn_mag)
    faint = max(mag - anchor.turn_mag, 0.0)
    return float(anchor.per_deg2 * 10.0 ** (0.6 * (bright - anchor.mag) + anchor.faint_slope * faint))


def stars_per_deg2(v_mag: float, glon_deg: float, glat_deg: float) -> float:
    """Stars per square degree brighter than V, by the Bahcall-Soneira formula.

    The formula is within 15 % of their Galaxy model; nearer than 20 degrees to the plane the value at 20
    degrees is returned, which is a lower bound.
    Source: Bahcall & Soneira 1980, ApJS 44, 73, Eq. B1.
    """
    latitude = np.radians(max(abs(glat_deg), LOWEST_LATITUDE_DEG))
    toward = np.cos(np.radians(glon_deg))
    bright = float(np.clip(v_mag, 12.0, 20.0)) - 12.0
    mu, gamma = 0.03 + 0.0075 * bright, 0.36 - 0.04 * bright
    thick = np.sin(latitude) * (1.0 - mu * toward / np.tan(latitude))
    sigma = 1.45 - 0.2 * np.cos(latitude) * toward
    round_ = 1.0 - np.cos(latitude) * toward
    return float(_term(v_mag, DISC) / thick ** (3.0 - 5.0 * gamma) + _term(v_mag, SPHEROID) / round_**sigma)


def _term(mag: float, constants: tuple[float, float, float, float, float]) -> float:
    scale, fall, rise, power, middle = constants
    step = mag - middle
    return scale * 10.0 ** (rise * step) / (1.0 + 10.0 ** (fall * step)) ** power
