"""The walk down the reduced cost against scipy's trust-region least squares from the same starts."""

from __future__ import annotations

import numpy as np
import pytest

from tests.bench.optimisers import OneCandidate, random_starts
from tests.bench.random_stars import TEN, random_problem
from tui.physics import composite as c
from tui.physics.components import tables_of
from tui.physics.composite import MODELS, kit_for, predict
from tui.physics.fitting import finish
from tui.physics.likelihood import errors_of
from tui.physics.looking import gone_down
from tui.physics.rows import rows_of, take
from tui.physics.separable import parameters, reduced
from tui.physics.walk import walk

NATURES = (c.STAR, c.STAR_AV, c.DUST_AV, c.TWO_DUST, c.FREE_PAIR, c.BOUND_PAIR, c.COMPACT, c.GALAXY)


@pytest.fixture(scope="module")
def drawn(grids):
    return random_problem(grids, TEN, 120, 11)


def at_truth(problem, x, model):
    kit = kit_for(model, problem.templates)
    return kit, errors_of(problem, x, predict(kit, x))


def begun(problem, x, model, seed, dtype=np.float64):
    """Tables, rows, random starts (P, M) and bounds of a model."""
    kit, errors = at_truth(problem, x, model)
    tables = tables_of(kit, dtype)
    columns = list(tables.columns)
    low, high = (np.ascontiguousarray(edge[:, columns].T, dtype) for edge in kit.bounds(problem.av_max))
    start = random_starts(np.random.default_rng(seed), problem, kit, 1)[0]
    theta = np.clip(np.ascontiguousarray(start[:, columns].T, dtype), low, high)
    return kit, errors, tables, rows_of(problem, errors, model.bound_pair, dtype), theta, (low, high)


@pytest.mark.parametrize("number", range(len(NATURES)), ids=[model.name for model in NATURES])
def test_from_near_the_truth_nothing_lower_is_found(drawn, number):
    # scipy.optimize.least_squares (trf, analytic derivatives) from the same start; natures of the drawn candidates
    problem, x, nature = drawn
    rows = np.flatnonzero(nature == number)[:6]
    some = problem.take(rows)
    kit, errors = at_truth(some, x[rows], NATURES[number])
    start = x[rows] + 0.05 * np.random.default_rng(1).standard_normal((rows.size, 1)) * (np.arange(c.WIDTH) < 2)
    found = gone_down(some, kit, errors, start, 40, 1e-5)[1]
    batch = finish(some, kit, errors, start)
    outside = np.array([OneCandidate(batch, row).least_squares([start[row]]) for row in range(rows.size)])
    assert np.sum(found > outside + 0.1) <= 1  # two minima may lie side by side
    assert np.median(np.abs(found - outside)) < 0.01


@pytest.mark.parametrize("name", MODELS)
@pytest.mark.parametrize("dtype", [np.float64, np.float32])
def test_bounds_are_kept_and_the_cost_never_rises(drawn, name, dtype):
    problem, x, _ = drawn
    _, _, tables, rows, theta, (low, high) = begun(problem, x, MODELS[name], 4, dtype)
    with np.errstate(over="ignore", invalid="ignore", under="ignore"):
        before = reduced(rows, tables, theta).cost
    at = walk(rows, tables, theta, (low, high), 30, 1e-5)
    assert np.all((at.theta >= low) & (at.theta <= high))
    assert np.all(at.cost <= before)
    with np.errstate(over="ignore", invalid="ignore", under="ignore"):
        again = reduced(rows, tables, at.theta)
    assert at.cost == pytest.approx(again.cost, rel=1e-9 if dtype is np.float64 else 1e-4, abs=1e-4)
    assert at.amplitude == pytest.approx(again.amplitude, rel=1e-3, abs=1e-4)
