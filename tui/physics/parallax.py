"""What a parallax may be used for: zero point, honest errors, and when it is none."""

from __future__ import annotations

import numpy as np

from tui.model import FloatArray

ZERO_POINT_MAS = -0.017  # Lindegren et al. 2021, A&A 649, A4: median offset of quasars in Gaia DR3
MIN_SNR = 5.0  # below this a parallax bounds a distance but is never inverted
INFLATION = (0.21, 12.65, 0.90, 1.141, 0.0040, -0.00062)  # El-Badry et al. 2021, MNRAS 506, 2269, eq. 16


def inflated_error(error_mas: FloatArray, g_mag: FloatArray) -> FloatArray:
    """Catalogue error times what wide binaries ask for at this G; factor 1.141 where G is unknown."""
    a, centre, width, p0, p1, p2 = INFLATION
    known = np.where(np.isfinite(g_mag), g_mag, 0.0)
    factor = a * np.exp(-((known - centre) ** 2) / width**2) + p0 + p1 * known + p2 * known**2
    return error_mas * np.where(np.isfinite(g_mag), factor, p0)


def usable_parallax(
    parallax_mas: FloatArray, error_mas: FloatArray, ruwe: FloatArray, g_mag: FloatArray, ruwe_max: float
) -> tuple[FloatArray, FloatArray]:
    """Parallax with the zero point taken off and its error, mas, (M,) each; NaN where it is not to be used.

    Not used: parallax/error below 5, RUWE above `ruwe_max` (Lindegren 2018; 1.4 is common practice).
    """
    value = parallax_mas - ZERO_POINT_MAS
    error = inflated_error(error_mas, g_mag)
    with np.errstate(invalid="ignore", divide="ignore"):
        good = (value / error >= MIN_SNR) & ~(ruwe > ruwe_max) & (error > 0)
    return np.where(good, value, np.nan), np.where(good, error, np.nan)
