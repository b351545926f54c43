"""From a candidate and its evidence to what a plot draws."""

from __future__ import annotations

import math
from collections.abc import Collection, Mapping
from typing import TYPE_CHECKING

import numpy as np

from tui.desk.text import SPECTRUM_POINT, number, safe, short_band
from tui.desk.widgets.plot_data import PlotCurve, PlotData, PlotPoint, SpectrumPulls
from tui.model import Band, Candidate, Evidence, Fit, Measurement, Spectrum

if TYPE_CHECKING:
    from tui.checks import Curve

LETTERS = "abcd"
OTHER = "+"  # on the curve of the fit compared with, whose pulls are marked so too
HALF = 0.5  # of the peak: where a band is taken to begin and end
TOLD = 1.05  # times the own error: from here on the error with the floor is told beside it
NARROW = 0.02  # share of the wavelength: width of a band of which only the pivot is known


def plot_points(
    candidate: Candidate,
    bands: Mapping[str, Band],
    fit: Fit | None = None,
    *,
    fitted: Collection[str] = (),
    dropped: Collection[str] = (),
    other: Fit | None = None,
) -> tuple[PlotPoint, ...]:
    """One point for each measurement in a band whose wavelength is known.

    Args:
        fitted: bands that the evidence fitted; empty where that is not known. A fit may have left out more of them.
        dropped: bands left out by hand.
        other: the fit compared with, whose pulls are marked too.
    """
    points = []
    for measurement in candidate.measurements:
        band = bands.get(measurement.band)
        if band is None or not band.pivot_um > 0:
            continue
        out = measurement.exclude or measurement.band in dropped or bool(fitted) and measurement.band not in fitted
        out = out or fit is not None and bool(fit.pulls) and measurement.band not in fit.pulls
        points.append(_point(measurement, band, fit, other, out))
    return tuple(points)


def plot_curves(curve: Curve | None, other: Curve | None = None, other_label: str = "") -> tuple[PlotCurve, ...]:
    """A fit's components with their letters, its total and, where asked for, the total of another fit."""
    lines: list[PlotCurve] = []
    if curve is not None:
        if len(curve.components) > 1:
            for letter, (label, flux) in zip(LETTERS, curve.components.items(), strict=False):
                lines.append(PlotCurve(safe(label), curve.wave_um, np.asarray(flux), "component", letter))
        lines.append(
            PlotCurve("total" if len(curve.components) > 1 else "model", curve.wave_um, curve.total_jy, "total")
        )
    if other is not None:
        lines.append(PlotCurve(other_label, other.wave_um, other.total_jy, "other", OTHER))
    return tuple(lines)


def spectrum_curve(candidate: Candidate) -> tuple[PlotCurve, ...]:
    """The candidate's own spectrum as a line, if it has one."""
    spectrum = candidate.spectrum
    if spectrum is None:
        return ()
    return (PlotCurve("spectrum", spectrum.wave_um, spectrum.flux_jy, "spectrum"),)


def spectrum_pulls(candidate: Candidate, fit: Fit | None, curve: Curve | None) -> SpectrumPulls | None:
    """The spectrum's points for the strip of pulls: as fitted where they were, else against the drawn curve.

    Returns:
        None where there is no spectrum, or neither a fit that holds it nor a curve to hold it against.
    """
    fitted = {
        float(band.removeprefix(SPECTRUM_POINT)): pull
        for band, pull in (fit.pulls if fit else {}).items()
        if band.startswith(SPECTRUM_POINT)
    }
    if fitted:
        wave = np.array(sorted(fitted))
        return SpectrumPulls(wave, np.array([fitted[one] for one in wave.tolist()]), fitted=True)
    spectrum = candidate.spectrum
    if spectrum is None or curve is None or len(curve.wave_um) < 2:
        return None
    return _held_against(spectrum, curve)


def _held_against(spectrum: Spectrum, curve: Curve) -> SpectrumPulls | None:
    with np.errstate(divide="ignore", invalid="ignore"):
        log_model = np.interp(np.log(spectrum.wave_um), np.log(curve.wave_um), np.log(np.asarray(curve.total_jy)),
                              left=np.nan, right=np.nan)  # fmt: skip
        pulls = (spectrum.flux_jy - np.exp(log_model)) / spectrum.error_jy
    known = np.isfinite(pulls)
    return SpectrumPulls(spectrum.wave_um[known], pulls[known], fitted=False) if known.any() else None


def band_ends(band: Band) -> tuple[float, float]:
    """Where the response falls to half its peak, micron."""
    if band.wave_um.size < 2:
        return band.pivot_um * (1 - NARROW), band.pivot_um * (1 + NARROW)
    high = band.wave_um[band.response >= HALF * band.response.max()]
    return float(high[0]), float(high[-1])


def point_words(plot: PlotData, index: int, measurement: Measurement) -> str:
    """The point under the cursor in one sentence: band, flux, error, pull, and what was done with it."""
    point = plot.points[index]
    name = short_band(point.band)
    unit, scale = ("mJy", 1e3) if abs(point.flux_jy) < 1 else ("Jy", 1.0)
    if point.limit:
        ceiling = f"{number(point.flux_jy * scale)} {unit} ({measurement.nsigma:g} sigma)"
        words = f"{name} {number(point.wave_um)} micron: below {ceiling}"
    else:
        error = f" +- {number(measurement.error_jy * scale, 2)}" if measurement.error_jy > 0 else ""
        words = f"{name} {number(point.wave_um)} micron: {number(point.flux_jy * scale)}{error} {unit}"
        words += fit_error_words(point, measurement, scale)
    if math.isfinite(point.pull):
        words += ", " + pull_words(point.pull, point.limit)
    if point.dropped:
        words += ", not fitted"
    if measurement.flags:
        words += "; " + ", ".join(f"{safe(key)} {safe(text)}" for key, text in measurement.flags.items())
    return words


def fit_error_words(point: PlotPoint, measurement: Measurement, scale: float) -> str:
    """How large the error is at least that the pull is counted in: the measurement's own and the band's floor.

    The spread of real stars, and the floor of a model above the data, come on top; '' where the floor adds little.
    """
    own = measurement.error_jy
    whole = math.hypot(own, point.floor * point.flux_jy)
    return f" (fit error at least {number(whole * scale, 2)})" if 0 < TOLD * own < whole else ""


def pull_words(pull: float, limit: bool) -> str:
    """A pull in words."""
    if limit:
        return "limit met" if pull == 0 else f"the model breaks the limit by {abs(pull):.1f} sigma"
    if abs(pull) < 0.05:
        return "on the model"
    return f"{abs(pull):.1f} sigma {'above' if pull > 0 else 'below'} the model"


def fit_of(evidence: Evidence | None, index: int) -> Fit | None:
    """One of the evidence's fits, or None where there is none of that number."""
    if evidence is None or not 0 <= index < len(evidence.fits):
        return None
    return evidence.fits[index]


def _point(measurement: Measurement, band: Band, fit: Fit | None, other: Fit | None, out: bool) -> PlotPoint:
    low, high = band_ends(band)
    error = measurement.error_jy
    if not math.isfinite(error):
        error = 0.0 if measurement.limit else band.floor * abs(measurement.flux_jy)
    return PlotPoint(
        band=measurement.band,
        wave_um=band.pivot_um,
        low_um=min(low, band.pivot_um),
        high_um=max(high, band.pivot_um),
        flux_jy=measurement.flux_jy,
        error_low_jy=error,
        error_high_jy=error,
        limit=measurement.limit,
        dropped=out,
        pull=fit.pulls.get(measurement.band, math.nan) if fit else math.nan,
        floor=band.floor,
        other_pull=other.pulls.get(measurement.band, math.nan) if other else math.nan,
    )
