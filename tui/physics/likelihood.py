"""The error model and -2 ln L: residuals that sum in squares to it, for many candidates at once."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import log_ndtr

from tui.model import FloatArray
from tui.physics.composite import LN_T, X2, Kit, Prediction, parallax_of
from tui.physics.problem import Problem

LN_2PI = float(np.log(2 * np.pi))
FAR_BELOW = -30.0  # sigma
PARALLAX_SCATTER = 0.115  # 0.25 mag of real dwarfs about the sequence, as a fraction of the distance


@dataclass(frozen=True, slots=True, eq=False)
class Errors:
    """Errors of one pass, frozen while parameters move."""

    sigma: FloatArray  # (M, B) Jy, total, 1 where nothing
    whiten: FloatArray | None = None  # (M, B, B): inverse root of the correlations where instruments share an error
    ln_det: FloatArray | None = None  # (M,): ln determinant of the detections' covariance
    shared: FloatArray | None = None  # (M, K, B): what each instrument's bands share, in units of sigma

    def take(self, rows: np.ndarray) -> Errors:
        """The same for some candidates."""
        if self.whiten is None:
            return Errors(self.sigma[rows], None, self.ln_det[rows])
        return Errors(self.sigma[rows], self.whiten[rows], self.ln_det[rows], self.shared[rows])


def spread_at(problem: Problem, ln_t: FloatArray) -> FloatArray:
    """Fractional spread of real stars at ln T, shape (M, B): the nearest grid temperature's."""
    star = problem.templates.star
    place = np.rint((ln_t - star.low) / star.step).astype(np.intp)
    return problem.templates.spread[np.clip(place, 0, star.ln_flux.shape[0] - 1)]


def errors_for(
    problem: Problem,
    total: FloatArray,
    star: FloatArray,
    ln_t: FloatArray,
    second: tuple[FloatArray, FloatArray] | None = None,
) -> Errors:
    """sigma^2 = measurement^2 + (floor max(F, model))^2 + (spread F_star)^2, and the common term if any.

    Args:
        total, star: (M, B) Jy, model flux and the star's share of it, of the last pass.
        ln_t: (M,), ln T_eff of the last pass, for the spread.
        second: the same of a second star, whose spread is its own.
    """
    used = problem.detected | problem.limited
    floor = problem.templates.floor * np.maximum(np.where(problem.detected, problem.flux_jy, 0.0), total)
    variance = problem.error_jy**2 + floor**2 + (spread_at(problem, ln_t) * star) ** 2
    if second is not None:
        variance += (spread_at(problem, second[1]) * second[0]) ** 2
    sigma = np.where(used, np.sqrt(variance), 1.0)
    ln_det = np.sum(np.where(problem.detected, 2 * np.log(sigma), 0.0), axis=1)
    if not problem.common.size:
        return Errors(sigma, None, ln_det)
    shared = problem.common[None] * np.where(problem.detected, total, 0.0)[:, None, :] / sigma[:, None, :]
    whiten, ln_det_shared = whitener(shared)
    return Errors(sigma, whiten, ln_det + ln_det_shared, shared)


def errors_of(problem: Problem, x: FloatArray, seen: Prediction) -> Errors:
    """Errors that follow parameter rows `x` (M, 8) and what they predict."""
    second = None if seen.second is None else (seen.second, x[:, X2])
    return errors_for(problem, seen.flux, seen.star, x[:, LN_T], second)


def whitener(shared: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Inverse root of I + sum of s s' over instruments, (M, B, B), and the ln of its determinant, (M,).

    As no band belongs to two instruments, each term has its own bands and the root is closed:
    (I + s s')^(-1/2) = I - (1 - 1/sqrt(1 + s.s)) s s'/s.s.

    Args:
        shared: shape (M, K, B), common errors in units of sigma; no band in two of the K rows.
    """
    size = np.einsum("mkb,mkb->mk", shared, shared)
    share = (1.0 - 1.0 / np.sqrt(1.0 + size)) / np.maximum(size, 1e-300)
    root = np.eye(shared.shape[2]) - np.einsum("mkb,mk,mkc->mbc", shared, share, shared, optimize=True)
    return root, np.log1p(size).sum(axis=1)


@dataclass(frozen=True, slots=True, eq=False)
class Residuals:
    """Residuals (M, R) whose squares sum to -2 ln L less its constant, and derivatives (M, P, R).

    R is the number of bands, and one more for a bound pair's parallax.
    """

    value: FloatArray
    slopes: FloatArray

    @property
    def cost(self) -> FloatArray:
        """Sum of squares, shape (M,)."""
        return np.einsum("mb,mb->m", self.value, self.value)


def curvature(state: Residuals) -> FloatArray:
    """Half the second derivative of the cost, Gauss-Newton, shape (M, P, P)."""
    return state.slopes @ state.slopes.transpose(0, 2, 1)


def residuals(problem: Problem, kit: Kit, errors: Errors, x: FloatArray, prediction: Prediction) -> Residuals:
    """Detections, limits and, for a bound pair, the parallax."""
    m, b = problem.flux_jy.shape
    width = b + kit.model.bound_pair
    value = np.empty((m, width))
    slopes = np.empty((m, prediction.slopes.shape[1], width))
    pull = (problem.flux_jy - prediction.flux) / errors.sigma
    value[:, :b] = np.where(problem.detected, pull, 0.0)
    gain = np.where(problem.detected, -1.0 / errors.sigma, 0.0)
    if problem.limited.any():
        root, dpull = limit_residual(pull[problem.limited])
        value[:, :b][problem.limited] = root
        gain[problem.limited] = -dpull / errors.sigma[problem.limited]
    np.multiply(prediction.slopes, gain[:, None, :], out=slopes[:, :, :b])
    if errors.whiten is not None:
        value[:, :b] = np.einsum("mbc,mc->mb", errors.whiten, value[:, :b])
        slopes[:, :, :b] = np.einsum("mbc,mpc->mpb", errors.whiten, slopes[:, :, :b])
    if kit.model.bound_pair:
        _add_parallax(problem, kit, x, value, slopes)
    return Residuals(value, slopes)


def limit_residual(pull: FloatArray) -> tuple[FloatArray, FloatArray]:
    """sqrt(-2 ln Phi(pull)) and its derivative with pull, pull = (limit - model)/sigma (Sawicki 2012)."""
    held = np.maximum(pull, -1e100)
    ln_phi = log_ndtr(held)
    root = np.sqrt(-2.0 * ln_phi)
    near = np.maximum(held, FAR_BELOW)
    ratio = np.exp(-0.5 * near**2 - 0.5 * LN_2PI - log_ndtr(near))
    ratio = np.where(held < FAR_BELOW, -held, ratio)  # Mills' ratio far below; exact to 1e-3 there
    return root, -ratio / np.maximum(root, 1e-12)


def parallax_sigma(problem: Problem) -> FloatArray:
    """Error of the parallax as a datum on the dwarf sequence, mas, shape (M,)."""
    return np.hypot(problem.parallax_error_mas, PARALLAX_SCATTER * problem.parallax_mas)


def _add_parallax(problem: Problem, kit: Kit, x: FloatArray, value: FloatArray, slopes: FloatArray) -> None:
    known = np.isfinite(problem.parallax_mas)
    model, slope_t = parallax_of(kit, x)
    sigma = np.where(known, parallax_sigma(problem), 1.0)
    value[:, -1] = np.where(known, (problem.parallax_mas - model) / sigma, 0.0)
    slopes[:, :, -1] = 0.0
    relative = np.where(known, -model / sigma, 0.0)
    for place, column in enumerate(kit.model.free):
        if column == LN_T:
            slopes[:, place, -1] = relative * slope_t
        elif column == 1:
            slopes[:, place, -1] = relative * 0.5


def chi_square(problem: Problem, kit: Kit, errors: Errors, x: FloatArray, prediction: Prediction) -> FloatArray:
    """Chi-square (M,): limits count max(0, (model - limit)/sigma)^2, a bound on what they can say."""
    pull = (problem.flux_jy - prediction.flux) / errors.sigma
    detected = np.where(problem.detected, pull, 0.0)
    if errors.whiten is not None:
        detected = np.einsum("mbc,mc->mb", errors.whiten, detected)
    total = np.sum(detected**2, axis=1) + np.sum(np.where(problem.limited, np.maximum(-pull, 0.0), 0.0) ** 2, axis=1)
    if kit.model.bound_pair:
        known = np.isfinite(problem.parallax_mas)
        model, _ = parallax_of(kit, x)
        total = total + np.where(known, ((problem.parallax_mas - model) / parallax_sigma(problem)) ** 2, 0.0)
    return total


def minus_2_ln_l(problem: Problem, errors: Errors, cost: FloatArray) -> FloatArray:
    """-2 ln L (M,): the cost, the determinant of the errors and the constant of the detections."""
    return cost + errors.ln_det + LN_2PI * problem.detected.sum(axis=1)
