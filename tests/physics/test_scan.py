"""Where descents start: the scan's fall of chi-square against Lawson & Hanson's least squares, and its reach."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.optimize import nnls

from tests.bench.random_stars import TEN, random_problem
from tui.physics import composite as c
from tui.physics.composite import kit_for, predict
from tui.physics.fitting import first_errors
from tui.physics.looking import gone_down, look
from tui.physics.scan import scan

TWO = (c.DUST, c.DUST_AV, c.FREE_PAIR, c.COMPACT, c.GALAXY)


@pytest.fixture(scope="module")
def drawn(grids):
    return random_problem(grids, TEN, 60, 13, limits=0.0)


@pytest.mark.parametrize("model", TWO, ids=lambda model: model.name)
def test_the_fall_of_chi_square_against_scipy_nnls(drawn, model):
    # At the scan's own temperatures and screens no non-negative pair of scales does better: scipy.optimize.nnls.
    problem, _, _ = drawn
    problem = problem.without(problem.limited)
    kit, errors = kit_for(model, problem.templates), first_errors(problem)
    starts = scan(problem, kit, errors)
    for number in (0, 5):
        for m in range(0, len(problem), 3):
            row = np.repeat(starts.x[number, m : m + 1], 2, axis=0)
            row[:, c.LN_S], row[:, c.A2] = -45.0, (0.0, 1.0)
            star, both = predict(kit, row).flux
            use = problem.detected[m]
            sigma = errors.sigma[m, use]
            columns = np.stack([star, both - star], axis=1)[use] / sigma[:, None]
            target = problem.flux_jy[m, use] / sigma
            left = nnls(columns / np.linalg.norm(columns, axis=0), target)[1] ** 2
            assert np.sum(target**2) - starts.gain[number, m] == pytest.approx(left, rel=2e-2, abs=0.5)


@pytest.mark.parametrize("model", [c.STAR, c.STAR_AV, c.STAR_AV_RV, *TWO, c.BOUND_PAIR], ids=lambda model: model.name)
def test_starts_are_finite_and_physical(drawn, model):
    problem, _, _ = drawn
    kit, errors = kit_for(model, problem.templates), first_errors(problem)
    starts = scan(problem, kit, errors)
    low, high = kit.bounds(problem.av_max)
    assert starts.x.shape[1:] == (len(problem), c.WIDTH) and starts.gain.shape == starts.x.shape[:2]
    assert np.all(np.isfinite(starts.x)) and np.all(np.isfinite(starts.gain))
    assert np.all((starts.x[..., c.LN_T] >= low[:, c.LN_T]) & (starts.x[..., c.LN_T] <= high[:, c.LN_T]))
    assert np.all(starts.x[..., c.AV] >= 0)


def test_a_noiseless_star_is_found_from_the_scan_alone(drawn):
    problem, x, _ = drawn
    kit = kit_for(c.STAR_AV, problem.templates)
    exact = replace(problem, flux_jy=predict(kit, x).flux, detected=np.ones_like(problem.detected),
        limited=problem.limited & False)  # fmt: skip
    errors = first_errors(exact)
    minima = look(exact, kit, errors, scan(exact, kit, errors).x)
    lowest = gone_down(exact, kit, errors, minima.x[0], 20, 1e-5)[1]
    assert np.mean(lowest < 0.01) >= 0.98  # cost 0 is there to be found


def test_limits_push_the_start_down(drawn):
    # Beside a hopeless limit in W4 the best place by the scan must not be the one that fills it.
    problem, _, _ = drawn
    kit, errors = kit_for(c.DUST, problem.templates), first_errors(problem)
    limited = np.zeros_like(problem.detected)
    limited[:, -1] = True
    tight = replace(problem, detected=problem.detected & ~limited, limited=limited, flux_jy=0.5 * problem.flux_jy)
    free, held = scan(problem.without(limited), kit, errors), scan(tight, kit, errors)
    assert np.all(held.gain.max(axis=0) <= free.gain.max(axis=0) * (1 + 1e-5) + 0.1)
    lowest = [look(one, kit, errors, each.x).cost[0] for one, each in ((tight, held), (tight, free))]
    assert np.mean(lowest[0] <= lowest[1] + 0.1) >= 0.95  # starts that know the limit serve as well as those that do not
