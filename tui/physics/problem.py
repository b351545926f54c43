"""What many candidates' fits need as arrays: one row a candidate, one column a band."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from tui.model import Candidate, FloatArray, Measurement
from tui.physics.templates import Templates

NO_ERROR_FLOOR = 0.1  # weight of a detection without error among repeats, as a fraction; common practice, no source


@dataclass(frozen=True, slots=True, eq=False)
class Problem:
    """M candidates in B bands. A cell is a detection, a limit or nothing."""

    templates: Templates  # of exactly these B bands
    flux_jy: FloatArray  # (M, B); 0 where nothing
    error_jy: FloatArray  # (M, B), 1 sigma of the measurement itself; 1 where nothing
    detected: np.ndarray  # (M, B) bool
    limited: np.ndarray  # (M, B) bool: flux_jy is an upper limit, error_jy its sigma
    parallax_mas: FloatArray  # (M,), zero point taken off; NaN where none is to be used
    parallax_error_mas: FloatArray  # (M,)
    av_max: FloatArray  # (M,), mag: the most extinction that the line of sight allows
    common: FloatArray  # (K, B): fractional error common to an instrument's bands, one row an instrument

    def __len__(self) -> int:
        return self.flux_jy.shape[0]

    @property
    def points(self) -> np.ndarray:
        """Detections and limits per candidate, shape (M,)."""
        return self.detected.sum(axis=1) + self.limited.sum(axis=1)

    def take(self, rows: np.ndarray) -> Problem:
        """The same for some candidates (integer or boolean index)."""
        per_row = ("flux_jy", "error_jy", "detected", "limited", "parallax_mas", "parallax_error_mas", "av_max")
        return replace(self, **{name: getattr(self, name)[rows] for name in per_row})

    def without(self, dropped: np.ndarray) -> Problem:
        """The same with the cells of a boolean (M, B) mask left out."""
        return replace(self, detected=self.detected & ~dropped, limited=self.limited & ~dropped)


@dataclass(frozen=True, slots=True)
class Combined:
    """One band's fitted value, from one or several measurements."""

    flux_jy: float
    error_jy: float
    limit: bool
    count: int
    scatter: float  # standard deviation of the repeats about their mean in units of their errors; NaN for one


def combine(measurements: Sequence[Measurement]) -> Combined:
    """Inverse-variance mean of a band's detections; with limits only, the tightest.

    A lone detection without error has the error 0: the band's floor stands for it. Beside others it weighs as one
    of 10 %, since its true error is unknown.
    """
    detections = [m for m in measurements if not m.limit]
    if len(detections) == 1:
        error = detections[0].error_jy
        return Combined(detections[0].flux_jy, error if error > 0 else 0.0, False, 1, np.nan)
    if not detections:
        best = min(measurements, key=lambda m: m.flux_jy)
        return Combined(best.flux_jy, best.flux_jy / best.nsigma, True, len(measurements), np.nan)
    flux = np.array([m.flux_jy for m in detections])
    error = np.array([m.error_jy for m in detections])
    error = np.where(np.isfinite(error) & (error > 0), error, NO_ERROR_FLOOR * np.abs(flux))
    weight = 1.0 / np.maximum(error, 1e-30) ** 2
    mean = float(np.sum(weight * flux) / np.sum(weight))
    scatter = float(np.sqrt(np.sum(weight * (flux - mean) ** 2) / (flux.size - 1))) if flux.size > 1 else np.nan
    return Combined(mean, float(np.sum(weight) ** -0.5), False, flux.size, scatter)


def fitted_bands(candidate: Candidate) -> dict[str, Combined]:
    """Band -> value to fit, excluded measurements left out."""
    groups: dict[str, list[Measurement]] = {}
    for measurement in candidate.measurements:
        if not measurement.exclude:
            groups.setdefault(measurement.band, []).append(measurement)
    return {band: combine(group) for band, group in groups.items()}


def build_problem(
    candidates: Sequence[Candidate],
    templates: Templates,
    *,
    parallaxes: tuple[FloatArray, FloatArray],
    av_max: FloatArray,
    common: Mapping[str, float] | None = None,
) -> Problem:
    """Arrays for `candidates`: the bands that any of them has and the photosphere source speaks of.

    Args:
        parallaxes: (M,) parallaxes and errors, mas, NaN where none is to be used.
        av_max: (M,) mag.
        common: instrument -> common fractional error of its bands.
    Raises:
        TemplateError: a candidate has a band that `templates` lacks.
    """
    values = [fitted_bands(candidate) for candidate in candidates]
    used = {band for row in values for band in row} - set(templates.silent)
    spoken = [name for name in templates.names if name not in templates.silent]
    names = [name for name in spoken if name in used] or spoken[:1]  # never no column at all
    local = templates.take([*names, *sorted(used - set(names))])
    place = {name: column for column, name in enumerate(local.names)}
    shape = (len(candidates), len(place))
    flux, error = np.zeros(shape), np.ones(shape)
    detected, limited = np.zeros(shape, bool), np.zeros(shape, bool)
    for row, combined in enumerate(values):
        for name, value in combined.items():
            column = place.get(name)
            if column is None:
                continue
            flux[row, column], error[row, column] = value.flux_jy, max(value.error_jy, 1e-30)
            (limited if value.limit else detected)[row, column] = True
    rows = [
        [size if band.instrument == instrument else 0.0 for band in local.bands]
        for instrument, size in (common or {}).items()
    ]
    return Problem(
        templates=local,
        flux_jy=flux,
        error_jy=error,
        detected=detected,
        limited=limited,
        parallax_mas=parallaxes[0],
        parallax_error_mas=parallaxes[1],
        av_max=av_max,
        common=np.array(rows).reshape(len(rows), shape[1]),
    )
