"""From fitted rows to the fits that evidence holds."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cache

import numpy as np

from tui.checks.spectra import parts
from tui.model import Fit, FloatArray, Param, Settings
from tui.physics.composite import A2, A3, AV, LN_S, LN_T, RV, X2, X3, Kit, Model
from tui.physics.constants import L_SUN, PARSEC, T_EQUILIBRIUM_1AU_K
from tui.physics.fitting import FitBatch
from tui.physics.planck import surface_flux
from tui.physics.profile import Intervals, intervals
from tui.physics.shared import shown_pulls
from tui.physics.statistics import adequate, aic, bic, chi2_tail

RAD_TO_MAS = 180.0 * 3600e3 / np.pi


def _theta_mas(ln_s: float) -> float:
    return float(np.exp(0.5 * ln_s) * RAD_TO_MAS)


def _exp(value: float) -> float:
    return float(np.exp(value))


def _itself(value: float) -> float:
    return float(value)


def _root(value: float) -> float:
    return float(np.sqrt(value))


@dataclass(frozen=True, slots=True)
class Column:
    """How one parameter column is reported."""

    name: str
    unit: str
    shown: Callable[[float], float]


def columns_of(kit: Kit) -> dict[int, Column]:
    """Reported name, unit and scale of each free column of a model."""
    return _columns(kit.model)


@cache
def _columns(model: Model) -> dict[int, Column]:
    sources = model.sources
    pair = bool(sources) and sources[0] != "dust"
    table = {
        LN_T: Column("teff1" if pair else "teff", "K", _exp),
        LN_S: Column("theta", "mas", _theta_mas),
        AV: Column("av", "mag", _itself),
        RV: Column("r_v", "", _itself),
    }
    if sources and sources[0] == "dust":
        table[X2] = Column("dust_temperature", "K", _exp)
        table[A2] = Column("dust_fractional_luminosity", "", _itself)
        table[X3] = Column("dust2_temperature", "K", _exp)
        table[A3] = Column("dust2_fractional_luminosity", "", _itself)
    elif pair:
        table[X2] = Column("slope", "", _itself) if sources[0] == "power" else Column("teff2", "K", _exp)
        table[A2] = Column("radius_ratio", "", _root) if sources[0] == "compact" else Column("flux_ratio", "", _itself)
    return {column: table[column] for column in model.free}


def fits_of(batch: FitBatch, *, with_intervals: bool = True, held: np.ndarray | None = None) -> list[Fit]:
    """One Fit per row; profile intervals of its parameters but those `held` (8,), or NaN ends."""
    ends = intervals(batch, held) if with_intervals and len(batch.problem) else None
    dof, points = degrees(batch)
    p = chi2_tail(batch.chi2, dof)
    k = len(batch.model.free)
    scores = (aic(batch.minus2lnl, k), bic(batch.minus2lnl, k, points))
    names = batch.problem.templates.names
    pulls = shown_pulls(batch)
    return [
        Fit(
            model=batch.model.name,
            chi2=float(batch.chi2[row]),
            dof=int(dof[row]),
            p=float(p[row]),
            aic=float(scores[0][row]),
            bic=float(scores[1][row]),
            params=params_of(batch, row, ends),
            pulls={names[c]: float(pulls[row, c]) for c in np.flatnonzero(np.isfinite(pulls[row]))},
            minus2lnl=float(batch.minus2lnl[row]),
        )
        for row in range(len(batch.problem))
    ]


@dataclass(frozen=True, slots=True, eq=False)
class Group:
    """Fits of one model to some rows of a larger problem."""

    batch: FitBatch
    rows: np.ndarray  # (K,): which candidates

    @property
    def scores(self) -> FloatArray:
        """BIC per row of the batch."""
        return bic(self.batch.minus2lnl, len(self.batch.model.free), degrees(self.batch)[1])


def ordered_fits(groups: list[Group], count: int) -> list[list[tuple[Fit, int]]]:
    """Per candidate its fits, lowest BIC first, each with the points it was fitted to; intervals for the first only.

    Intervals cost as much as fits: those of the other models are left open (NaN), and `probe` gives them.
    """
    best = np.full(count, np.inf)
    for group in groups:
        best[group.rows] = np.minimum(best[group.rows], group.scores)
    found: list[list[tuple[Fit, int]]] = [[] for _ in range(count)]
    for group in groups:
        leads = group.scores <= best[group.rows]
        points = degrees(group.batch)[1]
        for chosen, with_intervals in ((np.flatnonzero(leads), True), (np.flatnonzero(~leads), False)):
            if chosen.size:
                fits = fits_of(group.batch.take(chosen), with_intervals=with_intervals)
                for place, one in zip(chosen, fits, strict=True):
                    found[group.rows[place]].append((one, int(points[place])))
    return [sorted(fits, key=lambda pair: pair[0].bic) for fits in found]


def degrees(batch: FitBatch) -> tuple[FloatArray, FloatArray]:
    """Degrees of freedom and points per row: a parameter at a bound, or of a source that is not there, costs none."""
    resting = batch.at_bounds()
    free = list(batch.model.free)
    for x, a in ((X2, A2), (X3, A3)):
        if a in free:
            resting[:, free.index(x)] |= batch.x[:, a] <= 1e-12
    points = batch.problem.points.astype(np.float64)
    if batch.model.bound_pair:
        points = points + np.isfinite(batch.problem.parallax_mas)
    return points - (~resting).sum(axis=1), points


def params_of(batch: FitBatch, row: int, ends: Intervals | None) -> dict[str, Param]:
    """Reported parameters of one row; those of a source of no amplitude are left out, its limit kept."""
    x = batch.x[row]
    found: dict[str, Param] = {}
    for column, shown in columns_of(batch.kit).items():
        amplitude = {X2: A2, X3: A3}.get(column)
        if amplitude in batch.model.free and x[amplitude] <= 1e-12:
            continue
        value = shown.shown(x[column])
        low = high = float("nan")
        if ends is not None:
            low, high = shown.shown(ends.low[row, column]), shown.shown(ends.high[row, column])
        limit = bool(ends.limit[row, column]) if ends is not None else False
        found[shown.name] = Param(value, low, high, shown.unit, limit)
    return found


def luminosity_sun(teff_k: float, theta_mas: float, parallax_mas: float) -> float:
    """Star's luminosity L/L_sun from theta^2 sigma T^4 and its parallax; NaN without one."""
    if not parallax_mas > 0:
        return float("nan")
    radius_m = theta_mas / RAD_TO_MAS * 1000.0 * PARSEC / parallax_mas
    return float(4 * np.pi * radius_m**2 * surface_flux(teff_k) / L_SUN)


def dust_radius(temperature: Param, luminosity: float) -> Param:
    """Radius of black grains at a temperature, au: (278.3 K/T)^2 sqrt(L/L_sun); a lower limit on the true radius.

    Source: Backman & Paresce 1993; Pawellek & Krivov 2015, MNRAS 454, 3207, on real grains.
    """

    def radius(kelvin: float) -> float:
        return (T_EQUILIBRIUM_1AU_K / kelvin) ** 2 * luminosity**0.5

    return Param(radius(temperature.value), radius(temperature.high), radius(temperature.low), "au", temperature.limit)


def stands(fit: Fit, points: int, settings: Settings) -> bool | None:
    """Whether a fit is adequate by the queue's threshold; with a spectrum, that and the bands each by themselves too."""
    answer = adequate(fit.chi2, points, fit.dof, settings.p_min)
    refused = any(float(chi2_tail(chi2, count)) < settings.p_min for chi2, count in parts(fit))
    return False if refused else answer


def any_stands(answers: Mapping[str, bool | None] | list[bool | None]) -> bool | None:
    """Yes if some fit stands, no if some was tested and none stands, else untestable."""
    values = list(answers.values()) if isinstance(answers, Mapping) else list(answers)
    if any(value is True for value in values):
        return True
    return False if any(value is False for value in values) else None


