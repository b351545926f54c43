"""Models of one star and more: sums written out by hand, and every derivative against finite differences."""

from __future__ import annotations

import numpy as np
import pytest

from tests.bench.random_stars import FOURTEEN, local_grids, random_rows
from tui.physics import composite as c
from tui.physics.composite import MODELS, kit_for, parallax_of, predict
from tui.physics.constants import MAG, PARSEC, R_SUN, STEFAN_SIGMA
from tui.physics.photometry import quadrature
from tui.physics.planck import planck_jy


@pytest.fixture(scope="module")
def local(grids):
    return local_grids(grids, FOURTEEN)


def rows_of(local, model, count=40, seed=3):
    x = random_rows(np.random.default_rng(seed), model, local, count, 5.0)
    if c.RV in model.free:
        x[:, c.RV] = np.random.default_rng(seed).uniform(2.5, 5.4, count)
    return x


@pytest.mark.parametrize("name", MODELS)
def test_derivatives_against_finite_differences(local, name):
    kit = kit_for(MODELS[name], local)
    x = rows_of(local, kit.model)
    found = predict(kit, x)
    for place, column in enumerate(kit.model.free):
        step = 1e-5 * np.maximum(np.abs(x[:, column]), 1e-4)
        high, low = x.copy(), x.copy()
        high[:, column] += step
        low[:, column] -= step
        slope = (predict(kit, high).flux - predict(kit, low).flux) / (2 * step)[:, None]
        # rounding of the difference itself
        scale = np.abs(found.flux) / np.maximum(np.abs(x[:, column]), 1e-4)[:, None]
        assert np.all(np.abs(found.slopes[:, place] - slope) <= 2e-4 * np.abs(slope) + 1e-5 * scale), column


def test_the_stars_share_and_the_sum(local):
    x = rows_of(local, c.DUST_AV)
    whole = predict(kit_for(c.DUST_AV, local), x)
    alone = predict(kit_for(c.STAR_AV, local), x)
    assert whole.star == pytest.approx(alone.flux, rel=1e-12)
    none = np.where(np.arange(c.WIDTH) == c.A2, 0.0, x)
    assert predict(kit_for(c.DUST_AV, local), none).flux == pytest.approx(alone.flux, rel=1e-12)
    assert np.all(whole.flux >= alone.flux)


def test_dust_amplitude_is_its_fractional_luminosity(local):
    # f = L_dust/L_star with L_star = theta^2 sigma T^4: solid angle of the dust theta_d^2 = f theta^2 (T/T_d)^4
    x = np.zeros((1, c.WIDTH))
    x[0, [c.LN_T, c.LN_S, c.X2, c.A2]] = np.log(6000.0), -45.0, np.log(300.0), 0.01
    dust = (predict(kit_for(c.DUST, local), x).flux - predict(kit_for(c.STAR, local), x).flux)[0]
    column = local.names.index("W3")
    rule = quadrature(local.bands[column])
    solid = 0.01 * np.exp(-45.0) * (6000.0 / 300.0) ** 4
    exact = solid * np.pi * np.sum(rule.weight * planck_jy(rule.wave_um, 300.0))
    assert dust[column] == pytest.approx(exact, rel=2e-4)
    luminosity = solid * STEFAN_SIGMA * 300.0**4
    assert luminosity / (np.exp(-45.0) * STEFAN_SIGMA * 6000.0**4) == pytest.approx(0.01)


def test_free_pair_amplitude_is_the_flux_ratio_at_ks(local):
    x = np.zeros((1, c.WIDTH))
    x[0, [c.LN_T, c.LN_S, c.X2, c.A2]] = np.log(6000.0), -45.0, np.log(3500.0), 0.4
    both = predict(kit_for(c.FREE_PAIR, local), x).flux[0]
    first = predict(kit_for(c.STAR, local), x).flux[0]
    assert (both / first - 1)[local.names.index("Ks")] == pytest.approx(0.4, rel=5e-3)  # Ks lies a hair off 2.16 micron
    assert (both / first - 1)[local.names.index("SDSS_g")] < 0.1


def test_an_equal_bound_pair_is_twice_one_star(local):
    x = np.zeros((3, c.WIDTH))
    x[:, c.LN_T] = x[:, c.X2] = np.log([3300.0, 5800.0, 9000.0])
    x[:, c.LN_S], x[:, c.AV] = -45.0, 0.7
    both = predict(kit_for(c.BOUND_PAIR, local), x).flux
    assert both == pytest.approx(2 * predict(kit_for(c.STAR_AV, local), x).flux, rel=1e-12)


def test_compact_amplitude_is_the_ratio_of_surfaces(local):
    x = np.zeros((1, c.WIDTH))
    x[0, [c.LN_T, c.LN_S, c.X2, c.A2]] = np.log(3200.0), -45.0, np.log(30000.0), 4e-4
    hot = (predict(kit_for(c.COMPACT, local), x).flux - predict(kit_for(c.STAR, local), x).flux)[0]
    column = local.names.index("SDSS_g")
    rule = quadrature(local.bands[column])
    exact = 4e-4 * np.exp(-45.0) * np.pi * np.sum(rule.weight * planck_jy(rule.wave_um, 30000.0))
    assert hot[column] == pytest.approx(exact, rel=3e-4)


def test_a_galaxy_is_measured_at_3_4_micron(local):
    x = np.zeros((1, c.WIDTH))
    x[0, [c.LN_T, c.LN_S, c.X2, c.A2]] = np.log(5000.0), -45.0, 1.0, 0.5
    star = predict(kit_for(c.STAR, local), x).flux[0]
    galaxy = predict(kit_for(c.GALAXY, local), x).flux[0] - star
    # pivot 3.37 micron, the star falls as w^-2
    assert (galaxy / star)[local.names.index("W1")] == pytest.approx(0.5, rel=0.04)
    rise = galaxy[local.names.index("W4")] / galaxy[local.names.index("W1")]
    assert rise == pytest.approx(22.19 / 3.368, rel=0.02)  # F_nu ~ wavelength


def test_a_screen_dims_all_sources_alike(local):
    x = rows_of(local, c.FREE_PAIR)
    x[:, c.X2] = x[:, c.LN_T]
    x[:, c.AV] = 2.0
    bare = np.where(np.arange(c.WIDTH) == c.AV, 0.0, x)
    kit = kit_for(c.FREE_PAIR, local)
    dimmed = -np.log(predict(kit, x).flux / predict(kit, bare).flux) / MAG
    exact = local.star_reddening.fixed(3.1).at(x[:, c.LN_T], x[:, c.AV])[0]
    assert dimmed == pytest.approx(exact, rel=1e-9)


def test_parallax_of_the_sun_at_ten_parsec(local):
    # R_sun at 10 pc has a parallax of 100 mas; the sequence's radius at 5772 K is 3 % above the Sun's
    x = np.zeros((1, c.WIDTH))
    x[0, c.LN_T], x[0, c.LN_S] = np.log(5772.0), 2 * np.log(R_SUN / (10 * PARSEC))
    parallax, slope = parallax_of(kit_for(c.BOUND_PAIR, local), x)
    assert float(parallax[0]) == pytest.approx(100.0, rel=0.04)
    step = np.where(np.arange(c.WIDTH) == c.LN_T, 1e-5, 0.0)
    ahead, behind = (parallax_of(kit_for(c.BOUND_PAIR, local), x + sign * step)[0] for sign in (1, -1))
    assert float(slope[0]) == pytest.approx(float(np.log(ahead / behind)[0]) / 2e-5, rel=1e-4)
