"""A spectrum as narrow bands and in its broad shape."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import kstest

from tui.model import Spectrum
from tui.physics.planck import planck_jy
from tui.physics.spectral import (
    MOST_POINTS,
    broad_bands,
    broad_means,
    grid_key,
    point_edges,
    point_names,
    points_of,
    shape_fit,
    thinned,
)

WAVE_UM = np.linspace(0.4, 1.0, 61)


def flat(wave_um, flux=1.0, error=0.1):
    return Spectrum(wave_um, np.full(wave_um.size, flux), np.full(wave_um.size, error))


def test_points_lie_side_by_side_and_do_not_bridge_a_hole():
    low, high = point_edges(np.array([1.0, 1.1, 1.2, 1.8, 1.9]))
    assert np.allclose(high[:2], low[1:3]) and np.allclose([high[2], low[3]], [1.3, 1.7])


def test_points_of_one_grid_have_one_key_and_one_name_each():
    close = np.array([0.5, 0.500001, 0.6])
    assert len(set(point_names(close))) == 3
    assert grid_key(flat(WAVE_UM)) == grid_key(flat(WAVE_UM, 2.0)) != grid_key(flat(WAVE_UM * 1.001))


def test_long_spectra_are_averaged_to_as_many_points_as_fits_take():
    short = thinned(flat(np.linspace(0.4, 1.0, 1000)))
    assert short.wave_um.size <= MOST_POINTS and len(points_of(short).bands) == short.wave_um.size
    assert np.allclose(short.flux_jy, 1.0) and np.allclose(short.error_jy, 0.1 / np.sqrt(10))  # means of ten


def test_wide_bands_average_what_they_hold_and_nothing_else():
    bands = broad_bands()
    steep = Spectrum(WAVE_UM, WAVE_UM, np.full(WAVE_UM.size, 0.01))
    flux, error = broad_means(steep, bands)
    held = [band.wave_um[0] >= 0.4 and band.wave_um[-1] <= 1.0 for band in bands]
    assert np.array_equal(np.isfinite(flux), held) and 3 <= sum(held) <= 5
    for band, mean, sigma in zip(bands, flux, error, strict=True):
        if np.isfinite(mean):
            low, high = band.wave_um
            assert mean == pytest.approx((high - low) / np.log(high / low), rel=1e-5)  # of F = w over dw/w
            assert 0.5 < sigma / 0.01 * np.sqrt((high - low) / 0.01) < 1.5  # the error of so many points' mean


def test_a_hole_in_a_spectrum_is_not_filled_in():
    wave = WAVE_UM[(WAVE_UM < 0.55) | (WAVE_UM > 0.64)]
    whole, holed = (broad_means(flat(each), broad_bands())[0] for each in (WAVE_UM, wave))
    assert np.isfinite(holed).sum() < np.isfinite(whole).sum()


# Gaussian errors and a temperature and scale fitted: chi-square has B - 2 degrees of freedom, so p is uniform.
def test_p_of_a_plain_star_is_uniform():
    from tui.physics.statistics import chi2_tail

    rng = np.random.default_rng(11)
    teff_k = np.exp(np.linspace(np.log(4500), np.log(7000), 60))
    ln_star = np.log(planck_jy(WAVE_UM[None, :], teff_k[:, None]))
    truth = planck_jy(WAVE_UM, 5600.0) / planck_jy(0.6, 5600.0)
    spread = np.full(ln_star.shape, 1e-9)
    p = []
    for _ in range(300):
        error = 0.02 * truth
        found = shape_fit(truth + error * rng.normal(size=truth.size), error, ln_star, spread, teff_k)
        p.append(float(chi2_tail(found.chi2, found.dof)))
    assert kstest(p, "uniform").pvalue > 0.01
