"""Fits against many random starts, scipy, simulation and each other."""

from __future__ import annotations

from dataclasses import replace
from itertools import cycle

import numpy as np
import pytest
from scipy import stats

from tests.bench.descents import descend
from tests.bench.optimisers import OneCandidate, random_starts
from tests.bench.random_stars import FOURTEEN, TEN, random_problem
from tui.physics import composite as c
from tui.physics import fitting
from tui.physics.composite import MODELS, kit_for, predict
from tui.physics.fitting import first_errors, fit, settle, starting_rows
from tui.physics.likelihood import errors_of
from tui.physics.looking import KEPT, Minima, look
from tui.physics.statistics import chi2_tail

# Share of fits of any model to candidates of any nature where no random start ends lower by more than 0.1, errors
# frozen at the last pass: what 600 candidates gave, less a margin of one sigma of 300. The aim is 0.995 for all. Errors
# follow the model, so most of what is missed (5 in 6, two dusts apart) is unlikelier once its own errors have followed
# it; LIKELIER is what remains. A second dust is looked for from the best six starts of one dust only.
REACHED = {
    "star": 0.99, "star + A_V": 0.975, "star + A_V, R_V": 0.97, "star + dust": 0.99, "star + dust, A_V": 0.975,
    "star + two dusts, A_V": 0.94, "bound pair": 0.97, "free pair": 0.975, "star + compact": 0.955,
    "star + galaxy": 0.98,
}  # fmt: skip
LIKELIER = 0.005  # share of all fits but those of two dusts that a random start beats by 0.1 with its own errors too
STARTS = 10


@pytest.fixture(scope="module")
def drawn(grids):
    """Candidates of all natures, limits among them."""
    return random_problem(grids, TEN, 300, 5)


@pytest.fixture(scope="module")
def batches(drawn):
    problem, _, _ = drawn
    star = fit(problem, c.STAR)
    return {name: fit(problem, MODELS[name], start=star.x) for name in REACHED}


@pytest.fixture(scope="module")
def lowest(batches):
    """Where the best of many random starts ends, errors frozen as the fit left them: rows (M, 8) and costs (M,)."""
    found = {}
    for name, batch in batches.items():
        starts = random_starts(np.random.default_rng(9), batch.problem, batch.kit, STARTS)
        ends = [descend(batch.problem, batch.kit, batch.errors, row) for row in starts]
        cost = np.array([end.cost for end in ends])
        where = cost.argmin(axis=0), np.arange(cost.shape[1])
        found[name] = np.array([end.x for end in ends])[where], cost[where]
    return found


@pytest.fixture(scope="module")
def beaten(batches, lowest):
    """Of each model the candidates for which that is lower by more than 0.1, and where it is."""
    rows = {name: np.flatnonzero(lowest[name][1] < batch.cost - 0.1) for name, batch in batches.items()}
    return {name: (some, lowest[name][0][some]) for name, some in rows.items()}


@pytest.mark.parametrize("name", REACHED)
def test_many_random_starts_find_little_that_is_lower(batches, lowest, name):
    fall = batches[name].cost - lowest[name][1]
    assert np.median(np.maximum(fall, 0)) < 1e-3
    assert np.mean(fall <= 0.1) >= REACHED[name]


def test_scipy_from_many_starts_finds_nothing_lower(batches):
    # scipy.optimize.least_squares from 4 random starts, 4 candidates of every model: 160 fits
    lower = []
    for name, batch in batches.items():
        starts = random_starts(np.random.default_rng(10), batch.problem, batch.kit, 4)
        for row in range(4):
            lower.append((batch.cost[row] - OneCandidate(batch, row).least_squares(starts[:, row]), name, row))
    assert sum(fall > 0.1 for fall, *_ in lower) <= 1, [entry for entry in lower if entry[0] > 0.1]


@pytest.mark.parametrize(
    ("inner", "outer"),
    [("star", "star + A_V"), ("star + A_V", "star + A_V, R_V"), ("star", "star + dust"), ("star + A_V", "free pair"),
     ("star + A_V", "star + dust, A_V"), ("star + A_V", "star + compact"), ("star + A_V", "star + galaxy")],
)  # fmt: skip
def test_a_wider_model_does_not_fit_worse(batches, inner, outer):
    # With the errors of the narrow fit the wide model can repeat it; its own errors move chi-square a little.
    small, large = batches[inner], batches[outer]
    repeated = large.cost - descend(large.problem, large.kit, large.errors, large_start(small, large)).cost
    assert np.mean(repeated <= 0.1) >= 0.93


def large_start(small, large):
    x = small.x.copy()
    x[:, c.RV] = 3.1
    if large.model.sources:
        x[:, c.X2] = np.clip(large.x[:, c.X2], large.kit.further[0].low, large.kit.further[0].high)
        x[:, c.A2] = 0.0
    return x


def test_noiseless_candidates_return_their_truth(drawn, grids):
    problem, x, nature = random_problem(grids, FOURTEEN, 80, 17, natures=(c.STAR, c.DUST, c.STAR_AV), limits=0.0)
    for number, model in enumerate((c.STAR, c.DUST, c.STAR_AV)):
        rows = np.flatnonzero(nature == number)
        exact = problem.take(rows)
        seen = predict(fit(exact, model).kit, x[rows]).flux
        exact = replace(exact, flux_jy=seen, detected=np.ones(seen.shape, bool), limited=np.zeros(seen.shape, bool))
        batch = fit(exact, model)
        assert batch.chi2.max() < 0.15  # faint dust in W3 and W4 alone has a long flat valley; a descent may rest in it
        assert np.quantile(batch.chi2, 0.8) < 0.005
        near = np.abs(batch.x[:, c.LN_T] - x[rows, c.LN_T])
        assert np.quantile(near, 0.9) < 0.01


def test_errors_have_settled(batches):
    # The errors used are those that the model found asks for: chi-square moves by less than 0.1 in one more pass, or
    # the star's temperature sits on a step of the spread table.
    for batch in batches.values():
        again = errors_of(batch.problem, batch.x, batch.prediction)
        moved = np.abs(again.sigma / batch.errors.sigma - 1).max(axis=1)
        assert np.mean(moved < 0.1) > 0.9
        assert np.median(moved) < 0.01


def simulated(grids, model, count, seed, names=FOURTEEN):
    """Candidates that the model and its errors really made, no limits: (problem, truth)."""
    return random_problem(grids, names, count, seed, natures=(model,), limits=0.0)[:2]


@pytest.mark.parametrize(("model", "seed"), [(c.STAR, 41), (c.DUST, 42), (c.STAR_AV, 43)], ids=["star", "dust", "A_V"])
def test_p_is_uniform_for_true_models(grids, model, seed):
    # 400 candidates that the model made, away from bounds: Kolmogorov-Smirnov against the uniform distribution
    problem, _ = simulated(grids, model, 400, seed)
    batch = fit(problem, model)
    dof = problem.points - (~batch.at_bounds()).sum(axis=1)
    inside = ~batch.at_bounds().any(axis=1)
    p = chi2_tail(batch.chi2, dof)[inside]
    assert stats.kstest(p, "uniform").pvalue > 1e-3
    for level in (0.01, 0.1, 0.5):
        rate, error = np.mean(p < level), np.sqrt(level * (1 - level) / p.size)
        assert abs(rate - level) < 4 * error + 0.25 * level  # floors follow the fluxes, which bends p by a little


def test_p_is_uniform_with_correlated_floors(grids):
    problem, _, _ = random_problem(grids, FOURTEEN, 300, 44, natures=(c.STAR,), limits=0.0, common=0.03)
    batch = fit(problem, c.STAR)
    p = chi2_tail(batch.chi2, problem.points - 2)
    assert stats.kstest(p, "uniform").pvalue > 1e-3
    plain = fit(replace(problem, common=problem.common[:0]), c.STAR)
    # what ignoring them would cost
    assert np.mean(chi2_tail(plain.chi2, problem.points - 2) < 0.01) > np.mean(p < 0.01)


@pytest.mark.parametrize("name", ["star", "star + dust, A_V", "free pair", "star + compact"])
def test_a_candidate_fits_alike_alone_and_in_company(drawn, batches, name):
    # Alone all goes in two heats instead of five, which costs less and finds another minimum for some 2 %: as often a
    # lower one as a higher. Of bound pairs it is 10 %, most of them hopeless.
    problem, _, _ = drawn
    whole, star = batches[name], batches["star"]
    off = []
    for row in range(0, 120, 4):
        some = np.array([row])
        alone = fit(problem.take(some), MODELS[name], start=star.x[some])
        off.append(alone.minus2lnl[0] - whole.minus2lnl[row])
    assert np.mean(np.abs(off) <= 0.1) >= 0.9
    assert np.median(np.abs(off)) < 1e-3


@pytest.mark.parametrize("first", [0, 1])
def test_of_minima_that_take_turns_the_likelier_stands(drawn, monkeypatch, first):
    # Each is made to seem the lowest with the other's errors time after time: whichever comes last, the likelier stays.
    problem, _, _ = drawn
    kit = kit_for(c.STAR_AV, problem.templates)
    errors = first_errors(problem)
    looked = look(problem, kit, errors, starting_rows(problem, kit, errors))
    ends = [settle(problem, kit, looked.x[number]) for number in (0, 1)]
    gap = ends[1].total - ends[0].total
    again = [settle(problem, kit, end.x).total - end.total for end in ends]  # some rest only after more passes
    rows = np.flatnonzero((np.abs(gap) > 0.1) & (np.abs(gap) < 1.5) & (np.abs(again) < 0.02).all(axis=0))
    assert rows.size >= 5
    turns = cycle([1 - first, first])

    def in_turn(problem, kit, errors, sigma, looked, extra):
        one = ends[next(turns)].take(rows)
        return np.arange(rows.size), Minima(np.tile(one.x, (KEPT, 1, 1)), np.full((KEPT, rows.size), -np.inf))

    monkeypatch.setattr(fitting, "look_again", in_turn)
    batch = fit(problem.take(rows), c.STAR_AV)
    total = batch.cost + batch.errors.ln_det
    assert np.all(total <= np.minimum(ends[0].total, ends[1].total)[rows] + 0.05)


def test_what_random_starts_find_lower_is_seldom_likelier_with_its_own_errors(beaten, batches):
    likelier = {}
    for name, (rows, x) in beaten.items():
        batch = batches[name]
        there = settle(batch.problem.take(rows), batch.kit, x).total if rows.size else np.zeros(0)
        likelier[name] = np.sum(there < (batch.cost + batch.errors.ln_det)[rows] - 0.1)
    fits = [len(batch.problem) for name, batch in batches.items() if name != c.TWO_DUST.name]
    assert sum(count for name, count in likelier.items() if name != c.TWO_DUST.name) <= LIKELIER * sum(fits)
    assert likelier[c.TWO_DUST.name] <= 0.06 * len(batches[c.TWO_DUST.name].problem)


def test_scaling_all_fluxes_changes_nothing_but_the_scale(drawn):
    problem, _, _ = drawn
    bright = replace(problem, flux_jy=1e6 * problem.flux_jy, error_jy=1e6 * problem.error_jy)
    faint, loud = fit(problem, c.STAR_AV), fit(bright, c.STAR_AV)
    assert np.mean(np.abs(faint.chi2 - loud.chi2) < 0.05) >= 0.98
    same = np.abs(faint.chi2 - loud.chi2) < 0.05
    assert (loud.x - faint.x)[same, c.LN_S] == pytest.approx(np.log(1e6), abs=0.05)


def test_degenerate_candidates_do_no_harm(drawn):
    problem, _, _ = drawn
    few = problem.take(np.arange(4))
    keep = np.zeros_like(few.detected)
    keep[0, 0] = keep[1, :2] = keep[2, 3:6] = True  # one, two, three bands, and none
    few = replace(few, detected=few.detected & keep, limited=few.limited & False)
    few = replace(few, flux_jy=np.where(np.arange(4)[:, None] == 2, -np.abs(few.flux_jy), few.flux_jy))
    for model in MODELS.values():
        batch = fit(few, model)
        assert np.all(np.isfinite(batch.x)) and np.all(np.isfinite(batch.chi2)), model.name


def test_first_errors_need_no_model(drawn):
    problem, _, _ = drawn
    errors = first_errors(problem)
    assert np.all(errors.sigma > 0) and np.all(np.isfinite(errors.ln_det))


def test_pulls_are_what_reviewers_read(batches):
    batch = batches["star"]
    pulls, problem = batch.pulls, batch.problem
    assert np.array_equal(np.isnan(pulls), ~(problem.detected | problem.limited))
    assert np.nanmax(np.where(problem.limited, pulls, -np.inf)) <= 0  # a limit that is met pulls nothing
    total = np.nansum(pulls**2, axis=1)
    assert total == pytest.approx(batch.chi2, rel=1e-9)
