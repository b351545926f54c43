"""Depth of a dip against wavelength: a grey body, interstellar dust, or a power law of the optical depth."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from tui.model import FloatArray

REFERENCE_UM = 0.55  # where the amplitude of the power law holds
GREY_FLOOR = 0.10  # limb darkening makes opaque transits a little coloured: fraction of the depth
AMPLITUDES = np.geomspace(1e-5, 30.0, 400)  # mag of extinction tried
ALPHAS = np.linspace(-2.0, 6.0, 161)  # slopes tried
ONE_SIGMA, ONE_SIDED_95 = 1.0, 2.71
LIKELY = 9.0  # shapes with chi-square above the least by more play no part in a 68 % interval


@dataclass(frozen=True, slots=True)
class Shape:
    """A dip's best amplitude and shape, with the profile's ends."""

    amplitude: float
    amplitude_low: float
    amplitude_high: float
    shape: float  # R_V, or alpha; NaN for a grey dip
    shape_low: float
    shape_high: float
    is_limit: bool  # the shape lies at the end of its range: the ends are a one-sided 95 % limit
    chi2: float
    model: FloatArray  # shape (B,), depths
    sigma: FloatArray  # shape (B,), errors used


def screen_depth(extinction_mag: ArrayLike, covered: float = 1.0, host_share: float = 1.0) -> FloatArray:
    """Fraction of the light lost behind a screen: (1 - 10^(-0.4 A)) x covered fraction x the host's share.

    >>> float(screen_depth(0.7525749891599529).round(9))  # half the light
    0.5
    """
    return -np.expm1(-0.4 * np.log(10.0) * np.asarray(extinction_mag, dtype=float)) * covered * host_share


def grey_fit(depth: FloatArray, error: FloatArray) -> Shape:
    """One depth for all bands, errors joined by 10 % of that depth.

    Args:
        depth, error: shape (B,), fraction of the flux and 1 sigma.
    """
    value = float(np.sum(depth / error**2) / np.sum(error**-2.0))
    for _ in range(20):  # the floor follows the depth
        sigma = np.hypot(error, GREY_FLOOR * max(value, 0.0))
        weight = sigma**-2.0
        value = max(float(np.sum(weight * depth) / np.sum(weight)), 0.0)
    spread = float(np.sum(weight) ** -0.5)
    model = np.full(depth.shape, value)
    chi2 = float(np.sum(((depth - model) / sigma) ** 2))
    low, high = max(value - spread, 0.0), value + spread
    return Shape(value, low, high, np.nan, np.nan, np.nan, False, chi2, model, sigma)


def coloured_fit(
    depth: FloatArray, error: FloatArray, shapes: FloatArray, curves: FloatArray, host_share: float = 1.0
) -> Shape:
    """Screen of free amplitude whose extinction follows one of a family of curves.

    Every shape and amplitude of a grid is tried, so that the minimum is global; both are then refined.

    Args:
        depth, error: shape (B,).
        shapes: shape (S,), increasing: R_V or alpha.
        curves: shape (S, B), extinction per magnitude of amplitude.
    """
    profile, amplitude = amplitude_profile(depth, error, curves, host_share)
    best = int(profile.argmin())
    shape = _vertex(shapes, profile, best)
    curve = _between(shapes, curves, shape)
    chi2, at_best = amplitude_profile(depth, error, curve[None, :], host_share)
    if chi2[0] > profile[best]:
        shape, curve = float(shapes[best]), curves[best]
        chi2, at_best = profile[best : best + 1], amplitude[best : best + 1]
    low, high, is_limit = interval(shapes, profile, float(chi2[0]))
    likely = curves[profile <= profile[best] + LIKELY]
    amplitude_low, amplitude_high = amplitude_interval(depth, error, likely, float(at_best[0]), host_share)
    model = screen_depth(at_best[0] * curve, host_share=host_share)
    return Shape(
        float(at_best[0]), amplitude_low, amplitude_high, shape, low, high, is_limit, float(chi2[0]), model, error
    )


def chi2_of(depth: FloatArray, error: FloatArray, extinction_mag: FloatArray, host_share: float) -> FloatArray:
    """Chi-square of screens (..., B)."""
    return np.sum(((depth - screen_depth(extinction_mag, host_share=host_share)) / error) ** 2, axis=-1)


def amplitude_profile(
    depth: FloatArray, error: FloatArray, curves: FloatArray, host_share: float
) -> tuple[FloatArray, FloatArray]:
    """Lowest chi-square of each curve (S, B) over all amplitudes, and that amplitude: shape (S,) each."""
    chi2 = chi2_of(depth, error, AMPLITUDES[:, None, None] * curves, host_share)  # (amplitudes, S)
    best = chi2.argmin(axis=0)
    amplitude = AMPLITUDES[best]
    for _ in range(6):  # Gauss-Newton from the grid's best
        lost = screen_depth(amplitude[:, None] * curves, host_share=host_share)
        slope = 0.4 * np.log(10.0) * curves * (host_share - lost) / error
        step = np.sum(slope * (depth - lost) / error, axis=1) / np.maximum(np.sum(slope**2, axis=1), 1e-300)
        amplitude = np.clip(amplitude + step, AMPLITUDES[0], AMPLITUDES[-1])
    refined = chi2_of(depth, error, amplitude[:, None] * curves, host_share)
    grid = chi2[best, np.arange(best.size)]
    return np.minimum(refined, grid), np.where(refined <= grid, amplitude, AMPLITUDES[best])


def amplitude_interval(
    depth: FloatArray, error: FloatArray, curves: FloatArray, best: float, host_share: float
) -> tuple[float, float]:
    """Ends of the amplitude's 68 % interval, the shape free: a fine grid about the best, a coarse one beyond."""
    near = best * np.geomspace(0.5, 2.0, 401)
    grid = np.union1d(np.clip(near, AMPLITUDES[0], AMPLITUDES[-1]), AMPLITUDES)
    chi2 = chi2_of(depth, error, grid[:, None, None] * curves, host_share).min(axis=1)
    low, high, _ = interval(grid, chi2, float(chi2.min()))
    return low, high


def interval(x: FloatArray, chi2: FloatArray, lowest: float) -> tuple[float, float, bool]:
    """Where chi-square rises by 1 on either side; at an end of `x`, the one-sided 95 % limit on the other side."""
    best = int(chi2.argmin())
    at_end = best in (0, x.size - 1)
    rise = ONE_SIDED_95 if at_end else ONE_SIGMA
    inside = np.flatnonzero(chi2 <= lowest + rise)
    first, last = (int(inside[0]), int(inside[-1])) if inside.size else (best, best)
    return _crossing(x, chi2, first, -1, lowest + rise), _crossing(x, chi2, last, 1, lowest + rise), at_end


def _crossing(x: FloatArray, chi2: FloatArray, at: int, step: int, level: float) -> float:
    """Where the profile meets `level` between `at` and its neighbour; the end of the range where there is none."""
    there = at + step
    if not 0 <= there < x.size or chi2[there] == chi2[at]:
        return float(x[at])
    share = np.clip((level - chi2[at]) / (chi2[there] - chi2[at]), 0.0, 1.0)
    return float(x[at] + share * (x[there] - x[at]))


def _vertex(x: FloatArray, y: FloatArray, best: int) -> float:
    """Lowest point of the parabola through the best and its neighbours, on an even grid."""
    if best in (0, x.size - 1):
        return float(x[best])
    left, here, right = y[best - 1], y[best], y[best + 1]
    bend = left - 2.0 * here + right
    shift = 0.5 * (left - right) / bend if bend > 0 else 0.0
    return float(x[best] + np.clip(shift, -1.0, 1.0) * (x[best + 1] - x[best]))


def _between(x: FloatArray, curves: FloatArray, at: float) -> FloatArray:
    return np.array([np.interp(at, x, column) for column in curves.T])


def power_curves(wave_um: FloatArray) -> FloatArray:
    """(wavelength/0.55 micron)^-alpha for every alpha tried, shape (S, B)."""
    return (np.asarray(wave_um) / REFERENCE_UM) ** -ALPHAS[:, None]


def law_curves(
    wave_um: FloatArray, curve: Callable[[FloatArray, float], FloatArray], r_v: FloatArray
) -> FloatArray:
    """A(wavelength)/A(V) at the pivots for each R_V, shape (S, B)."""
    return np.stack([curve(np.asarray(wave_um, dtype=float), float(ratio)) for ratio in r_v])
