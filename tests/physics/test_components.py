"""Lights of sources against the models themselves and finite differences, in both precisions."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tests.bench.random_stars import FOURTEEN, local_grids, random_rows
from tui.physics import composite as c
from tui.physics.components import MUCH, lights, tables_of
from tui.physics.composite import MODELS, kit_for, ln_unit, predict
from tui.physics.rows import ABSENT

COUNT = 40


@pytest.fixture(scope="module")
def local(grids):
    return local_grids(grids, FOURTEEN)


def drawn(local, model, seed=3):
    """Rows (COUNT, 8) of a model, scale 1 and R_V its own."""
    rng = np.random.default_rng(seed)
    x = random_rows(rng, model, local, COUNT, 5.0)
    x[:, c.LN_S] = 0.0
    if c.RV in model.free:
        x[:, c.RV] = rng.uniform(2.5, 5.4, COUNT)
    return x


def theta_of(tables, x):
    return np.ascontiguousarray(x[:, list(tables.columns)].T, tables.dtype)


def alone(kit, x, number):
    """Flux (M, B) of one source at scale 1, by the model: what adding it to the star adds."""
    if number == 0:
        return predict(kit, x).star
    own, share = ((c.X2, c.A2), (c.X3, c.A3))[number - 1]
    loud, mute = x.copy(), x.copy()
    for column in (c.A2, c.A3):
        loud[:, column] = mute[:, column] = 0.0
    loud[:, share] = 1e12
    one = 1.0 if kit.model.bound_pair else 1e12
    unit = ln_unit(kit, kit.model.sources[number - 1], x[:, c.LN_T], x[:, own])[0]
    mute = predict(kit, x).star if kit.model.bound_pair else predict(kit, mute).flux
    return (predict(kit, loud).flux - mute) / one * np.exp(-unit)[:, None]


@pytest.mark.parametrize("dtype", [np.float64, np.float32])
@pytest.mark.parametrize("name", MODELS)
def test_every_source_shines_as_the_model_says(local, name, dtype):
    kit = kit_for(MODELS[name], local)
    x = drawn(local, kit.model)
    tables = tables_of(kit, dtype)
    absent = np.zeros((len(local.names), COUNT), dtype)
    absent[::3, ::2] = ABSENT  # bands that half of the rows lack
    found = lights(tables, theta_of(tables, x), absent)
    assert len(found.flux) == 1 + len(kit.model.sources)
    tolerance = 1e-6 if dtype is np.float64 else 3e-4
    for number, (flux, top) in enumerate(zip(found.flux, found.ln_top, strict=True)):
        exact = alone(kit, x, number).T
        brightest = np.where(absent == 0, exact, 0.0).max(axis=0)
        assert flux.dtype == top.dtype == dtype
        assert np.where(absent == 0, flux, 0.0).max(axis=0) == pytest.approx(1.0)
        assert np.exp(top) == pytest.approx(brightest, rel=tolerance)
        assert flux == pytest.approx(exact / brightest, rel=tolerance, abs=1e-9)


@pytest.mark.parametrize("dtype", [np.float64, np.float32])
@pytest.mark.parametrize("name", MODELS)
def test_slopes_against_finite_differences(local, name, dtype):
    kit = kit_for(MODELS[name], local)
    tables, exact = tables_of(kit, dtype), tables_of(kit, np.float64)
    x = drawn(local, kit.model)
    absent = np.zeros((len(local.names), COUNT), dtype)
    found = lights(tables, theta_of(tables, x), absent)
    for column in tables.columns:
        step = 1e-5 * (np.arange(c.WIDTH) == column)
        ahead, behind = (lights(exact, theta_of(exact, x + sign * step), absent) for sign in (1, -1))
        for number in range(len(found.flux)):
            ln_flux = [np.log(side.flux[number]) + side.ln_top[number] for side in (ahead, behind)]
            with np.errstate(invalid="ignore"):  # so dark that its logarithm is none
                slope = (ln_flux[0] - ln_flux[1]) / 2e-5
            seen = found.flux[number] > 1e-12
            own = found.slopes[number].get(column, np.zeros_like(slope))
            assert own.dtype == dtype or column not in found.slopes[number]
            assert own[seen] == pytest.approx(slope[seen], rel=2e-3, abs=2e-3), (column, number)


def test_a_source_has_slopes_of_its_own_parameters_only(local):
    for name, further in (("star", []), ("star + A_V, R_V", []), ("star + two dusts, A_V", [c.X2, c.X3])):
        kit = kit_for(MODELS[name], local)
        tables = tables_of(kit, np.float64)
        x = drawn(local, kit.model)
        found = lights(tables, theta_of(tables, x), np.zeros((len(local.names), COUNT)))
        screen = {column for column in (c.AV, c.RV) if column in kit.model.free}
        for own, slopes in zip([c.LN_T, *further], found.slopes, strict=True):
            assert set(slopes) == {own} | screen


def test_a_band_that_was_not_measured_may_outshine_but_not_overflow(local):
    # Dust of 20 K seen by Gaia alone: W4 is brighter by e^600, which no number holds
    kit = kit_for(c.DUST, local)
    tables = tables_of(kit, np.float64)
    x = drawn(local, c.DUST)
    x[:, c.X2] = kit.further[0].low
    absent = np.full((len(local.names), COUNT), ABSENT)
    absent[local.names.index("Gaia_G")] = 0.0
    dust = lights(tables, theta_of(tables, x), absent).flux[1]
    assert dust[local.names.index("Gaia_G")] == pytest.approx(1.0)
    assert dust.max() == pytest.approx(np.exp(MUCH))


def test_the_ends_of_a_table_are_its_last_values(local):
    # in double precision as the models read them; a place beyond an end is held there
    kit = kit_for(c.STAR, local)
    tables = tables_of(kit, np.float64)
    for end, row in ((kit.star.low, 0), (kit.star.high, -1), (kit.star.high + 1.0, -1), (kit.star.low - 1.0, 0)):
        value, _ = tables.sources[0].at(np.array([end]))
        assert value[:, 0] == pytest.approx(kit.star.ln_flux[row], abs=1e-5)
        assert value[:, 0] == pytest.approx(kit.star.at(np.array([end]))[0][0], abs=1e-7)


def test_tables_are_kept_by_kit_and_precision(local):
    kit = kit_for(c.DUST_AV, local)
    assert tables_of(kit, np.float32) is tables_of(kit, np.float32)
    assert tables_of(kit, np.float64) is not tables_of(kit, np.float32)
    assert tables_of(replace(kit), np.float32) is not tables_of(kit, np.float32)
    assert tables_of(kit, np.float64).columns == (c.LN_T, c.AV, c.X2)
