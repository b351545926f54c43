"""The polynomial of band extinction against direct integration, and its derivatives."""

from __future__ import annotations

import numpy as np
import pytest

from tui.physics.constants import MAG
from tui.physics.extinction import extinction_curve
from tui.physics.planck import ln_planck_jy

NAMES = ("U", "SDSS_u", "B", "SDSS_g", "Gaia_BP", "V", "Gaia_G", "Gaia_RP", "J", "Ks", "W1", "W2", "W3", "W4", "MIPS24")


def direct(band, kelvin, av, r_v, law="g23"):
    """A_band by trapezoids on 3001 wavelengths, catalogue's average of a Planck source."""
    wave = np.linspace(band.wave_um[0], band.wave_um[-1], 3001)
    ln_b = ln_planck_jy(wave, kelvin)
    light = np.exp(ln_b - ln_b.max()) * np.interp(wave, band.wave_um, band.response) / wave
    passed = np.exp(-MAG * av * extinction_curve(wave, law, r_v))
    return -np.log(np.trapezoid(light * passed, wave) / np.trapezoid(light, wave)) / MAG


@pytest.fixture(scope="module")
def local(grids):
    return grids.take(NAMES)


def test_broad_band_extinction_of_the_sun(local):
    # A_G/A_V at 5772 K, checked for this project by direct integration of G23: 0.83, 0.78, 0.68 (0.675), 0.60
    av = np.array([1.0, 3.0, 10.0, 20.0])
    found = local.star_reddening.at(np.full(4, np.log(5772.0)), av, np.full(4, 3.1))[0][:, NAMES.index("Gaia_G")] / av
    assert found == pytest.approx([0.83, 0.78, 0.68, 0.60], rel=0, abs=0.0055)


@pytest.mark.parametrize("family", ["star", "dust", "compact"])
def test_polynomial_against_direct_integration(local, family):
    rng = np.random.default_rng(31)
    reddening = getattr(local, f"{family}_reddening")
    count = 16
    ln_t = rng.uniform(*reddening.ln_t, count)
    if family == "dust":
        ln_t = np.maximum(ln_t, np.log(150.0))  # colder dust is not seen shortward of 5 micron
    av, r_v = 30 * rng.uniform(0, 1, count) ** 2, 1 / rng.uniform(1 / 5.6, 1 / 2.3, count)
    found = reddening.at(ln_t, av, r_v)[0]
    for column, band in enumerate(local.bands):
        if family == "dust" and band.pivot_um < 2:
            continue
        exact = np.array([direct(band, float(np.exp(t)), a, r) for t, a, r in zip(ln_t, av, r_v, strict=True)])
        off = np.abs(found[:, column] - exact)
        if band.name == "SDSS_u":  # its red leak takes over behind thick screens
            assert off[av <= 4].max() < 0.025 and off[av <= 8].max() < 0.08
            continue
        assert off.max() < 0.01, (band.name, off.max())


def test_one_r_v_is_a_cut_through_all(local):
    rng = np.random.default_rng(32)
    ln_t, av = rng.uniform(np.log(3000), np.log(20000), 40), rng.uniform(0, 20, 40)
    whole = local.star_reddening.at(ln_t, av, np.full(40, 4.2))
    cut = local.star_reddening.fixed(4.2).at(ln_t, av)
    for left, right in zip(whole[:3], cut[:3], strict=True):
        assert right == pytest.approx(left, rel=1e-9, abs=1e-12)
    assert cut[3] is None


@pytest.mark.parametrize("family", ["star", "dust", "compact"])
def test_derivatives_against_differences(local, family):
    rng = np.random.default_rng(33)
    reddening = getattr(local, f"{family}_reddening")
    ln_t = rng.uniform(reddening.ln_t[0] + 0.01, reddening.ln_t[1] - 0.01, 50)
    av, r_v, step = rng.uniform(0.01, 25, 50), rng.uniform(2.4, 5.5, 50), 1e-5
    _, dt, da, dr = reddening.at(ln_t, av, r_v)
    wanted = (
        (reddening.at(ln_t + step, av, r_v)[0] - reddening.at(ln_t - step, av, r_v)[0]) / 2 / step,
        (reddening.at(ln_t, av + step, r_v)[0] - reddening.at(ln_t, av - step, r_v)[0]) / 2 / step,
        (reddening.at(ln_t, av, r_v + step)[0] - reddening.at(ln_t, av, r_v - step)[0]) / 2 / step,
    )
    for found, difference in zip((dt, da, dr), wanted, strict=True):
        assert found == pytest.approx(difference, rel=1e-5, abs=1e-6)


def test_no_screen_dims_nothing(local):
    a, dt, _, dr = local.star_reddening.at(np.log([4000.0, 9000.0]), np.zeros(2), np.full(2, 3.1))
    assert np.all(a == 0) and np.all(dt == 0) and np.all(dr == 0)
