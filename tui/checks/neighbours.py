"""Sources beside the star: how much of their light each band takes for the star's own."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from tui.checks.doubts import INFORMATIVE, SUSPICION, Doubt
from tui.model import Band, Candidate
from tui.physics.context import leak_fraction

LEAST_SHARE = 0.01  # leaks below 1 % of a band's flux are not spoken of; our choice


@dataclass(frozen=True, slots=True)
class Leak:
    """Light of all neighbours that leaks into one band's fit."""

    band: str
    leak_jy: float
    share: float  # of the measured flux
    anomaly_share: float  # of measured minus star-only model; NaN where no anomaly was given or it is negative
    nearest_arcsec: float
    n_in_beam: int  # neighbours within one FWHM

    def as_dict(self) -> dict[str, float | int | str]:
        """As the evidence stores it."""
        return {
            "band": self.band, "leak_jy": self.leak_jy, "share": self.share, "anomaly_share": self.anomaly_share,
            "nearest_arcsec": self.nearest_arcsec, "in_beam": self.n_in_beam,
        }  # fmt: skip


def measured_fluxes(candidate: Candidate) -> dict[str, tuple[float, float]]:
    """Band -> (flux, error) of its detections, Jy: the one with the smallest error."""
    best: dict[str, tuple[float, float]] = {}
    for m in candidate.measurements:
        if m.limit or m.exclude:
            continue
        error = m.error_jy if m.error_jy > 0 else math.inf
        if m.band not in best or error < best[m.band][1]:
            best[m.band] = (m.flux_jy, error)
    return best


def neighbour_leaks(
    candidate: Candidate, bands: Mapping[str, Band], anomaly_jy: Mapping[str, float] | None = None
) -> list[Leak]:
    """Light leaking into each measured band, summed over the neighbours whose flux in that band is known.

    Args:
        anomaly_jy: band -> measured minus star-only model, Jy; where given and positive, each leak is also
            compared with it.
    """
    leaks = []
    for name, (flux, _) in measured_fluxes(candidate).items():
        band = bands.get(name)
        if band is not None and math.isfinite(band.beam_fwhm_arcsec) and candidate.neighbours:
            leaks.append(_leak(candidate, band, flux, (anomaly_jy or {}).get(name, math.nan)))
    return leaks


def _leak(candidate: Candidate, band: Band, flux_jy: float, anomaly_jy: float) -> Leak:
    total, nearest, inside = 0.0, math.inf, 0
    for neighbour in candidate.neighbours:
        nearest = min(nearest, neighbour.separation_arcsec)
        inside += neighbour.separation_arcsec < band.beam_fwhm_arcsec
        other = neighbour.fluxes_jy.get(band.name)
        if other is not None and math.isfinite(other):
            total += max(other, 0.0) * float(leak_fraction(neighbour.separation_arcsec, band.beam_fwhm_arcsec))
    share = total / flux_jy if flux_jy > 0 else math.nan
    return Leak(band.name, total, share, total / anomaly_jy if anomaly_jy > 0 else math.nan, nearest, inside)


def neighbour_doubts(candidate: Candidate, bands: Mapping[str, Band], leaks: list[Leak]) -> list[Doubt]:
    """A leak is a suspicion where it exceeds both the error and the calibration floor of its band."""
    fluxes, doubts = measured_fluxes(candidate), []
    for leak in leaks:
        flux, error = fluxes[leak.band]
        least = max(error if math.isfinite(error) else 0.0, bands[leak.band].floor * abs(flux))
        if leak.leak_jy > least:
            text = f"neighbours leak {100 * leak.share:.0f} % of its flux into this band"
            doubts.append(Doubt(leak.band, "neighbour", text, SUSPICION))
        elif leak.share > LEAST_SHARE:
            text = f"neighbours leak {100 * leak.share:.1f} % of its flux into this band, within its error"
            doubts.append(Doubt(leak.band, "neighbour", text, INFORMATIVE))
    return doubts


def neighbour_sentences(leaks: list[Leak]) -> tuple[str, ...]:
    """What a reviewer should know, for the bands in which neighbours could make the anomaly or a part of it."""
    said = []
    for leak in leaks:
        if leak.anomaly_share > 0.1:
            share = "all" if leak.anomaly_share >= 1 else f"{100 * leak.anomaly_share:.0f} %"
            said.append(f"{leak.band}: light leaking from neighbours makes {share} of what the star alone leaves over.")
    return tuple(said)
