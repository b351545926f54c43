"""Looks from many starts: what is kept, that nobody is lost, and descents in which some parameters stay."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tests.bench.descents import descend
from tests.bench.random_stars import TEN, random_problem
from tui.physics import composite as c
from tui.physics import looking
from tui.physics.composite import MODELS, kit_for, predict
from tui.physics.fitting import first_errors, starting_rows
from tui.physics.likelihood import errors_of, residuals
from tui.physics.looking import KEPT, Minima, first_of_each, gone_down, held_down, look, put

COUNT = 60


@pytest.fixture(scope="module")
def drawn(grids):
    """Candidates of all natures, each with its own longest extinction."""
    problem, x, _ = random_problem(grids, TEN, COUNT, 29)
    return replace(problem, av_max=5.0 + 0.01 * np.arange(COUNT)), x


@pytest.fixture(scope="module", params=["star + A_V", "star + dust, A_V", "free pair", "bound pair", "star + compact"])
def looked(drawn, request):
    problem, _ = drawn
    kit, errors = kit_for(MODELS[request.param], problem.templates), first_errors(problem)
    starts = starting_rows(problem, kit, errors)
    return problem, kit, errors, starts, look(problem, kit, errors, starts)


def cost_at(problem, kit, errors, x):
    return residuals(problem, kit, errors, x, predict(kit, x)).cost


def test_minima_come_lowest_first_and_cost_what_they_say(looked):
    problem, kit, errors, _, found = looked
    assert found.x.shape == (KEPT, COUNT, c.WIDTH) and found.cost.shape == (KEPT, COUNT)
    lowest = found.cost[0]
    assert np.all(lowest <= found.cost)
    fewer = (found.x == found.x[0]).all(axis=2)  # the lowest again, where there are fewer
    ranked = np.where(fewer, np.inf, found.cost)[1:]
    assert np.all((ranked[1:] >= ranked[:-1]) | ~np.isfinite(ranked[1:]))
    for x, cost in zip(found.x, found.cost, strict=True):
        assert cost == pytest.approx(cost_at(problem, kit, errors, x), rel=2e-3, abs=0.02)  # single precision


def test_minima_that_are_kept_are_places_of_their_own(looked):
    _, kit, _, _, found = looked
    columns = [column for column in kit.model.free if column in (c.LN_T, c.AV, c.X2)]
    alike = 0
    for one in range(KEPT):
        for other in range(one + 1, KEPT):
            same = (np.abs(found.x[one][:, columns] - found.x[other][:, columns]) < 1e-3).all(axis=1)
            again = (found.x[one] == found.x[other]).all(axis=1)
            alike += np.sum(same & ~again)
    assert alike <= 0.05 * KEPT * COUNT


def test_no_start_alone_leads_lower(looked):
    # every start walked to its end in double precision: none may be lost on the way by more than a tenth of a sigma
    # squared, but for starts far behind that are given up
    problem, kit, errors, starts, found = looked
    best = gone_down(problem, kit, errors, found.x[0], 60, 1e-6)[1]
    alone = np.min([gone_down(problem, kit, errors, start, 60, 1e-6)[1] for start in starts], axis=0)
    assert np.mean(best <= alone + 0.1) >= 0.96


def test_each_candidate_keeps_to_its_own_bounds(looked):
    problem, kit, _, _, found = looked
    low, high = kit.bounds(problem.av_max)
    for x in found.x:
        inside = (x >= low - 1e-5) & (x <= high + 1e-5)
        assert inside[:, [column for column in kit.model.free if column != c.LN_S]].all()


def odd_candidates(problem):
    """Nothing measured; one band; limits alone; all negative; blinding; next to nothing; a flux of exactly nothing."""
    some = problem.take(np.arange(8))
    detected, limited, flux = some.detected | some.limited, some.limited & False, np.abs(some.flux_jy)
    detected[0] = False
    detected[1] = np.arange(flux.shape[1]) == 4
    detected[2], limited[2] = False, True
    flux[3] *= -1.0
    flux[4] *= 1e30
    flux[5] *= 1e-25
    flux[6] = 0.0
    error = np.where(np.arange(8)[:, None] == 7, 1e-30, 0.02 * np.maximum(np.abs(flux), 1e-12))
    return replace(some, flux_jy=flux, error_jy=error, detected=detected, limited=limited,
        parallax_mas=np.full(8, np.nan))  # fmt: skip


@pytest.mark.parametrize("name", MODELS)
def test_no_candidate_is_lost_however_odd(drawn, name):
    problem, _ = drawn
    odd = odd_candidates(problem)
    kit, errors = kit_for(MODELS[name], problem.templates), first_errors(odd)
    found = look(odd, kit, errors, starting_rows(odd, kit, errors))
    assert np.all(np.isfinite(found.x)) and not np.isnan(found.cost).any()
    low, high = kit.bounds(odd.av_max)
    columns = list(kit.model.free)
    assert np.all((found.x[0] >= low - 1e-5)[:, columns] & (found.x[0] <= high * (1 + 1e-5) + 1e-5)[:, columns])
    x, cost = gone_down(odd, kit, errors, found.x[0], 20, 1e-5)
    assert np.all(np.isfinite(x))
    assert cost[0] == 0 or kit.model.bound_pair  # nothing measured, nothing missed


@pytest.mark.parametrize("name", ["star", "star + A_V", "star + dust, A_V", "star + galaxy"])
def test_the_odd_do_not_touch_the_others(drawn, name):
    problem, _ = drawn
    plain = problem.take(np.arange(8, 40))
    odd = odd_candidates(problem)
    mixed = replace(
        plain,
        **{
            key: np.concatenate([getattr(plain, key), getattr(odd, key)])
            for key in ("flux_jy", "error_jy", "detected", "limited", "parallax_mas", "parallax_error_mas", "av_max")
        },
    )
    kit = kit_for(MODELS[name], problem.templates)
    costs = []
    for each in (plain, mixed):
        errors = first_errors(each)
        costs.append(look(each, kit, errors, starting_rows(each, kit, errors)).cost[0, :32])
    assert np.mean(np.abs(costs[0] - costs[1]) <= 0.02 + 1e-3 * costs[0]) >= 0.95


def test_a_descent_ends_lower_and_blocks_do_not_matter(drawn, monkeypatch):
    problem, x = drawn
    kit = kit_for(c.DUST_AV, problem.templates)
    errors = errors_of(problem, x, predict(kit, x))
    begun = gone_down(problem, kit, errors, x, 0, 1e-5)[1]
    whole = gone_down(problem, kit, errors, x, 20, 1e-5)
    assert np.all(whole[1] <= begun + 1e-9)
    assert whole[1] == pytest.approx(cost_at(problem, kit, errors, whole[0]), rel=1e-6, abs=1e-6)
    monkeypatch.setattr(looking, "FEW", 10)
    monkeypatch.setattr(looking, "BLOCK", 7)
    pieces = gone_down(problem, kit, errors, x, 20, 1e-5)
    assert pieces[1] == pytest.approx(whole[1], abs=1e-6)
    assert pieces[0][:, c.LN_T] == pytest.approx(whole[0][:, c.LN_T], abs=1e-6)


HOLDS = [
    (name, column)
    for name in MODELS
    if name not in ("star + A_V", "star + dust")  # parts of others
    for column in MODELS[name].free
]


@pytest.mark.parametrize(("name", "column"), HOLDS)
def test_what_is_held_stays_to_the_last_digit(drawn, name, column):
    problem, x = drawn
    kit = kit_for(MODELS[name], problem.templates)
    low, high = kit.bounds(problem.av_max)
    start = np.clip(x, low, high)
    start[:, c.RV] = 3.3 if c.RV in kit.model.free else 3.1
    start[:, c.A2] += 1e-3
    errors = errors_of(problem, start, predict(kit, start))
    start[:, column] *= 1.01
    start = np.clip(start, low, high)
    held = np.zeros(start.shape, bool)
    held[::2, column] = True
    found, cost = held_down(problem, kit, errors, start, np.arange(COUNT), held, 30, 1e-6)
    assert np.array_equal(found[::2, column], start[::2, column])
    assert cost == pytest.approx(cost_at(problem, kit, errors, found), rel=1e-4, abs=1e-3)
    judge = descend(problem, kit, errors, np.where(held, start, found), held=held)
    assert np.mean(cost <= judge.cost + 0.05) >= 0.9


def test_with_the_temperature_held_the_scale_is_in_closed_form(drawn):
    # no limits: theta^2 = sum(w F m) / sum(w m^2)
    problem, x = drawn
    plain = problem.without(problem.limited)
    kit = kit_for(c.STAR, plain.templates)
    errors = errors_of(plain, x, predict(kit, x))
    held = np.tile(np.arange(c.WIDTH) == c.LN_T, (COUNT, 1))
    start = x + 0.5 * (np.arange(c.WIDTH) == c.LN_S)
    found, cost = held_down(plain, kit, errors, start, np.arange(COUNT), held, 5, 1e-6)
    unit = predict(kit, np.where(np.arange(c.WIDTH) == c.LN_S, -45.0, x)).flux
    weight = np.where(plain.detected, errors.sigma**-2.0, 0.0)
    scale = np.sum(weight * plain.flux_jy * unit, axis=1) / np.sum(weight * unit**2, axis=1)
    assert found[:, c.LN_S] + 45.0 == pytest.approx(np.log(scale), abs=1e-9)
    assert cost == pytest.approx(np.sum(weight * (plain.flux_jy - scale[:, None] * unit) ** 2, axis=1), rel=1e-9)


def test_rows_go_by_their_owners_data(drawn):
    problem, x = drawn
    kit = kit_for(c.STAR_AV, problem.templates)
    errors = errors_of(problem, x, predict(kit, x))
    owner = np.array([5, 0, 5, 41])
    held = np.zeros((4, c.WIDTH), bool)
    found, cost = held_down(problem, kit, errors, x[owner], owner, held, 20, 1e-6)
    whole = gone_down(problem, kit, errors, x, 20, 1e-6)
    assert cost == pytest.approx(whole[1][owner], abs=1e-6)
    assert found[:, c.LN_T] == pytest.approx(whole[0][owner, c.LN_T], abs=1e-6)


def test_columns_that_repeat_are_dropped_by_owner():
    theta = np.array([[1.0, 2.0, 1.0, 1.0, 2.0], [5.0, 5.0, 5.0, 6.0, 5.0]])
    assert first_of_each(theta, np.array([0, 0, 0, 0, 1])).tolist() == [0, 1, 3, 4]


def test_minima_put_and_joined():
    first = Minima(np.zeros((KEPT, 3, c.WIDTH)), np.zeros((KEPT, 3)))
    some = Minima(np.ones((KEPT, 1, c.WIDTH)), np.ones((KEPT, 1)))
    found = first.put(np.array([1]), some)
    assert found.cost[0].tolist() == [0, 1, 0] and first.cost[0].tolist() == [0, 0, 0]
    assert Minima.joined([first, some]).x.shape == (KEPT, 4, c.WIDTH)
    assert put(np.zeros(3), np.array([2]), np.ones(1)).tolist() == [0, 0, 1]
