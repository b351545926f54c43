"""Dip slopes against published extinction laws, fits against scipy, intervals against simulation."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import least_squares

from tui.physics.dips import ALPHAS, coloured_fit, grey_fit, law_curves, power_curves, screen_depth
from tui.physics.extinction import extinction_curve

WAVE = np.array([0.36, 0.47, 0.62, 0.75, 0.89, 1.24, 1.65, 2.16])
ERROR = np.full(WAVE.size, 0.0005)


def powered(alpha, a0, wave=WAVE):
    return screen_depth(a0 * (wave / 0.55) ** -alpha)


def fitted(depth, error=ERROR, wave=WAVE):
    return coloured_fit(depth, error, ALPHAS, power_curves(wave))


# Cardelli, Clayton & Mathis 1989, ApJ 345, 245, Eq. 2: A ~ wavelength^-1.61 from 0.9 to 3.3 micron, whatever R_V;
# Wang & Chen 2019, ApJ 877, 116, Eq. 10: wavelength^-2.07 from 1.0 to 3.33 micron.
@pytest.mark.parametrize(("law", "alpha"), [("ccm89", 1.61), ("wc19", 2.07)])
def test_slope_of_published_laws(law, alpha):
    wave = np.array([1.24, 1.65, 2.16])
    depth = screen_depth(0.02 * extinction_curve(wave, law, 3.1))
    assert fitted(depth, ERROR[:3] * 0.1, wave).shape == pytest.approx(alpha, abs=0.005)


@pytest.mark.parametrize(("alpha", "a0"), [(-1.0, 0.05), (0.0, 0.2), (1.3, 0.02), (4.0, 0.01), (2.0, 1.5)])
def test_exact_depths_return_their_slope(alpha, a0):
    found = fitted(powered(alpha, a0))
    assert found.chi2 < 0.01
    assert found.shape == pytest.approx(alpha, abs=0.01)
    assert found.amplitude == pytest.approx(a0, rel=0.01)
    assert found.shape_low <= alpha <= found.shape_high


def test_minimum_against_scipy():
    rng = np.random.default_rng(51)
    for _ in range(20):
        depth = powered(rng.uniform(0, 4), rng.uniform(0.01, 0.5)) + 0.003 * rng.normal(size=WAVE.size)
        error = np.full(WAVE.size, 0.003)
        found = fitted(depth, error)
        best = min(
            least_squares(lambda x: (depth - powered(x[0], np.exp(x[1]))) / error, (a, np.log(0.1))).cost * 2
            for a in (0.5, 2.0, 4.0)
        )
        assert found.chi2 < best + 0.02


def test_interval_covers_as_it_says():
    rng = np.random.default_rng(52)
    inside = 0
    for _ in range(300):
        found = fitted(powered(1.5, 0.05) + ERROR * 4 * rng.normal(size=WAVE.size), ERROR * 4)
        inside += found.shape_low <= 1.5 <= found.shape_high
    assert 0.60 < inside / 300 < 0.76  # 68 % within three standard deviations of 300 draws


def test_r_v_is_recovered_through_the_law():
    r_v = np.linspace(2.3, 5.6, 34)
    curves = law_curves(WAVE, lambda wave, ratio: extinction_curve(wave, "g23", ratio), r_v)
    depth = screen_depth(0.3 * extinction_curve(WAVE, "g23", 4.0))
    found = coloured_fit(depth, ERROR, r_v, curves)
    assert found.shape == pytest.approx(4.0, abs=0.03) and found.amplitude == pytest.approx(0.3, rel=0.01)
    steep = coloured_fit(powered(4.0, 0.05), ERROR, r_v, curves)
    assert steep.is_limit and steep.shape == pytest.approx(2.3)  # Rayleigh scattering is steeper than any R_V


def test_grey_is_the_weighted_mean():
    found = grey_fit(np.array([0.01, 0.011]), np.array([0.001, 0.002]))
    sigma2 = np.array([0.001, 0.002]) ** 2 + (0.1 * found.amplitude) ** 2
    assert found.amplitude == pytest.approx(np.sum(np.array([0.01, 0.011]) / sigma2) / np.sum(1 / sigma2), rel=1e-6)
    assert found.chi2 < 1
    assert grey_fit(np.array([-0.01, -0.02]), np.array([0.01, 0.01])).amplitude == 0.0


def test_host_share_dilutes():
    # Depth = (1 - 10^(-0.4 A)) x covered fraction x host's share of the flux
    assert screen_depth(2.5, covered=0.5, host_share=0.4) == pytest.approx(0.9 * 0.2)
    found = coloured_fit(0.5 * powered(2.0, 0.3), ERROR, ALPHAS, power_curves(WAVE), host_share=0.5)
    assert found.shape == pytest.approx(2.0, abs=0.02)
