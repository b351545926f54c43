"""What each model of a dip gives at every wavelength: the curves to draw through its depths."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from tui.model import Band, Candidate, Evidence, FloatArray

POINTS = 200
MARGIN = 1.15  # beyond the outermost bands, as a ratio of wavelengths


@dataclass(frozen=True, slots=True, eq=False)
class DipCurve:
    """One fitted model of one event."""

    event: str
    model: str  # without the event's name
    chi2: float
    dof: int
    p: float
    wave_um: FloatArray  # shape (N,), micron
    depth: FloatArray  # shape (N,), fraction of the flux lost


def dip_curves(candidate: Candidate, dips: Evidence | None, law: str, bands: Mapping[str, Band]) -> list[DipCurve]:
    """The curves of every fit of the dips, in the order of the fits; none where there are no fits.

    Args:
        law: extinction law of the settings that the fits were made with.
    """
    if dips is None or not dips.fits:
        return []
    from tui.checks.dips import model_depths

    events = list(dips.facts.get("events", []))
    curves = []
    for fit in dips.fits:
        event = next((name for name in events if len(events) > 1 and fit.model.endswith(f" ({name})")), events[0])
        pivots = [bands[one.band].pivot_um for one in candidate.dips if one.event == event and one.band in bands]
        wave = np.geomspace(min(pivots) / MARGIN, max(pivots) * MARGIN, POINTS)
        model = fit.model.removesuffix(f" ({event})")
        curves.append(DipCurve(event, model, fit.chi2, fit.dof, fit.p, wave, model_depths(fit, wave, law)))
    return curves
