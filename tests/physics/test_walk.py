"""The walk down the reduced cost against scipy's trust-region least squares from the same starts."""

from __future__ import annotations

import numpy as np
import pytest

from tests.bench.descents import descend
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
from tui.physics.walk import Walked, walk

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


# Share of walks from random starts that end within 0.02 of where another way of descent goes on to. The valley of a
# bound pair, whose brightness follows both temperatures, is curved: 80 steps are too few for one in seven.
AT_REST = {
    "star + A_V": 0.98, "star + dust, A_V": 0.95, "star + two dusts, A_V": 0.95, "free pair": 0.95,
    "star + compact": 0.95, "star + galaxy": 0.95, "bound pair": 0.80,
}  # fmt: skip


@pytest.mark.parametrize("name", AT_REST)
def test_where_it_rests_another_way_of_descent_finds_next_to_nothing(drawn, name):
    # Levenberg-Marquardt in all parameters, amplitudes among them; two dusts of one temperature once stopped the walk
    problem, x, _ = drawn
    kit, errors, tables, rows, theta, bounds = begun(problem, x, MODELS[name], 5)
    at = walk(rows, tables, theta, bounds, 80, 1e-6)
    ended = parameters(rows.unit_jy, tables, at.theta, at.amplitude, at.ln_top)
    fall = at.cost - descend(problem, kit, errors, ended).cost
    assert np.mean(fall < 0.02) >= AT_REST[name]
    assert np.median(fall) < 1e-4


def test_from_anywhere_it_ends_as_low_as_scipy_does(drawn):
    # From random starts, their amplitudes the best for them, either may rest in some other minimum; scipy does so twice
    # as often.
    problem, x, _ = drawn
    some, walked, outside = problem.take(np.arange(25)), [], []
    for name in ("star", "star + A_V", "star + dust, A_V", "free pair", "star + compact"):
        kit, errors, tables, rows, theta, bounds = begun(some, x[:25], MODELS[name], 3)
        first = reduced(rows, tables, theta)
        start = parameters(rows.unit_jy, tables, theta, first.amplitude, first.ln_top)
        walked.append(walk(rows, tables, theta, bounds, 80, 1e-6).cost)
        batch = finish(some, kit, errors, start)
        outside.append([OneCandidate(batch, row).least_squares([start[row]]) for row in range(25)])
    walked, outside = np.concatenate(walked), np.concatenate(outside)
    lower, higher = np.mean(walked < outside - 0.1), np.mean(walked > outside + 0.1)
    assert higher <= lower


def test_a_walk_of_no_steps_stays(drawn):
    problem, x, _ = drawn
    _, _, tables, rows, theta, bounds = begun(problem, x, c.STAR_AV, 6)
    at = walk(rows, tables, theta, bounds, 0, 1e-5)
    assert np.array_equal(at.theta, theta)
    assert at.cost == pytest.approx(reduced(rows, tables, theta).cost, rel=1e-12)


def test_rows_do_not_feel_their_company(drawn):
    problem, x, _ = drawn
    _, _, tables, rows, theta, (low, high) = begun(problem, x, c.DUST_AV, 7)
    whole = walk(rows, tables, theta, (low, high), 12, 1e-4)
    for row in (3, 50, 119):
        some = np.array([row])
        alone = walk(take(rows, some), tables, theta[:, some], (low[:, some], high[:, some]), 12, 1e-4)
        assert alone.theta[:, 0] == pytest.approx(whole.theta[:, row], abs=1e-6)
        assert alone.cost[0] == pytest.approx(whole.cost[row], rel=1e-9, abs=1e-6)
    joined = Walked.joined([whole.take(np.arange(50)), whole.take(np.arange(50, 120))])
    assert np.array_equal(joined.theta, whole.theta) and np.array_equal(joined.amplitude, whole.amplitude)
