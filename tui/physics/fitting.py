"""Global fits of one model to many candidates: scan, descend, let the errors follow the model, look again."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tui.model import FloatArray
from tui.physics.composite import A2, A3, LN_T, WIDTH, X2, X3, Kit, Model, Prediction, kit_for, predict
from tui.physics.descent import descend
from tui.physics.likelihood import Errors, chi_square, errors_for, minus_2_ln_l, residuals
from tui.physics.problem import Problem
from tui.physics.scan import scan

PASSES = 8
SETTLED = 0.1  # the error model has settled once chi-square moves by less
LOOKS = 3  # times that the whole range is scanned anew with the errors of the last pass
MOVED = 0.03  # a scan holds while no band's error has moved by more than this fraction
LOWER = 0.02  # a minimum found anew counts when its cost is lower by more
SECOND_DUST_STEPS = (-1.4, -0.6, 0.6, 1.4)  # of ln T, where a second dust temperature is looked for
HEATS = ((3, 40.0), (3, 6.0), (4, 2.0), (25, 0.0))  # steps, and how far behind the best a start is then given up
ALIKE = 0.04  # parameters this close after a heat lead to the same minimum
SETTLE_STEPS = 10
COARSE = 3e-3  # of the cost: descents on the way; the last one goes on to FINE
FINE = 1e-5
FINE_STEPS = 20
REST = {"dust": np.log(300.0), "star": np.log(3500.0), "compact": np.log(20000.0), "power": 1.0}


@dataclass(frozen=True, slots=True, eq=False)
class FitBatch:
    """The best fit of one model to each of M candidates."""

    kit: Kit
    problem: Problem
    errors: Errors
    x: FloatArray  # (M, 8)
    cost: FloatArray  # (M,) sum of squares with the last pass's errors
    chi2: FloatArray  # (M,)
    minus2lnl: FloatArray  # (M,)
    prediction: Prediction

    @property
    def model(self) -> Model:
        """The model fitted."""
        return self.kit.model

    @property
    def pulls(self) -> FloatArray:
        """(measured - model)/sigma (M, B); for a limit 0 where it is met; NaN where nothing was measured."""
        pull = (self.problem.flux_jy - self.prediction.flux) / self.errors.sigma
        pull = np.where(self.problem.limited, np.minimum(pull, 0.0), pull)
        return np.where(self.problem.detected | self.problem.limited, pull, np.nan)

    def take(self, rows: np.ndarray) -> FitBatch:
        """The same fits of some candidates."""
        here = self.prediction
        return FitBatch(
            self.kit,
            self.problem.take(rows),
            self.errors.take(rows),
            self.x[rows],
            self.cost[rows],
            self.chi2[rows],
            self.minus2lnl[rows],
            Prediction(here.flux[rows], here.star[rows], here.slopes[rows]),
        )

    def at_bounds(self) -> np.ndarray:
        """Which free parameters lie at a bound, (M, P)."""
        free = list(self.model.free)
        low, high = (edge[:, free] for edge in self.kit.bounds(self.problem.av_max))
        x, near = self.x[:, free], self.kit.near(self.problem.av_max)[:, free]
        return (x <= low + near) | (x >= high - near)


def first_errors(problem: Problem) -> Errors:
    """Errors before any model: floors and spread of the measured fluxes themselves."""
    flux = np.where(problem.detected, np.maximum(problem.flux_jy, 0.0), 0.0)
    middle = np.full(len(problem), np.log(6000.0))
    return errors_for(problem, flux, flux, middle)


def fit(
    problem: Problem, model: Model, *, r_v: float = 3.1, start: FloatArray | None = None, other_law: bool = False
) -> FitBatch:
    """Best fit of `model` to every candidate of `problem`.

    Args:
        r_v: R_V of the screen where the model does not free it.
        start: (M, 8) rows to begin from besides the scan's, for nested models.
        other_law: behind a screen by the templates' other law.
    """
    kit = kit_for(model, problem.templates, r_v, other_law=other_law)
    errors = first_errors(problem)
    extra = [] if start is None else [start]
    x, cost = look(problem, kit, errors, extra)
    looked = errors.sigma.copy()
    errors, x, cost = settle(problem, kit, x)
    for _ in range(LOOKS):
        moved = np.abs(errors.sigma / looked - 1.0) > MOVED
        rows = np.flatnonzero((moved & (problem.detected | problem.limited)).any(axis=1))
        if not rows.size:
            break
        some, own = problem.take(rows), errors.take(rows)
        looked[rows] = own.sigma
        anew, anew_cost = look(some, kit, own, [each[rows] for each in extra])
        better = anew_cost < cost[rows] - LOWER
        if not better.any():
            break
        again, x_again, cost_again = settle(some.take(better), kit, anew[better])
        there = rows[better]
        lower = cost_again + again.ln_det < cost[there] + errors.ln_det[there]  # each with the errors it settled on
        x[there[lower]], cost[there[lower]] = x_again[lower], cost_again[lower]
        errors = replace_rows(errors, there[lower], again.take(np.flatnonzero(lower)))
    x = descend(problem, kit, errors, x, steps=FINE_STEPS, tolerance=FINE).x
    return finish(problem, kit, errors, x)


def look(problem: Problem, kit: Kit, errors: Errors, extra: list[FloatArray]) -> tuple[FloatArray, FloatArray]:
    """The lowest of several descents from a scan of the whole range, errors frozen.

    All starts go a few steps; those that are then far above the best of their candidate go no further.
    """
    starts = np.stack([*starting_rows(problem, kit, errors), *extra])
    count, m = starts.shape[:2]
    owner = np.tile(np.arange(m), count)
    rows = first_of_each(starts.reshape(count * m, WIDTH), owner)
    owner, x = owner[rows], starts.reshape(count * m, WIDTH)[rows]
    for steps, behind in HEATS:
        heat = descend(problem.take(owner), kit, errors.take(owner), x, steps=steps, tolerance=COARSE)
        best = np.full(m, np.inf)
        np.minimum.at(best, owner, heat.cost)
        order = np.lexsort((heat.cost, owner))
        order = order[heat.cost[order] <= best[owner[order]] + behind]
        order = order[first_of_each(np.round(heat.x[order] / ALIKE), owner[order])]
        owner, x, cost = owner[order], heat.x[order], heat.cost[order]
    first = np.unique(owner, return_index=True)[1]
    return x[first], cost[first]


def first_of_each(x: FloatArray, owner: np.ndarray) -> np.ndarray:
    """Row numbers without the rows that repeat an earlier one of the same owner."""
    _, first = np.unique(np.column_stack([owner, x]), axis=0, return_index=True)
    return np.sort(first)


def starting_rows(problem: Problem, kit: Kit, errors: Errors) -> list[FloatArray]:
    """Rows to descend from; a second dust temperature is looked for about the first."""
    if len(kit.model.sources) < 2:
        return list(scan(problem, kit, errors))
    rows = scan(problem, kit, errors, 1)[0]
    out = []
    for step in SECOND_DUST_STEPS:
        row = rows.copy()
        row[:, X3] = np.clip(rows[:, X2] + step, kit.further[1].low, kit.further[1].high)
        row[:, A3] = 0.3 * rows[:, A2]
        out.append(row)
    return out


def settle(problem: Problem, kit: Kit, x: FloatArray) -> tuple[Errors, FloatArray, FloatArray]:
    """Let errors and parameters follow each other until chi-square rests."""
    x, cost = x.copy(), np.empty(len(problem))
    here = predict(kit, x)
    errors = errors_for(problem, here.flux, here.star, x[:, LN_T])
    live, before = np.arange(len(problem)), np.full(len(problem), np.inf)
    for _ in range(PASSES):
        some = problem.take(live)
        here = predict(kit, x[live])
        own = errors_for(some, here.flux, here.star, x[live, LN_T])
        found = descend(some, kit, own, x[live], steps=SETTLE_STEPS, tolerance=COARSE)
        x[live], cost[live] = found.x, found.cost
        errors = replace_rows(errors, live, own)
        chi2 = chi_square(some, kit, own, found.x, predict(kit, found.x))
        moving = np.abs(chi2 - before[live]) >= SETTLED
        before[live] = chi2
        live = live[moving]
        if not live.size:
            break
    return errors, x, cost


def replace_rows(errors: Errors, rows: np.ndarray, some: Errors) -> Errors:
    """`errors` with those of some candidates put in."""
    sigma, ln_det = errors.sigma.copy(), errors.ln_det.copy()
    sigma[rows], ln_det[rows] = some.sigma, some.ln_det
    if errors.whiten is None:
        return Errors(sigma, None, ln_det)
    whiten = errors.whiten.copy()
    whiten[rows] = some.whiten
    return Errors(sigma, whiten, ln_det)


def finish(problem: Problem, kit: Kit, errors: Errors, x: FloatArray) -> FitBatch:
    """Statistics of parameter rows with given errors."""
    x = rested(kit, x)
    prediction = predict(kit, x)
    chi2 = chi_square(problem, kit, errors, x, prediction)
    cost = residuals(problem, kit, errors, x, prediction).cost
    return FitBatch(kit, problem, errors, x, cost, chi2, minus_2_ln_l(problem, errors, cost), prediction)


def rested(kit: Kit, x: FloatArray) -> FloatArray:
    """Parameters of a source of no amplitude put to rest at a plain value, so that they mean nothing."""
    x = x.copy()
    if kit.model.bound_pair:
        return x
    for source, (column_x, column_a) in zip(kit.model.sources, ((X2, A2), (X3, A3)), strict=False):
        gone = x[:, column_a] <= 1e-12
        x[gone, column_x], x[gone, column_a] = REST[source], 0.0
    return x
