"""-2 ln L against scipy's distributions, dense covariances and finite differences."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy import stats

from tests.bench.random_stars import TEN, random_problem
from tui.physics import composite as c
from tui.physics.composite import MODELS, kit_for, parallax_of, predict
from tui.physics.likelihood import (
    chi_square,
    curvature,
    errors_for,
    limit_residual,
    minus_2_ln_l,
    parallax_sigma,
    residuals,
    spread_at,
)


@pytest.fixture(scope="module")
def drawn(grids):
    return random_problem(grids, TEN, 60, 7, limits=0.4)


@pytest.fixture(scope="module")
def tied(grids):
    """The same with errors that each instrument's bands share."""
    return random_problem(grids, TEN, 60, 8, limits=0.4, common=0.03)


def pieces(problem, x, model):
    kit = kit_for(model, problem.templates)
    seen = predict(kit, x)
    errors = errors_for(problem, seen.flux, seen.star, x[:, c.LN_T])
    return kit, seen, errors, residuals(problem, kit, errors, x, seen)


def off_the_truth(x, seed=1):
    return x + 0.03 * np.random.default_rng(seed).standard_normal(x.shape) * (np.arange(c.WIDTH) < 2)


def test_errors_are_the_three_terms(drawn):
    problem, x, _ = drawn
    kit, seen, errors, _ = pieces(problem, x, c.DUST_AV)
    spread = spread_at(problem, x[:, c.LN_T])
    for row in range(len(problem)):
        for column, band in enumerate(problem.templates.bands):
            flux = problem.flux_jy[row, column] if problem.detected[row, column] else 0.0
            largest = max(flux, seen.flux[row, column])
            variance = (
                problem.error_jy[row, column] ** 2
                + (band.floor * largest) ** 2
                + (spread[row, column] * seen.star[row, column]) ** 2
            )
            assert errors.sigma[row, column] == pytest.approx(np.sqrt(variance), rel=1e-12)


def test_detections_and_limits_against_scipy(drawn):
    # detections: normal density; limits: the normal distribution's integral (Sawicki 2012, PASP 124, 1208)
    problem, x, _ = drawn
    x = off_the_truth(x)
    kit, seen, errors, state = pieces(problem, x, c.STAR_AV)
    found = minus_2_ln_l(problem, errors, state.cost)
    density = stats.norm.logpdf(problem.flux_jy, seen.flux, errors.sigma)
    held = stats.norm.logcdf(problem.flux_jy, seen.flux, errors.sigma)
    exact = -2 * (np.where(problem.detected, density, 0).sum(axis=1) + np.where(problem.limited, held, 0).sum(axis=1))
    assert problem.limited.any()
    assert found == pytest.approx(exact, rel=1e-9, abs=1e-9)


def test_common_errors_against_a_dense_covariance(tied):
    problem, x, _ = tied
    x = off_the_truth(x)
    kit, seen, errors, state = pieces(problem, x, c.DUST_AV)
    found = minus_2_ln_l(problem, errors, state.cost)
    chi2 = chi_square(problem, kit, errors, x, seen)
    for row in range(len(problem)):
        use = problem.detected[row]
        vectors = problem.common[:, use] * seen.flux[row, use]
        covariance = np.diag(errors.sigma[row, use] ** 2) + vectors.T @ vectors
        normal = stats.multivariate_normal(seen.flux[row, use] * 1e3, covariance * 1e6)
        exact = -2 * (normal.logpdf(problem.flux_jy[row, use] * 1e3) + use.sum() * np.log(1e3))
        limit = problem.limited[row]
        held = stats.norm.logcdf(problem.flux_jy[row, limit], seen.flux[row, limit], errors.sigma[row, limit])
        assert found[row] == pytest.approx(exact - 2 * held.sum(), rel=1e-7, abs=1e-6)
        left = problem.flux_jy[row, use] - seen.flux[row, use]
        over = np.maximum(seen.flux[row, limit] - problem.flux_jy[row, limit], 0) / errors.sigma[row, limit]
        wanted = left @ np.linalg.solve(covariance, left) + np.sum(over**2)
        assert chi2[row] == pytest.approx(wanted, rel=1e-7, abs=1e-9)


def test_limit_residual_against_scipy():
    pull = np.array([-200.0, -40.0, -29.0, -5.0, -1.0, 0.0, 1.0, 3.0, 8.0])
    root, slope = limit_residual(pull)
    assert root**2 == pytest.approx(-2 * stats.norm.logcdf(pull), rel=1e-10)
    step = 1e-5
    difference = (limit_residual(pull + step)[0] - limit_residual(pull - step)[0]) / 2 / step
    assert slope[:-1] == pytest.approx(difference[:-1], rel=2e-3)
    assert abs(slope[-1]) < 1e-6  # far below a limit nothing pulls
    # at the limit itself the model is as likely as not to stay below: -2 ln 1/2
    assert float(limit_residual(np.zeros(1))[0][0] ** 2) == pytest.approx(2 * np.log(2))


@pytest.mark.parametrize("case", ["plain", "common errors"])
@pytest.mark.parametrize("name", MODELS)
def test_derivatives_against_finite_differences(drawn, tied, name, case):
    problem, x, _ = drawn if case == "plain" else tied
    model = MODELS[name]
    x = off_the_truth(x)
    x[:, c.AV] += 0.2
    x[:, c.RV] = 3.3
    low, high = kit_for(model, problem.templates).bounds(problem.av_max)
    for column in (c.X2, c.X3):
        x[:, column] = np.clip(x[:, column], low[:, column] + 0.1, np.maximum(high[:, column] - 0.1, 0.1))
    x[:, c.A2] += 1e-3
    x[:, c.A3] += 1e-3
    kit, _, errors, state = pieces(problem, x, model)
    for place, column in enumerate(model.free):
        step = np.zeros(c.WIDTH)
        step[column] = 1e-6
        ahead, behind = (
            residuals(problem, kit, errors, x + sign * step, predict(kit, x + sign * step)).value for sign in (1, -1)
        )
        slope = (ahead - behind) / 2e-6
        scale = np.abs(slope).max(axis=1, keepdims=True) + 1.0
        assert np.all(np.abs(state.slopes[:, place] - slope) <= 2e-3 * scale), (name, column)


def test_the_parallax_is_one_more_datum_of_a_bound_pair(drawn):
    problem, x, _ = drawn
    kit, seen, errors, state = pieces(problem, x, c.BOUND_PAIR)
    plain = kit_for(c.STAR_AV, problem.templates)
    known = np.isfinite(problem.parallax_mas)
    assert 0 < known.sum() < known.size
    model = parallax_of(kit, x)[0]
    pull = (problem.parallax_mas - model) / parallax_sigma(problem)
    assert state.value[known, -1] == pytest.approx(pull[known], rel=1e-12)
    assert np.all(state.value[~known, -1] == 0)
    assert state.value.shape[1] == residuals(problem, plain, errors, x, predict(plain, x)).value.shape[1] + 1
    # 0.25 mag of real dwarfs about the sequence: 0.25 ln(10)/5 = 0.115 of the distance
    assert parallax_sigma(problem)[known] == pytest.approx(
        np.hypot(problem.parallax_error_mas, 0.25 * np.log(10) / 5 * problem.parallax_mas)[known], rel=2e-3
    )


def test_a_limit_counts_in_chi_square_only_where_it_is_overshot(drawn):
    problem, x, _ = drawn
    kit, seen, errors, _ = pieces(problem, x, c.STAR_AV)
    met = problem.limited & (seen.flux <= problem.flux_jy)
    without = problem.without(met)
    assert met.any()
    assert chi_square(problem, kit, errors, x, seen) == pytest.approx(chi_square(without, kit, errors, x, seen),
        rel=1e-12)


def test_curvature_is_half_the_second_derivative(drawn):
    # where residuals vanish Gauss-Newton is exact
    problem, x, _ = drawn
    some, x = problem.without(problem.limited).take(np.arange(20)), x[:20]
    kit = kit_for(c.STAR_AV, some.templates)
    seen = predict(kit, x)
    errors, some = errors_for(some, seen.flux, seen.star, x[:, c.LN_T]), replace(some, flux_jy=seen.flux)
    found = curvature(residuals(some, kit, errors, x, seen))
    step = 1e-4 * (np.arange(c.WIDTH) == c.LN_T)
    costs = [residuals(some, kit, errors, x + s * step, predict(kit, x + s * step)).cost for s in (1, -1)]
    assert found[:, 0, 0] == pytest.approx(sum(costs) / 2 / 1e-8, rel=2e-2)
