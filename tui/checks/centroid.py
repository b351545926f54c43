"""Centroid shift between bands: where a second source would have to be that makes both the excess and the shift.

Two sources in one beam are measured as one, at the mean of their places weighted by their light. With a share g of the
light from the second one, its distance from the star is the shift divided by g. The star's own place is the
candidate's, in the optical; another catalogue's position is that of its bands, each weighted by (flux/error)^2, as a
fit to all of them at once weights it.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from tui.checks.chance import LEAST_EXCESS_SIGMA
from tui.checks.match import CATALOGUES, P_MATCH, Match
from tui.checks.neighbours import measured_fluxes
from tui.model import Band, Candidate

LEAST_SHARE = 0.03  # of the light: less of it moves no centroid that a catalogue could tell; our choice
BOUND_SIGMA = 2.0
INSTRUMENTS = {catalogue.title: catalogue.instruments for catalogue in CATALOGUES}


@dataclass(frozen=True, slots=True)
class Shift:
    """One catalogue's centroid against the star, and what it says of the source of the excess."""

    catalogue: str
    shift_arcsec: float
    sigma_arcsec: float
    p: float  # that a right, single source is measured so far off
    share: float  # of the light behind this position that the star alone leaves over
    beam_arcsec: float  # the narrowest of the catalogue's bands with an excess
    bands: tuple[str, ...]  # with an excess, in order of wavelength

    @property
    def source_arcsec(self) -> float:
        """How far away the source of the excess lies, if it pulls the centroid."""
        return self.shift_arcsec / self.share

    @property
    def within_arcsec(self) -> float:
        """The source of the excess lies no farther from the star than this, at 2 sigma."""
        return (self.shift_arcsec + BOUND_SIGMA * self.sigma_arcsec) / self.share

    @property
    def is_pulled(self) -> bool:
        """Whether the centroid is off, and by what a source inside the beam could make."""
        return self.p < P_MATCH and self.source_arcsec < self.beam_arcsec

    def as_dict(self) -> dict[str, float | str]:
        """As the evidence stores it."""
        return {
            "catalogue": self.catalogue, "shift": self.shift_arcsec, "sigma": self.sigma_arcsec, "p": self.p,
            "share": self.share, "source": self.source_arcsec, "within": self.within_arcsec,
        }  # fmt: skip

    def sentence(self) -> str:
        """What a shift means."""
        names = ", ".join(self.bands)
        return (
            f"{self.catalogue}: the centroid is {self.shift_arcsec:.2f} +- {self.sigma_arcsec:.2f} arcsec off the "
            f"star. If what makes the excess in {names}, {100 * self.share:.0f} % of the light, pulls it there, "
            f"it lies {self.source_arcsec:.1f} arcsec away, inside the beam."
        )


def centroid_shifts(
    candidate: Candidate,
    matches: Sequence[Match],
    anomaly_jy: Mapping[str, float],
    pulls: Mapping[str, float],
    bands: Mapping[str, Band],
) -> list[Shift]:
    """Shifts of the catalogues in whose bands the star alone leaves light over; others say nothing of a blend.

    Args:
        anomaly_jy: band -> measured minus star-only model, Jy.
        pulls: band -> star-only pull.
    """
    fluxes = measured_fluxes(candidate)
    found = (_shift(match, fluxes, anomaly_jy, pulls, bands) for match in matches)
    return [shift for shift in found if shift is not None]


def _shift(
    match: Match,
    fluxes: Mapping[str, tuple[float, float]],
    anomaly_jy: Mapping[str, float],
    pulls: Mapping[str, float],
    bands: Mapping[str, Band],
) -> Shift | None:
    own = [name for name in fluxes if name in bands and bands[name].instrument in INSTRUMENTS[match.catalogue]]
    bright = [name for name in own if pulls.get(name, 0.0) >= LEAST_EXCESS_SIGMA and anomaly_jy.get(name, 0.0) > 0]
    weight = {name: _weight(*fluxes[name]) for name in own}
    total = math.fsum(weight.values())
    if not bright or not total > 0:
        return None
    share = math.fsum(weight[name] * min(anomaly_jy[name] / fluxes[name][0], 1.0) for name in bright) / total
    if share < LEAST_SHARE:
        return None
    beam = min(bands[name].beam_fwhm_arcsec for name in bright)
    ordered = tuple(sorted(bright, key=lambda name: bands[name].pivot_um))
    return Shift(match.catalogue, match.separation_arcsec, match.sigma_arcsec, match.p, share, beam, ordered)


def _weight(flux_jy: float, error_jy: float) -> float:
    """Weight of a band in a common position; 0 where its error is unknown."""
    return (flux_jy / error_jy) ** 2 if flux_jy > 0 and 0 < error_jy < math.inf else 0.0


def shift_sentences(shifts: Sequence[Shift]) -> tuple[str, ...]:
    """Cautions for centroids that a second source seems to pull."""
    return tuple(shift.sentence() for shift in shifts if shift.is_pulled)
