"""What a red spectrum does to WISE's W4, whose effective wavelength lies beyond its pivot."""

from __future__ import annotations

import math
from collections.abc import Mapping

W4_EFFECTIVE_UM = 22.8  # Brown, Jarrett & Cluver 2014, PASA 31, e049
W3_PIVOT_UM, W4_PIVOT_UM = 12.073, 22.194  # of the packaged curves
LEAST_RISE = 0.5  # F_nu ~ wavelength^n, n above this counts as red; a star has n = -2


def w4_red_excess(flux_jy: Mapping[str, float]) -> float:
    """Fraction by which W4 of a red source reads high when it is placed at its pivot; 0 where it is not red.

    A spectrum that rises as wavelength^n between W3 and W4 is brighter at 22.8 micron, where the band really
    measures it, by (22.8/22.19)^n.
    """
    w3, w4 = flux_jy.get("W3", math.nan), flux_jy.get("W4", math.nan)
    if not (w3 > 0 and w4 > 0):
        return 0.0
    rise = math.log(w4 / w3) / math.log(W4_PIVOT_UM / W3_PIVOT_UM)
    return (W4_EFFECTIVE_UM / W4_PIVOT_UM) ** rise - 1.0 if rise > LEAST_RISE else 0.0


def w4_sentence(excess: float) -> tuple[str, ...]:
    """The caution, where the excess is not 0."""
    if excess <= 0:
        return ()
    return (
        f"W4: for a source as red as this the band's effective wavelength is {W4_EFFECTIVE_UM} micron, so that W4 "
        f"reads some {100 * excess:.0f} % high (Brown et al. 2014).",
    )
