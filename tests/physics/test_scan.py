"""Where descents start: scales against Lawson & Hanson's non-negative least squares, and reach."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import nnls

from tests.bench.random_stars import TEN, random_problem
from tui.physics import composite as c
from tui.physics.composite import kit_for, predict
from tui.physics.descent import descend
from tui.physics.fitting import first_errors
from tui.physics.likelihood import residuals
from tui.physics.scan import scan

TWO = (c.DUST, c.DUST_AV, c.FREE_PAIR, c.COMPACT, c.GALAXY)


@pytest.fixture(scope="module")
def drawn(grids):
    return random_problem(grids, TEN, 60, 13, limits=0.0)


@pytest.mark.parametrize("model", TWO, ids=lambda model: model.name)
def test_scales_against_scipy_nnls(drawn, model):
    # At the scan's own temperatures and screen no non-negative pair of scales does better: scipy.optimize.nnls.
    problem, _, _ = drawn
    problem = problem.without(problem.limited)
    kit, errors = kit_for(model, problem.templates), first_errors(problem)
    row = scan(problem, kit, errors)[0]
    found = residuals(problem, kit, errors, row, predict(kit, row)).cost
    for m in range(len(problem)):
        first = row[m : m + 1].copy()
        first[0, c.A2] = 0.0
        both = row[m : m + 1].copy()
        both[0, c.A2] = 1.0
        star = predict(kit, first).flux[0]
        columns = np.stack([star, predict(kit, both).flux[0] - star], axis=1)
        use = problem.detected[m]
        sigma = errors.sigma[m, use]
        size = np.linalg.norm(columns[use] / sigma[:, None], axis=0)
        best = nnls(columns[use] / sigma[:, None] / size, problem.flux_jy[m, use] / sigma)[1] ** 2
        # scans work in single precision and keep a whisker of both sources: a start, not a fit
        assert found[m] == pytest.approx(best, rel=2e-2, abs=0.5)


@pytest.mark.parametrize("model", [c.STAR, c.STAR_AV, c.STAR_AV_RV, *TWO, c.BOUND_PAIR], ids=lambda model: model.name)
def test_starts_are_finite_and_physical(drawn, model):
    problem, _, _ = drawn
    kit, errors = kit_for(model, problem.templates), first_errors(problem)
    starts = scan(problem, kit, errors)
    low, high = kit.bounds(problem.av_max)
    assert starts.shape[1:] == (len(problem), c.WIDTH)
    assert np.all(np.isfinite(starts))
    assert np.all((starts[..., c.LN_T] >= low[:, c.LN_T]) & (starts[..., c.LN_T] <= high[:, c.LN_T]))
    assert np.all(starts[..., c.AV] >= 0) and np.all(starts[..., c.A2] >= 0)


def test_a_noiseless_star_is_found_from_the_scan_alone(drawn):
    from dataclasses import replace

    problem, x, _ = drawn
    kit = kit_for(c.STAR_AV, problem.templates)
    exact = replace(problem, flux_jy=predict(kit, x).flux, detected=np.ones_like(problem.detected),
        limited=problem.limited & False)
    errors = first_errors(exact)
    starts = scan(exact, kit, errors)
    lowest = np.min([descend(exact, kit, errors, row).cost for row in starts], axis=0)
    assert np.mean(lowest < 0.01) >= 0.98  # cost 0 is there to be found


def test_limits_push_the_start_down(drawn):
    # Beside a hopeless limit in W4 the start's dust must not fill it.
    from dataclasses import replace

    problem, _, _ = drawn
    kit, errors = kit_for(c.DUST, problem.templates), first_errors(problem)
    limited = np.zeros_like(problem.detected)
    limited[:, -1] = True
    tight = replace(problem, detected=problem.detected & ~limited, limited=limited)
    free = scan(problem.without(limited), kit, errors)[0]
    held = scan(tight, kit, errors)[0]
    over = [np.maximum(predict(kit, row).flux[:, -1] / problem.flux_jy[:, -1] - 1, 0) for row in (free, held)]
    assert np.median(over[1]) <= np.median(over[0]) + 1e-9
    assert np.quantile(over[1], 0.9) < np.quantile(over[0], 0.9) + 0.05
