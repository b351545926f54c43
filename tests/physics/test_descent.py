"""The descent against scipy's trust-region least squares from the same starts."""

from __future__ import annotations

import numpy as np
import pytest

from tests.bench.optimisers import OneCandidate, random_starts
from tests.bench.random_stars import TEN, random_problem
from tui.physics import composite as c
from tui.physics.composite import MODELS, kit_for, predict
from tui.physics.descent import curvature, descend
from tui.physics.fitting import finish
from tui.physics.likelihood import errors_for, residuals


@pytest.fixture(scope="module")
def drawn(grids):
    return random_problem(grids, TEN, 120, 11)


def at_truth(problem, x, model):
    kit = kit_for(model, problem.templates)
    seen = predict(kit, x)
    return kit, errors_for(problem, seen.flux, seen.star, x[:, c.LN_T])


@pytest.mark.parametrize("number", range(8))
def test_from_near_the_truth_nothing_lower_is_found(drawn, number):
    # scipy.optimize.least_squares (trf, analytic derivatives) from the same start; natures of the drawn candidates
    problem, x, nature = drawn
    rows = np.flatnonzero(nature == number)[:6]
    model = [c.STAR, c.STAR_AV, c.DUST_AV, c.TWO_DUST, c.FREE_PAIR, c.BOUND_PAIR, c.COMPACT, c.GALAXY][number]
    some = problem.take(rows)
    kit, errors = at_truth(some, x[rows], model)
    start = x[rows] + 0.05 * np.random.default_rng(1).standard_normal((rows.size, 1)) * (np.arange(c.WIDTH) < 2)
    found = descend(some, kit, errors, start)
    batch = finish(some, kit, errors, start)
    outside = np.array([OneCandidate(batch, row).least_squares([start[row]]) for row in range(rows.size)])
    assert np.sum(found.cost > outside + 0.1) <= 1  # a hot companion has two minima side by side
    assert np.median(np.abs(found.cost - outside)) < 0.01


def test_from_anywhere_it_ends_no_higher_than_scipy_does(drawn):
    # From random starts both may rest in some other minimum; neither should do so more often.
    problem, x, _ = drawn
    kit, errors = at_truth(problem, x, c.DUST_AV)
    start = random_starts(np.random.default_rng(3), problem, kit, 1)[0]
    found = descend(problem, kit, errors, start)
    batch = finish(problem, kit, errors, start)
    rows = range(30)
    outside = np.array([OneCandidate(batch, row).least_squares([start[row]]) for row in rows])
    lower, higher = np.mean(found.cost[:30] < outside - 0.1), np.mean(found.cost[:30] > outside + 0.1)
    assert higher <= lower + 0.2


@pytest.mark.parametrize("name", MODELS)
def test_bounds_are_kept_and_the_cost_never_rises(drawn, name):
    problem, x, _ = drawn
    kit, errors = at_truth(problem, x, MODELS[name])
    low, high = kit.bounds(problem.av_max)
    start = np.clip(random_starts(np.random.default_rng(4), problem, kit, 1)[0], low, high)
    before = residuals(problem, kit, errors, start, predict(kit, start)).cost
    found = descend(problem, kit, errors, start)
    free = list(kit.model.free)
    assert np.all((found.x >= low - 1e-12)[:, free] & (found.x <= high + 1e-12)[:, free])
    assert np.all(found.cost <= before + 1e-9)
    again = residuals(problem, kit, errors, found.x, predict(kit, found.x)).cost
    assert found.cost == pytest.approx(again, rel=1e-9)


def test_held_parameters_stay_and_the_rest_is_best(drawn):
    # T_eff held and no limits: the scale is linear, theta^2 = sum(w F m) / sum(w m^2), in closed form
    problem, x, _ = drawn
    plain = problem.without(problem.limited)
    kit, errors = at_truth(plain, x, c.STAR)
    held = np.zeros(x.shape, bool)
    held[:, c.LN_T] = True
    start = x + 0.5 * (np.arange(c.WIDTH) == c.LN_S)
    found = descend(plain, kit, errors, start, held=held)
    assert np.array_equal(found.x[:, c.LN_T], x[:, c.LN_T])
    unit = predict(kit, np.where(np.arange(c.WIDTH) == c.LN_S, -45.0, x)).flux
    weight = np.where(plain.detected, errors.sigma**-2.0, 0.0)
    scale = np.sum(weight * plain.flux_jy * unit, axis=1) / np.sum(weight * unit**2, axis=1)
    assert found.x[:, c.LN_S] + 45.0 == pytest.approx(np.log(scale), abs=2e-3)
    exact = np.sum(weight * (plain.flux_jy - scale[:, None] * unit) ** 2, axis=1)
    assert found.cost == pytest.approx(exact, abs=1e-3)


def test_curvature_is_half_the_second_derivative(drawn):
    # where residuals vanish Gauss-Newton is exact
    problem, x, _ = drawn
    some = problem.without(problem.limited).take(np.arange(20))
    kit, errors = at_truth(some, x[:20], c.STAR_AV)
    exact = predict(kit, x[:20]).flux
    from dataclasses import replace

    some = replace(some, flux_jy=exact)
    found = curvature(residuals(some, kit, errors, x[:20], predict(kit, x[:20])))
    step = 1e-4 * (np.arange(c.WIDTH) == c.LN_T)
    costs = [residuals(some, kit, errors, x[:20] + s * step, predict(kit, x[:20] + s * step)).cost for s in (1, -1)]
    assert found[:, 0, 0] == pytest.approx(sum(costs) / 2 / 1e-8, rel=2e-2)
