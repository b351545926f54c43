"""Photospheres from spectra: bands that they reach and resolve, temperatures between theirs."""

from __future__ import annotations

import numpy as np
import pytest

from tui.data.load import bands
from tui.physics.grid import SurfaceSpectrum, grid_photosphere, ln_band_flux
from tui.physics.photometry import quadrature
from tui.physics.photosphere import ln_planck_bands
from tui.physics.planck import planck_jy
from tui.physics.spectral import top_hat

WAVE_UM = np.geomspace(0.15, 40.0, 4000)
TEFF_K = np.array([4000.0, 4700.0, 5500.0, 6500.0])


def black_body(teff_k, wave_um=WAVE_UM):
    return SurfaceSpectrum(teff_k, wave_um, np.pi * planck_jy(wave_um, teff_k))


def test_black_bodies_have_planck_fluxes_at_and_between_their_temperatures():
    chosen = [bands()[name] for name in ("Gaia_BP", "Ks", "W3")]
    made = grid_photosphere("grid", [black_body(teff_k) for teff_k in TEFF_K], chosen)
    assert np.allclose(made.ln_flux, ln_planck_bands(made.teff_k, [quadrature(band) for band in chosen]), atol=3e-4)


def test_bands_beyond_the_spectra_are_silent():
    made = grid_photosphere("grid", [black_body(teff_k) for teff_k in TEFF_K], [bands()["PACS100"], bands()["J"]])
    assert np.isnan(made.ln_flux[:, 0]).all() and np.isfinite(made.ln_flux[:, 1]).all()


def test_a_point_finer_than_the_spectra_is_silent():
    coarse = black_body(5000.0, np.geomspace(0.15, 40.0, 300))  # steps of 1.9 %
    assert np.isnan(ln_band_flux(coarse, top_hat("p", 0.550, 0.555, 0.0)))
    assert np.isfinite(ln_band_flux(coarse, top_hat("p", 0.55, 0.57, 0.0)))


# A line of depth d over a fraction f of a flat band takes 1 - f d of its light: arithmetic, not ours.
def test_a_line_narrower_than_the_nodes_of_a_smooth_spectrum_counts_in_full():
    wave = np.linspace(0.5, 0.6, 20001)
    flux = np.where(np.abs(wave - 0.55) < 0.0005, 0.2, 1.0)
    one = SurfaceSpectrum(5000.0, wave, flux)
    taken = 1 - np.exp(ln_band_flux(one, top_hat("p", 0.54, 0.56, 0.0)))
    assert taken == pytest.approx(0.05 * 0.8, rel=0.02)  # 1/50 of the samples lie on the edges of the line
