"""Amplitudes that are not free: their ratios against the models, and the slopes against finite differences."""

from __future__ import annotations

import numpy as np
import pytest

from tests.bench.random_stars import TEN, local_grids, random_rows
from tui.physics import composite as c
from tui.physics.binding import A_LARGEST, LARGE, Held, binds_of, bound_by, caps_of
from tui.physics.components import lights, tables_of
from tui.physics.composite import MODELS, kit_for, predict

COUNT = 30
WITH_SOURCES = (
    "star + dust, A_V", "star + two dusts, A_V", "bound pair", "free pair", "star + compact", "star + galaxy"
)  # fmt: skip


@pytest.fixture(scope="module")
def local(grids):
    return local_grids(grids, TEN)


def seen_of(local, name, dtype=np.float64):
    kit = kit_for(MODELS[name], local)
    x = random_rows(np.random.default_rng(4), kit.model, local, COUNT, 5.0)
    x[:, c.LN_S] = 0.0
    tables = tables_of(kit, dtype)
    theta = np.ascontiguousarray(x[:, list(tables.columns)].T, dtype)
    return kit, x, tables, theta, lights(tables, theta, np.zeros((len(local.names), COUNT), dtype))


def free_held(theta, sources):
    nothing = np.full(COUNT, np.nan)
    return Held(np.zeros(theta.shape, bool), nothing, np.full((sources, COUNT), np.nan))


@pytest.mark.parametrize("dtype", [np.float64, np.float32])
@pytest.mark.parametrize("name", WITH_SOURCES)
def test_bound_sources_make_the_models_flux(local, name, dtype):
    # star and sources in their brightest bands, times the ratios, are what the model predicts for these amplitudes
    kit, x, tables, theta, seen = seen_of(local, name, dtype)
    held = free_held(theta, len(kit.model.sources))
    for number, column in enumerate((c.A2, c.A3)[: len(kit.model.sources)]):
        held.share[number] = x[:, column]
    binds = binds_of(tables, theta, seen, held)
    assert set(binds) == set(range(1, 1 + len(kit.model.sources)))
    total = seen.flux[0] + sum(bind.ratio * seen.flux[number] for number, bind in binds.items())
    exact = predict(kit, x).flux.T
    assert total * np.exp(seen.ln_top[0]) == pytest.approx(exact, rel=1e-9 if dtype is np.float64 else 1e-3)
    assert {bind.ratio.dtype for bind in binds.values()} == {np.dtype(dtype)}


@pytest.mark.parametrize("name", WITH_SOURCES)
def test_slopes_of_the_ratio_against_finite_differences(local, name):
    # ln of the ratio of surface scales, not of brightest bands: those are part of the lights' own slopes
    kit, x, tables, theta, seen = seen_of(local, name)
    for number in range(1, 1 + len(kit.model.sources)):
        bind = bound_by(tables, theta, seen, number, np.full(COUNT, 0.3), None)
        for place, column in enumerate(tables.columns):
            step = 1e-6 * (np.arange(theta.shape[0]) == place)[:, None]
            scale = []
            for side in (theta + step, theta - step):
                there = lights(tables, side, np.zeros((len(local.names), COUNT)))
                ratio = bound_by(tables, side, there, number, np.full(COUNT, 0.3), None).ratio
                scale.append(np.log(ratio) - there.ln_top[number] + there.ln_top[0])
            found = bind.slopes.get(column, np.zeros(COUNT))
            assert found == pytest.approx((scale[0] - scale[1]) / 2e-6, rel=1e-4, abs=1e-4), (column, number)


def test_rows_that_hold_nothing_stay_free(local):
    kit, x, tables, theta, seen = seen_of(local, "star + dust, A_V")
    held = free_held(theta, 1)
    assert binds_of(tables, theta, seen, None) == {} and binds_of(tables, theta, seen, held) == {}
    held.share[0, ::3] = 0.02
    bind = binds_of(tables, theta, seen, held)[1]
    assert np.array_equal(bind.where, np.arange(COUNT) % 3 == 0)
    assert np.all(bind.ratio[~bind.where] == 0) and np.all(bind.ratio[bind.where] > 0)
    assert all(np.all(slope[~bind.where] == 0) for slope in bind.slopes.values())
    some = np.array([4, 3])
    assert np.array_equal(held.take(some).share, held.share[:, some], equal_nan=True)


def test_what_is_too_bright_is_bound_and_nothing_else(local):
    # a galaxy at 3.4 micron: 30 times the star and no more (composite.A_GALAXY)
    kit, x, tables, theta, seen = seen_of(local, "star + galaxy")
    most = bound_by(tables, theta, seen, 1, np.full(COUNT, c.A_GALAXY), None).ratio
    factor = np.where(np.arange(COUNT) % 2 == 0, 0.99, 1.01)
    bind = caps_of(tables, theta, seen, np.stack([np.ones(COUNT), factor * most]), {})[1]
    assert np.array_equal(bind.where, factor > 1)
    assert bind.ratio[bind.where] == pytest.approx(most[bind.where])
    assert caps_of(tables, theta, seen, np.stack([np.ones(COUNT), 0.99 * most]), {}) == {}


def test_a_cap_leaves_what_is_held_alone(local):
    kit, x, tables, theta, seen = seen_of(local, "star + galaxy")
    held = free_held(theta, 1)
    held.share[0, :10] = 50.0  # by hand, more than a fit may take
    binds = binds_of(tables, theta, seen, held)
    both = np.stack([np.ones(COUNT), np.full(COUNT, 1e9)])
    bind = caps_of(tables, theta, seen, both, binds)[1]
    assert bind.where.all()
    assert bind.ratio[:10] == pytest.approx(binds[1].ratio[:10])
    most = bound_by(tables, theta, seen, 1, np.full(COUNT, c.A_GALAXY), None).ratio
    assert bind.ratio[10:] == pytest.approx(most[10:])


@pytest.mark.parametrize("model", ["free pair", "star + compact"])
def test_a_companion_that_is_not_much_brighter_is_not_looked_at(local, model):
    kit, x, tables, theta, seen = seen_of(local, model)
    assert caps_of(tables, theta, seen, np.stack([np.ones(COUNT), np.full(COUNT, LARGE)]), {}) == {}


def test_cold_dust_that_hardly_shows_is_bound_by_its_luminosity(local):
    # 20 K in bands shortward of W4: all its light may be 1e6 times the star's while it is fainter in every band
    kit, x, tables, theta, seen = seen_of(local, "star + dust, A_V")
    most = bound_by(tables, theta, seen, 1, np.full(COUNT, A_LARGEST), None).ratio
    bind = caps_of(tables, theta, seen, np.stack([np.ones(COUNT), 2.0 * most]), {})[1]
    assert bind.where.all() and bind.ratio == pytest.approx(most)
