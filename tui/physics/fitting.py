"""Global fits of one model to many candidates: scan, descend, let the errors follow the model, look again."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tui.model import FloatArray
from tui.physics.composite import A2, A3, X2, X3, Kit, Model, Prediction, kit_for, predict
from tui.physics.likelihood import Errors, chi_square, errors_for, errors_of, minus_2_ln_l, residuals
from tui.physics.looking import Minima, gone_down, look, put
from tui.physics.problem import Problem
from tui.physics.scan import scan

PASSES = 8
SETTLED = 0.1  # the error model has settled once chi-square moves by less
LOOKS = 4  # times that minima are compared anew with the errors of the last pass
MOVED = 0.03  # minima hold while no band's error has moved by more than this fraction
FAR = 0.3  # beyond which the range is scanned anew
GIVE = 20.0  # of -2 ln L: a lower minimum is taken if with its own errors it is not unlikelier by more
LOWER = 0.02  # a minimum found anew counts when its cost is lower by more
WITH_SECOND_DUST, SECOND_DUST_NODES = 6, 6  # the best starts of one dust, each with a second at so many temperatures
SETTLE_STEPS = 2
COARSE = 3e-3  # of the cost: descents on the way; the last one goes on to FINE
FINE = 1e-5
FINE_STEPS = 25
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
        return FitBatch(
            self.kit,
            self.problem.take(rows),
            self.errors.take(rows),
            self.x[rows],
            self.cost[rows],
            self.chi2[rows],
            self.minus2lnl[rows],
            self.prediction.take(rows),
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
    problem: Problem,
    model: Model,
    *,
    r_v: float = 3.1,
    start: FloatArray | None = None,
    errors: Errors | None = None,
    other_law: bool = False,
) -> FitBatch:
    """Best fit of `model` to every candidate of `problem`.

    Args:
        r_v: R_V of the screen where the model does not free it.
        start: (M, 8) rows to begin from besides the scan's, for nested models.
        errors: to look with at first, best those of a narrower model's fit; in the end they follow this model.
        other_law: behind a screen by the templates' other law.
    """
    kit = kit_for(model, problem.templates, r_v, other_law=other_law)
    errors = first_errors(problem) if errors is None else errors
    extra = [] if start is None else [rested(kit, start)[None]]
    looked = look(problem, kit, errors, np.concatenate([starting_rows(problem, kit, errors), *extra]))
    sigma = errors.sigma.copy()
    now = likelier(problem, kit, settle(problem, kit, looked.x[0]), [*looked.x[1:], *(each[0] for each in extra)])
    likeliest, unsettled = now, np.zeros(0, np.intp)
    for _ in range(LOOKS):
        rows, again = look_again(problem, kit, now.errors, sigma, looked, extra)
        unsettled = rows[:0]
        if not rows.size:
            break
        looked, sigma = looked.put(rows, again), put(sigma, rows, now.errors.sigma[rows])
        better = again.cost[0] < now.cost[rows] - LOWER
        unsettled = rows[better]
        if unsettled.size:
            there = settle(problem.take(unsettled), kit, again.x[0, better])
            taken = there.total < now.total[unsettled] + GIVE
            unsettled = unsettled[taken]
            now = now.put(unsettled, there.take(np.flatnonzero(taken)))
            lower = np.flatnonzero(now.total < likeliest.total)
            likeliest = likeliest.put(lower, now.take(lower))
    now = now.put(unsettled, likeliest.take(unsettled))  # minima that take turns: each the lowest with the other's errors
    x = gone_down(problem, kit, now.errors, now.x, FINE_STEPS, FINE)[0]
    return finish(problem, kit, now.errors, x)


@dataclass(frozen=True, slots=True, eq=False)
class Settled:
    """Parameters and errors that follow each other."""

    errors: Errors
    x: FloatArray  # (M, 8)
    cost: FloatArray  # (M,)

    @property
    def total(self) -> FloatArray:
        """-2 ln L less its constant, (M,)."""
        return self.cost + self.errors.ln_det

    def take(self, rows: np.ndarray) -> Settled:
        """The same for some candidates."""
        return Settled(self.errors.take(rows), self.x[rows], self.cost[rows])

    def put(self, rows: np.ndarray, some: Settled) -> Settled:
        """These with those of some candidates put in."""
        errors = replace_rows(self.errors, rows, some.errors)
        return Settled(errors, put(self.x, rows, some.x), put(self.cost, rows, some.cost))


def likelier(problem: Problem, kit: Kit, now: Settled, others: list[FloatArray]) -> Settled:
    """`now`, or what settles from another row (M, 8) that is likelier with the errors that follow it.

    The lowest minimum with one's errors may be a poor one with its own, where the spread of stars changes with T_eff.
    """
    totals = []
    for x in others:
        seen = predict(kit, x)
        errors = errors_of(problem, x, seen)
        total = residuals(problem, kit, errors, x, seen).cost + errors.ln_det
        totals.append(np.where(np.isfinite(total), total, np.inf))
    best = np.argmin(totals, axis=0)
    rows = np.flatnonzero(np.min(totals, axis=0) < now.total - GIVE)
    if not rows.size:
        return now
    there = settle(problem.take(rows), kit, np.array(others)[best[rows], rows])
    lower = np.flatnonzero(there.total < now.total[rows])
    return now.put(rows[lower], there.take(lower))


def look_again(
    problem: Problem, kit: Kit, errors: Errors, sigma: FloatArray, looked: Minima, extra: list[FloatArray]
) -> tuple[np.ndarray, Minima]:
    """Rows whose errors have moved since they were looked at with errors `sigma`, and their minima with the new ones.

    After a small move the minima found before are visited again; after a large one the whole range is scanned anew.
    """
    used = problem.detected | problem.limited
    moved = np.where(used, np.abs(np.log(errors.sigma / sigma)), 0.0).max(axis=1, initial=0.0)
    near, far = np.flatnonzero((moved > MOVED) & (moved <= FAR)), np.flatnonzero(moved > FAR)
    found = []
    for rows in (near, far):
        if rows.size:
            some, own = problem.take(rows), errors.take(rows)
            starts = [looked.x[:, rows], *(each[:, rows] for each in extra)]
            if rows is far:
                starts.append(starting_rows(some, kit, own))
            found.append(look(some, kit, own, np.concatenate(starts)))
    rows = np.concatenate([near, far])
    return rows, Minima.joined(found) if found else looked


def starting_rows(problem: Problem, kit: Kit, errors: Errors) -> FloatArray:
    """Temperatures and screens to descend from, (S, M, 8); a second dust temperature is looked for all along."""
    found = scan(problem, kit, errors)
    if len(kit.model.sources) < 2:
        best = np.take_along_axis(found.x, found.gain.argmax(axis=0)[None, :, None], axis=0)
        return np.where(found.hopeful(problem, errors)[:, :, None], found.x, best)
    order = np.argsort(-found.gain, axis=0, kind="stable")[:WITH_SECOND_DUST]
    rows = np.take_along_axis(found.x, order[:, :, None], axis=0)
    out = []
    for ln_t in np.linspace(kit.further[1].low, kit.further[1].high, SECOND_DUST_NODES):
        each = rows.copy()
        each[:, :, X3] = ln_t
        out.append(each)
    return np.concatenate(out)


def settle(problem: Problem, kit: Kit, x: FloatArray) -> Settled:
    """Let errors and parameters follow each other until chi-square rests.

    Where that leads from a likelier pass to a much unlikelier one, as when stars of the temperature found scatter less,
    the likelier pass stands.
    """
    x = x.copy()
    now = Settled(errors_of(problem, x, predict(kit, x)), x, np.full(len(problem), np.inf))
    likeliest = now
    live, before = np.arange(len(problem)), np.full(len(problem), np.inf)
    for _ in range(PASSES):
        some = problem.take(live)
        own = errors_of(some, now.x[live], predict(kit, now.x[live]))
        there = Settled(own, *gone_down(some, kit, own, now.x[live], SETTLE_STEPS, COARSE))
        now = now.put(live, there)
        better = np.flatnonzero(there.total < likeliest.total[live])
        likeliest = likeliest.put(live[better], there.take(better))
        chi2 = chi_square(some, kit, own, there.x, predict(kit, there.x))
        moving = np.abs(chi2 - before[live]) >= SETTLED
        before[live] = chi2
        live = live[moving]
        if not live.size:
            break
    worse = np.flatnonzero(now.total > likeliest.total + GIVE)
    return now.put(worse, likeliest.take(worse)) if worse.size else now


def replace_rows(errors: Errors, rows: np.ndarray, some: Errors) -> Errors:
    """`errors` with those of some candidates put in."""
    sigma, ln_det = errors.sigma.copy(), errors.ln_det.copy()
    sigma[rows], ln_det[rows] = some.sigma, some.ln_det
    if errors.whiten is None:
        return Errors(sigma, None, ln_det)
    whiten, shared = errors.whiten.copy(), errors.shared.copy()
    whiten[rows], shared[rows] = some.whiten, some.shared
    return Errors(sigma, whiten, ln_det, shared)


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
