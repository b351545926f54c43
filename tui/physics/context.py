"""What surrounds a star: light leaking in, chance alignment, position matches, and how much dust may last."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from tui.model import FloatArray

MAS_PER_ARCSEC = 1000.0
CEILING = 0.16e-3  # Wyatt et al. 2007, ApJ 658, 569, Eq. 20: f_max at 1 au, 1 Myr, solar mass and luminosity


def leak_fraction(separation_arcsec: ArrayLike, fwhm_arcsec: ArrayLike) -> FloatArray:
    """Share of a neighbour's flux that a profile fit at the star takes for the star's own.

    A least-squares fit of one Gaussian beam to a source at another place returns the overlap of two beams,
    exp(-s^2/4 sigma^2) = exp(-2 ln 2 (s/FWHM)^2).
    """
    ratio = np.asarray(separation_arcsec, dtype=float) / np.asarray(fwhm_arcsec, dtype=float)
    return np.exp(-2.0 * np.log(2.0) * ratio**2)


def chance_alignment(radius_arcsec: ArrayLike, density_arcsec2: ArrayLike) -> FloatArray:
    """Probability of at least one unrelated source within a radius: 1 - exp(-pi r^2 rho).

    Args:
        radius_arcsec: radius of the beam, arcsec.
        density_arcsec2: sources per square arcsec, as bright as is asked or brighter.

    >>> float(chance_alignment(3.0, 1e4 / 3600.0**2).round(6))
    0.02158
    """
    return -np.expm1(-np.pi * np.asarray(radius_arcsec, dtype=float) ** 2 * np.asarray(density_arcsec2, dtype=float))


def density_at(density: ArrayLike, density_mag: ArrayLike, mag: ArrayLike, slope: ArrayLike) -> FloatArray:
    """Cumulative density at another magnitude, log-linear: rho 10^(slope (m - m0)).

    An unclustered population in flat space has slope 0.6; real counts fall below it.
    """
    step = np.asarray(mag, dtype=float) - np.asarray(density_mag, dtype=float)
    return np.asarray(density, dtype=float) * 10.0 ** (np.asarray(slope, dtype=float) * step)


def propagate(
    pmra_mas_yr: ArrayLike, pmdec_mas_yr: ArrayLike, from_yr: ArrayLike, to_yr: ArrayLike
) -> tuple[FloatArray, FloatArray]:
    """Shift of a star by proper motion between two epochs: (east, north), arcsec."""
    years = np.asarray(to_yr, dtype=float) - np.asarray(from_yr, dtype=float)
    east = np.asarray(pmra_mas_yr, dtype=float) * years / MAS_PER_ARCSEC
    return east, np.asarray(pmdec_mas_yr, dtype=float) * years / MAS_PER_ARCSEC


def offset_arcsec(
    ra_deg: ArrayLike, dec_deg: ArrayLike, other_ra_deg: ArrayLike, other_dec_deg: ArrayLike
) -> tuple[FloatArray, FloatArray]:
    """Where the other position lies as seen from the first: (east, north), arcsec; for small separations."""
    ra, dec, ra2, dec2 = (np.asarray(x, dtype=float) for x in (ra_deg, dec_deg, other_ra_deg, other_dec_deg))
    turn = (ra2 - ra + 180.0) % 360.0 - 180.0
    return 3600.0 * turn * np.cos(np.radians((dec + dec2) / 2.0)), 3600.0 * (dec2 - dec)


def match_probability(east_arcsec: ArrayLike, north_arcsec: ArrayLike, sigma_arcsec: ArrayLike) -> FloatArray:
    """Probability that a right match lies farther off than this one: exp(-d^2/2), d^2 = (east^2 + north^2)/sigma^2.

    Args:
        sigma_arcsec: 1-sigma error of the offset in each axis, all sources of error in quadrature.
    """
    d2 = (np.square(east_arcsec) + np.square(north_arcsec)) / np.square(sigma_arcsec)
    return np.exp(-0.5 * d2)


def steady_state_ceiling(
    radius_au: ArrayLike, age_myr: ArrayLike, mass_sun: ArrayLike = 1.0, luminosity_sun: ArrayLike = 1.0
) -> FloatArray:
    """Largest fractional luminosity that a belt grinding since birth can still have.

    f_max = 0.16e-3 R^(7/3) M^(-5/6) L^(-1/2) / t_Myr for the paper's planetesimals; it is uncertain by a
    factor of 100 or more, so that only f > 1000 f_max is called transient there.
    Source: Wyatt et al. 2007, ApJ 658, 569.
    """
    radius, age = np.asarray(radius_au, dtype=float), np.asarray(age_myr, dtype=float)
    mass, luminosity = np.asarray(mass_sun, dtype=float), np.asarray(luminosity_sun, dtype=float)
    return CEILING * radius ** (7.0 / 3.0) * mass ** (-5.0 / 6.0) * luminosity**-0.5 / age


def shell_dimming(fractional_luminosity: ArrayLike) -> FloatArray:
    """Magnitudes by which dust all round the star would dim it, if it radiates what it takes: 2.5 log10(1 + f)."""
    return 2.5 * np.log10(1.0 + np.asarray(fractional_luminosity, dtype=float))
