"""Did a band stay constant where it was measured more than once?"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy.special import chdtrc

from tui.checks.doubts import INFORMATIVE, SUSPICION, Doubt
from tui.model import Candidate, Measurement

P_CONSTANT = 0.01  # below it a band is called variable; the queue's usual threshold


@dataclass(frozen=True, slots=True)
class Constancy:
    """Repeats of one band against a constant flux."""

    band: str
    n: int
    chi2: float
    p: float
    mean_jy: float
    scatter: float  # standard deviation of the repeats as a fraction of the mean

    @property
    def is_constant(self) -> bool:
        """Whether the repeats agree within their errors."""
        return self.p >= P_CONSTANT

    def as_doubt(self) -> Doubt:
        """The outcome as evidence about the band."""
        if self.is_constant:
            text = f"{self.n} epochs agree, scatter {100 * self.scatter:.1f} %"
            return Doubt(self.band, "epoch", text, INFORMATIVE, is_fine=True)
        text = f"{self.n} epochs disagree: scatter {100 * self.scatter:.1f} %, p {self.p:.1g}"
        return Doubt(self.band, "epoch", text, SUSPICION)


def constancy(flux_jy: Sequence[float], error_jy: Sequence[float], band: str = "") -> Constancy:
    """Chi-square of repeats about their inverse-variance mean, n - 1 degrees of freedom.

    Args:
        flux_jy: shape (N,), N >= 2, finite.
        error_jy: shape (N,), positive.
    """
    flux, error = np.asarray(flux_jy, dtype=float), np.asarray(error_jy, dtype=float)
    weight = error**-2
    mean = float(np.sum(weight * flux) / np.sum(weight))
    chi2 = float(np.sum(weight * (flux - mean) ** 2))
    scatter = float(np.std(flux, ddof=1) / abs(mean)) if mean else math.nan
    return Constancy(band, len(flux), chi2, float(chdtrc(len(flux) - 1, chi2)), mean, scatter)


def repeats(candidate: Candidate) -> dict[str, list[Measurement]]:
    """Bands with two or more detections with errors that are not excluded, and these."""
    by_band: dict[str, list[Measurement]] = {}
    for measurement in candidate.measurements:
        if not measurement.limit and not measurement.exclude and measurement.error_jy > 0:
            by_band.setdefault(measurement.band, []).append(measurement)
    return {band: found for band, found in by_band.items() if len(found) > 1}


def epoch_constancy(candidate: Candidate, floor: dict[str, float] | None = None) -> list[Constancy]:
    """Constancy of each band that was measured more than once.

    Args:
        floor: band -> calibration floor as a fraction, added to each error where the repeats come from
            different catalogues, since these do not share one calibration.
    """
    outcomes = []
    for band, found in repeats(candidate).items():
        mixed = len({m.source for m in found}) > 1
        share = (floor or {}).get(band, 0.0) if mixed else 0.0
        error = [math.hypot(m.error_jy, share * m.flux_jy) for m in found]
        outcomes.append(constancy([m.flux_jy for m in found], error, band))
    return outcomes
