"""Magnitudes, flux densities and band averages."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from tui.errors import CoverageError, InputError
from tui.model import Band, FloatArray
from tui.physics.constants import MAG
from tui.physics.planck import planck_jy

AB_ZERO_JY = 3631.0  # Oke & Gunn 1983, ApJ 266, 713
NODES = 240  # quadrature nodes a band; 120 differ by up to 1e-3 (SDSS u, which leaks in the red, by more below 2000 K)
BOX_NODES, NARROW = 10, 1.25  # of a flat response whose ends lie closer than this ratio: a point of a spectrum


def flux_from_mag(mag: ArrayLike, zero_point_jy: float) -> FloatArray:
    """Flux density in Jy of a Pogson magnitude."""
    return zero_point_jy * np.exp(-MAG * np.asarray(mag, dtype=np.float64))


def mag_from_flux(flux_jy: ArrayLike, zero_point_jy: float) -> FloatArray:
    """Pogson magnitude; NaN where the flux is not positive."""
    flux = np.asarray(flux_jy, dtype=np.float64)
    return -np.log(np.where(flux > 0, flux, np.nan) / zero_point_jy) / MAG


@dataclass(frozen=True, slots=True, eq=False)
class Quadrature:
    """Band averages as a sum: <F_nu> = sum of weight * F_nu(wave); shape (N,) each, weights for one band."""

    wave_um: FloatArray
    weight: FloatArray


def quadrature(band: Band, nodes: int | None = None) -> Quadrature:
    """Nodes and weights that give the catalogue's flux density of a spectrum in `band`.

    The average is int(F_nu S dw/w) / int(G S dw/w), S the photon response, G the reference spectrum that the
    catalogue assumes, 1 at its reference wavelength (flat: G = 1). Simpson's rule on a fine grid with S linear
    between its samples.

    Raises:
        InputError: the response is not a curve with increasing wavelengths.
    Source: Bessell & Murphy 2012, PASP 124, 140, appendix.
    """
    if band.wave_um.size == 1:
        return Quadrature(band.wave_um, np.ones(1))
    if band.wave_um.shape != band.response.shape or not np.all(np.diff(band.wave_um) > 0):
        raise InputError(f"The response of {band.name} needs increasing wavelengths, one value each.")
    if nodes is None:
        nodes = BOX_NODES if is_narrow(band) else NODES
    edges = np.interp(np.linspace(0, 1, nodes // 2 + 1), np.linspace(0, 1, band.wave_um.size), band.wave_um)
    wave = np.sort(np.concatenate([edges, (edges[:-1] + edges[1:]) / 2]))
    step = np.diff(edges)
    simpson = np.zeros(wave.size)
    simpson[0:-2:2] += step / 6
    simpson[2::2] += step / 6
    simpson[1::2] += 4 * step / 6
    weight = simpson * np.interp(wave, band.wave_um, band.response) / wave
    return Quadrature(wave, weight / np.sum(weight * reference_shape(band, wave)))


def is_narrow(band: Band) -> bool:
    """Whether a band is flat between two close ends, as a point of a spectrum is."""
    return band.wave_um.size == 2 and bool(band.wave_um[1] < NARROW * band.wave_um[0])


def reference_shape(band: Band, wave_um: FloatArray) -> FloatArray:
    """The spectrum that the band's catalogue assumes, 1 at the reference wavelength."""
    if band.reference_spectrum == "nufnu":
        return wave_um / band.reference_um
    if band.reference_spectrum == "planck10000":
        return planck_jy(wave_um, 1e4) / planck_jy(band.reference_um, 1e4)
    return np.ones_like(wave_um)


def band_flux(wave_um: FloatArray, flux_jy: FloatArray, band: Band) -> float:
    """Catalogue flux density of a spectrum in a band, Jy.

    Args:
        wave_um: shape (N,), micron, strictly increasing.
        flux_jy: shape (N,), F_nu in Jy, linear between samples.
    Raises:
        InputError: shapes differ or wavelengths do not increase.
        CoverageError: the spectrum does not reach both ends of the band.

    >>> from tui.model import Band
    >>> box = Band("box", 1.5, "AB", 3631.0, 0.02, "none", np.array([1.0, 2.0]), np.array([1.0, 1.0]))
    >>> round(band_flux(np.array([0.5, 2.5]), np.array([0.5, 2.5]), box), 6)  # F = w: 1/ln 2
    1.442695
    """
    if wave_um.shape != flux_jy.shape or not np.all(np.diff(wave_um) > 0):
        raise InputError(f"A spectrum needs one increasing grid: shapes {wave_um.shape}, {flux_jy.shape}.")
    rule = quadrature(band)
    if wave_um[0] > rule.wave_um[0] or wave_um[-1] < rule.wave_um[-1]:
        raise CoverageError(band.name, (rule.wave_um[0], rule.wave_um[-1]), (wave_um[0], wave_um[-1]))
    return float(np.sum(rule.weight * np.interp(rule.wave_um, wave_um, flux_jy)))
