"""The reduced cost against -2 ln L itself, finite differences and amplitudes tried at random."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy import integrate, stats

from tests.bench.random_stars import TEN, random_problem
from tui.physics import composite as c
from tui.physics import separable
from tui.physics.binding import Held
from tui.physics.components import tables_of
from tui.physics.composite import MODELS, kit_for, parallax_of, predict
from tui.physics.likelihood import errors_of, residuals
from tui.physics.rows import rows_of
from tui.physics.separable import FAINT, limit_terms, parameters, reduced

CASES = {"plain": {"limits": 0.0}, "limits": {"limits": 0.5}, "common errors": {"limits": 0.3, "common": 0.03}}
COUNT = 80


@pytest.fixture(scope="module")
def drawn(grids):
    return {name: random_problem(grids, TEN, COUNT, 23, **options)[:2] for name, options in CASES.items()}


class Bench:
    """A model, data and parameters near and far from the truth, in double precision."""

    def __init__(self, problem, x, model, held=None, seed=2):
        rng = np.random.default_rng(seed)
        self.problem, self.kit = problem, kit_for(model, problem.templates)
        self.errors = errors_of(problem, x, predict(self.kit, x))
        self.tables = tables_of(self.kit, np.float64)
        self.rows = rows_of(problem, self.errors, model.bound_pair, np.float64)
        low, high = self.kit.bounds(problem.av_max)
        random = rng.uniform(low, high)
        random[:, c.AV] = 2 * rng.random(COUNT) ** 2
        near = np.arange(COUNT) % 2 == 0
        place = np.where(near[:, None], np.clip(x + 0.02 * rng.standard_normal(x.shape), low, high), random)
        width = np.maximum(high - low, 1e-9)
        place = np.clip(place, low + 1e-3 * width, high - 1e-3 * width)
        self.theta = np.ascontiguousarray(place[:, list(self.tables.columns)].T)
        self.held = held

    def at(self, theta):
        return reduced(self.rows, self.tables, theta, self.held)

    def rows_at(self, found):
        return parameters(self.rows.unit_jy, self.tables, self.theta, found.amplitude, found.ln_top)

    def cost(self, x):
        """-2 ln L less its constant, by the likelihood."""
        return residuals(self.problem, self.kit, self.errors, x, predict(self.kit, x)).cost

    def slope_error(self, found):
        """How far the right side is from minus half the slope of the cost by differences, (R,), over what matters."""
        off = []
        for place in range(self.theta.shape[0]):
            step = 1e-6 * (np.arange(self.theta.shape[0]) == place)[:, None]
            slope = (self.at(self.theta + step).cost - self.at(self.theta - step).cost) / 4e-6
            off.append(np.abs(found.right[place] + slope) / (np.abs(slope) + 1e-3 * found.cost + 1e-2))
        return np.max(off, axis=0)

    def plain(self, found):
        """Rows whose star is not raised to the faintest that a row of parameters may hold."""
        if found.amplitude.shape[0] == 1 or self.kit.model.bound_pair:
            return np.ones(COUNT, bool)
        return found.amplitude[0] > FAINT * found.amplitude[1:].max(axis=0)


def every_case(test):
    return pytest.mark.parametrize("name", MODELS)(pytest.mark.parametrize("case", CASES)(test))


@every_case
def test_the_cost_is_the_likelihoods(drawn, name, case):
    bench = Bench(*drawn[case], MODELS[name])
    found = bench.at(bench.theta)
    x = bench.rows_at(found)
    compared = bench.plain(found)
    assert np.all(x[:, c.A2:] < np.exp(12.99)) and compared.mean() > 0.8
    assert found.cost[compared] == pytest.approx(bench.cost(x)[compared], rel=1e-7, abs=1e-7)


@every_case
def test_the_right_side_is_half_the_downward_slope(drawn, name, case, monkeypatch):
    # Beside limits the amplitudes are not quite at rest after two steps; with many the slopes are exact. Two dusts that
    # no band tells apart count as one: there the slope is off by some 0.001.
    monkeypatch.setattr(separable, "NEWTON", 15)
    bench = Bench(*drawn[case], MODELS[name])
    found = bench.at(bench.theta)
    assert np.mean(bench.slope_error(found) < 1e-3) >= (0.9 if MODELS[name] is c.TWO_DUST else 0.98)


@every_case
def test_two_steps_beside_limits_are_enough_to_go_by(drawn, name, case):
    bench = Bench(*drawn[case], MODELS[name])
    assert np.mean(bench.slope_error(bench.at(bench.theta)) < 1e-2) >= 0.9


@every_case
def test_no_other_amplitudes_are_better(drawn, name, case):
    # amplitudes changed at random by 0.1 to 100 %, and sources that were none put in
    bench = Bench(*drawn[case], MODELS[name])
    found = bench.at(bench.theta)
    best = bench.rows_at(found)
    rng = np.random.default_rng(3)
    low, high = bench.kit.bounds(bench.problem.av_max)
    for size in np.repeat([1e-3, 1e-2, 0.1, 1.0], 10):
        x = best.copy()
        x[:, c.LN_S] += size * rng.standard_normal(COUNT)
        for share in (c.A2, c.A3):
            x[:, share] = x[:, share] * np.exp(size * rng.standard_normal(COUNT)) + size * 1e-3 * rng.random(COUNT)
        lower = found.cost - bench.cost(np.clip(x, low, high))
        assert np.all(lower < 1e-3 + 3e-5 * found.cost)  # what two steps beside a limit leave


def held_at(bench, x, what):
    """Some of a row's values held, the first half of the rows."""
    some = np.arange(COUNT) < COUNT // 2
    sources = [column for column in (c.A2, c.A3) if column in bench.kit.model.free]
    share = np.full((len(sources), COUNT), np.nan)
    if "share" in what:
        share[:, some] = x[some][:, sources].T
    scale = np.where(some & ("scale" in what), x[:, c.LN_S], np.nan)
    return Held(np.zeros(bench.theta.shape, bool), scale, share)


@pytest.mark.parametrize("case", CASES)
@pytest.mark.parametrize("what", [("share",), ("scale",), ("scale", "share")], ids=" and ".join)
@pytest.mark.parametrize("name", ["star + A_V", "star + dust", "star + two dusts, A_V", "free pair", "star + compact",
                                  "star + galaxy"])  # fmt: skip
def test_what_is_held_is_held_exactly_and_the_slopes_know(drawn, name, what, case, monkeypatch):
    monkeypatch.setattr(separable, "NEWTON", 15)
    problem, x = drawn[case]
    bench = Bench(problem, x, MODELS[name])
    x = bench.rows_at(bench.at(bench.theta))
    x[:, c.LN_S] += 0.1
    x[:, c.A2:] = np.where(np.arange(c.WIDTH)[c.A2:] % 2 == c.A2 % 2, 0.8 * x[:, c.A2:] + 1e-4, x[:, c.A2:])
    bench.held = held_at(bench, x, what)
    found = bench.at(bench.theta)
    ended = bench.rows_at(found)
    some = np.isfinite(bench.held.ln_scale)
    assert ended[some, c.LN_S] == pytest.approx(x[some, c.LN_S], abs=1e-9)
    shown = bench.plain(found)
    for own, column in zip(bench.held.share, (c.A2, c.A3), strict=False):
        some = np.isfinite(own) & shown
        assert ended[some, column] == pytest.approx(own[some], rel=1e-9)
    assert found.cost[shown] == pytest.approx(bench.cost(ended)[shown], rel=1e-7, abs=1e-7)
    assert np.mean(bench.slope_error(found) < 1e-3) >= 0.9


def test_a_galaxy_is_never_brighter_than_it_may_be(drawn):
    # A star whose infrared is 100 times too bright: the best galaxy would outshine it by more than is allowed.
    problem, x = drawn["plain"]
    infrared = np.array([band.pivot_um > 3 for band in problem.templates.bands])
    bright = replace(problem, flux_jy=np.where(infrared, 100.0, 1.0) * problem.flux_jy)
    bench = Bench(bright, x, c.GALAXY)
    found = bench.at(bench.theta)
    ended = bench.rows_at(found)
    capped = ended[:, c.A2] > c.A_GALAXY * (1 - 1e-6)
    assert capped.sum() > 10
    assert np.all(ended[:, c.A2] <= c.A_GALAXY * (1 + 1e-9))
    assert found.cost == pytest.approx(bench.cost(ended), rel=1e-7)
    assert np.mean(bench.slope_error(found) < 1e-3) >= 0.95
    # with the galaxy at its most no other scale of the whole is better
    for shift in (-1e-2, -1e-3, 1e-3, 1e-2):
        moved = ended + shift * (np.arange(c.WIDTH) == c.LN_S)
        assert np.all(bench.cost(moved)[capped] >= found.cost[capped] - 1e-6)


def test_a_parallax_draws_the_scale_of_a_pair(drawn):
    # adding a datum can only bring the model nearer to it
    problem, x = drawn["plain"]
    known = np.isfinite(problem.parallax_mas)
    blind = replace(problem, parallax_mas=np.full(COUNT, np.nan))
    benches = [Bench(each, x, c.BOUND_PAIR) for each in (problem, blind)]
    rows = [bench.rows_at(bench.at(bench.theta)) for bench in benches]
    off = [np.abs(parallax_of(kit_for(c.BOUND_PAIR, problem.templates), row)[0] - problem.parallax_mas) for row in rows]
    assert np.array_equal(rows[0][~known], rows[1][~known])
    assert np.all(off[0][known] <= off[1][known] * (1 + 1e-9))
    assert np.mean(off[0][known] < 0.999 * off[1][known]) > 0.5  # elsewhere the fluxes alone say the scale


DEEP = np.array([-1e12, -1e6, -3e3, -200.0, -40.0, -16.0, -15.01, -15.0, -14.99, -8.0, -3.0, -0.5, 0.0, 0.7, 4.0, 12.0])


def test_limits_against_scipy_and_an_integral():
    # -2 ln Phi(z): scipy.stats. phi/Phi: with a = -z, phi(a)/Q(a) = a / int exp(-u - u^2/(2 a^2)) du, u from 0.
    value, mills = limit_terms(DEEP)
    series = np.where(DEEP < -15, 5.0 / np.minimum(DEEP, -15) ** 4, 0.0)  # the first term that is left out there
    assert np.all(np.abs(value + 2 * stats.norm.logcdf(DEEP)) <= series + 1e-9 * value + 1e-12)
    for z, ratio in zip(DEEP[DEEP < -1], mills[DEEP < -1], strict=True):
        tail = integrate.quad(lambda u, a=-z: np.exp(-u - 0.5 * (u / a) ** 2), 0, np.inf, epsabs=1e-13, epsrel=1e-12)[0]
        assert ratio == pytest.approx(-z / tail, rel=1e-5)
    near = DEEP[DEEP > -14]
    assert mills[DEEP > -14] == pytest.approx(stats.norm.pdf(near) / stats.norm.cdf(near), rel=1e-9)


def test_a_limit_missed_beyond_all_numbers_stays_finite():
    value, mills = limit_terms(np.array([-1e30, -np.inf, np.inf]))
    assert np.all(np.isfinite(value)) and np.all(np.isfinite(mills))
    assert value[2] == 0 and mills[2] == 0
