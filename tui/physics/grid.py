"""Photospheres from spectra: each integrated through the bands, then interpolated in temperature."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy.interpolate import PchipInterpolator

from tui.model import Band, FloatArray
from tui.physics.photometry import quadrature
from tui.physics.photosphere import Photosphere, ln_planck_bands
from tui.physics.templates import STAR_STEP, even_grid

LEAST_NODES, MOST_NODES = 24, 4000  # of a band's quadrature: about two a sample of the spectrum, whose lines are narrow
DARK = 1e-300  # Jy, in place of no flux at all
SMOOTH_UM = 5.0  # from here on stars are so smooth that steps up to
SMOOTH_STEP = 0.75  # of ln wavelength tell their flux; shortward no step may be wider than the band


@dataclass(frozen=True, slots=True, eq=False)
class SurfaceSpectrum:
    """One photosphere: shape (N,) each, wavelength in micron increasing, surface flux density in Jy at theta = 1."""

    teff_k: float
    wave_um: FloatArray
    flux_jy: FloatArray


def grid_photosphere(source: str, spectra: Sequence[SurfaceSpectrum], bands: Sequence[Band]) -> Photosphere:
    """The spectra through `bands`, on an even grid of ln T between the coolest and the hottest.

    In each band ln F minus its Planck value is interpolated in ln T, monotone, through the spectra; a band that one
    of them does not reach or resolve is NaN at every temperature.

    Args:
        spectra: by increasing temperature, none twice.
    """
    rules = [quadrature(band) for band in bands]
    x = np.log([one.teff_k for one in spectra])
    at = even_grid(x[0], x[-1], STAR_STEP)
    measured = np.array([[ln_band_flux(one, band) for band in bands] for one in spectra])
    remainder = measured - ln_planck_bands(np.exp(x), rules)
    table = ln_planck_bands(np.exp(at), rules)
    known = np.isfinite(remainder).all(axis=0)
    table[:, known] += PchipInterpolator(x, remainder[:, known], axis=0)(at) if known.any() else 0.0
    table[:, ~known] = np.nan
    return Photosphere(source, np.exp(at), table, (True,) * len(bands), np.full(at.shape, np.nan))


def ln_band_flux(one: SurfaceSpectrum, band: Band) -> float:
    """ln of a spectrum's flux density in a band, Jy; NaN where it does not reach the whole band, or not resolve it.

    Between its samples a spectrum is a power law.
    """
    low, high = np.searchsorted(one.wave_um, (band.wave_um[0], band.wave_um[-1]))
    if one.wave_um[0] > band.wave_um[0] or one.wave_um[-1] < band.wave_um[-1]:
        return float("nan")
    around = one.wave_um[max(low - 1, 0) : high + 1]
    if not is_resolved(around, band.wave_um[-1] - band.wave_um[0]):
        return float("nan")
    rule = quadrature(band, int(np.clip(2 * around.size, LEAST_NODES, MOST_NODES)))
    ln_flux = np.interp(np.log(rule.wave_um), np.log(one.wave_um), np.log(np.maximum(one.flux_jy, DARK)))
    total = float(np.sum(rule.weight * np.exp(ln_flux)))
    return float(np.log(total)) if total > DARK else float("nan")


def is_resolved(wave_um: FloatArray, width_um: float) -> bool:
    """Whether samples in and about a band tell its flux: lines need steps no wider than the band."""
    if wave_um[0] > SMOOTH_UM:
        return bool(np.diff(np.log(wave_um)).max(initial=0.0) <= SMOOTH_STEP)
    return width_um == 0 or bool(np.diff(wave_um).max(initial=0.0) <= width_um)
