"""What Gaia's own photometry says about its trustworthiness: excess of BP + RP over G, and scatter of G."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tui.model import FloatArray

# Riello et al. 2021, A&A 649, A3, appendix C.1: what to add to G where bright sources saturate, 2 < G < 8
# (coefficients confirmed in a public code copy)
BRIGHT_G = (-0.09892, 0.059, -0.009775, 0.0004934)
BRIGHT_G_RANGE = (2.0, 8.0)


@dataclass(frozen=True, slots=True, eq=False)
class ExcessLaw:
    """The mean BP/RP excess factor of isolated stars against colour, and the scatter of C* against G."""

    lower_mag: FloatArray  # shape (K,), BP - RP where each range begins, increasing
    coefficients: FloatArray  # shape (K, 4), a0 to a3
    sigma: tuple[float, float, float]  # c0, c1, power of sigma = c0 + c1 G^power


@dataclass(frozen=True, slots=True, eq=False)
class QuietLocus:
    """Scatter of one CCD observation in G of ordinary stars."""

    g_mag: FloatArray  # shape (K,), increasing
    scatter: FloatArray  # shape (K,), fraction of the flux


def excess_law(rows: Sequence[Mapping[str, str]]) -> ExcessLaw:
    """The law held by the rows of the packaged table `gaia_excess`."""
    lower = np.array([float(row["bp_rp_min"]) for row in rows])
    coefficients = np.array([[float(row[key]) for key in ("a0", "a1", "a2", "a3")] for row in rows])
    c0, c1, power = (float(rows[0][key]) for key in ("c0", "c1", "power"))
    return ExcessLaw(lower, coefficients, (c0, c1, power))


def quiet_locus(rows: Sequence[Mapping[str, str]]) -> QuietLocus:
    """The locus held by the rows of the packaged table `gaia_scatter`."""
    return QuietLocus(
        np.array([float(row["g_mag"]) for row in rows]), np.array([float(row["scatter"]) for row in rows])
    )


def expected_excess(bp_rp_mag: FloatArray, law: ExcessLaw) -> FloatArray:
    """Mean excess factor f(BP - RP) of isolated stars; NaN where the colour is NaN.

    Source: Riello et al. 2021, A&A 649, A3, Table 2.
    """
    colour = np.asarray(bp_rp_mag, dtype=float)
    row = np.clip(np.searchsorted(law.lower_mag, colour, side="right") - 1, 0, len(law.lower_mag) - 1)
    a0, a1, a2, a3 = np.moveaxis(law.coefficients[row], -1, 0)
    return a0 + colour * (a1 + colour * (a2 + colour * a3))


def corrected_excess(excess_factor: FloatArray, bp_rp_mag: FloatArray, law: ExcessLaw) -> FloatArray:
    """C* = C - f(BP - RP): near zero where BP, RP and G hold the same light.

    Args:
        excess_factor: C = (I_BP + I_RP)/I_G, `phot_bp_rp_excess_factor`.
        bp_rp_mag: colour, mag, of the same shape.
    """
    return np.asarray(excess_factor, dtype=float) - expected_excess(bp_rp_mag, law)


def excess_sigma(g_mag: FloatArray, law: ExcessLaw) -> FloatArray:
    """1-sigma scatter of C* among well-behaved isolated sources at magnitude G (Riello et al. 2021, Eq. 18)."""
    c0, c1, power = law.sigma
    return c0 + c1 * np.maximum(np.asarray(g_mag, dtype=float), 0.0) ** power


def transit_scatter(n_obs: FloatArray, flux_over_error: FloatArray) -> FloatArray:
    """Scatter of single observations as a fraction of the flux: sqrt(n_obs) sigma_F/F.

    Gaia's error of the mean flux is the weighted scatter of its observations over sqrt(n_obs)
    (Carrasco et al. 2016, A&A 595, A7), so that a star which varies shows it here.
    """
    count, ratio = np.broadcast_arrays(np.asarray(n_obs, dtype=float), np.asarray(flux_over_error, dtype=float))
    scatter = np.full(count.shape, np.nan)
    known = (count > 0) & (ratio > 0)
    scatter[known] = np.sqrt(count[known]) / ratio[known]
    return scatter


def quiet_scatter(g_mag: FloatArray, locus: QuietLocus) -> FloatArray:
    """Scatter that ordinary stars of magnitude G show; NaN outside the table's range of G."""
    g = np.asarray(g_mag, dtype=float)
    return np.exp(np.interp(g, locus.g_mag, np.log(locus.scatter), left=np.nan, right=np.nan))


def own_scatter(scatter: FloatArray, quiet: FloatArray) -> FloatArray:
    """Scatter of the star itself, the quiet one taken off in quadrature; 0 where it shows none."""
    return np.sqrt(np.maximum(np.square(scatter) - np.square(quiet), 0.0))


def bright_correction(g_mag: FloatArray) -> FloatArray:
    """Magnitudes to add to the catalogue's G for saturation; 0 outside 2 < G < 8 (Riello et al. 2021, C.1)."""
    g = np.asarray(g_mag, dtype=float)
    low, high = BRIGHT_G_RANGE
    return np.where((g > low) & (g < high), np.polynomial.polynomial.polyval(g, BRIGHT_G), 0.0)
