"""Planck's law, its peak and its integral."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from tui.model import FloatArray
from tui.physics.constants import C2_UM_K, JY, LIGHT_C, MICRON, PLANCK_H, STEFAN_SIGMA


def ln_planck_jy(wave_um: ArrayLike, temperature_k: ArrayLike) -> FloatArray:
    """Natural logarithm of B_nu in Jy/sr; finite wherever wave_um * temperature_k > 20 micron K.

    Args:
        wave_um: wavelength in vacuum, micron; broadcasts against `temperature_k`.
        temperature_k: kelvin, positive.
    Source: Planck's law, 2 h nu^3 / c^2 / (exp(h nu / k T) - 1).

    >>> round(float(ln_planck_jy(10.0, 300.0)), 6)  # ln 3.310301e14 Jy/sr
    33.43323
    """
    wave = np.asarray(wave_um, dtype=np.float64)
    x = C2_UM_K / (wave * np.asarray(temperature_k, dtype=np.float64))
    front = np.log(2.0 * PLANCK_H * LIGHT_C / JY) - 3.0 * np.log(wave * MICRON)
    return front - x - np.log(-np.expm1(-x))


def planck_jy(wave_um: ArrayLike, temperature_k: ArrayLike) -> FloatArray:
    """B_nu in Jy/sr; zero where it is too small for a double."""
    return np.exp(ln_planck_jy(wave_um, temperature_k))


def surface_flux(temperature_k: ArrayLike) -> FloatArray:
    """Flux through the surface of a black body, W m-2 (Stefan-Boltzmann)."""
    return STEFAN_SIGMA * np.asarray(temperature_k, dtype=np.float64) ** 4
