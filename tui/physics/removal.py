"""Star-only chi-square with some bands left out, errors held as the full fit left them: many removals at once."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tui.model import FloatArray
from tui.physics.composite import STAR
from tui.physics.fitting import FitBatch, fit

PRODUCT = 250_000  # multiplications of one matrix product: what stays in cache and waits for no threads


def chi2_without(batch: FitBatch, row: NDArray[np.intp], dropped: NDArray[np.bool_]) -> FloatArray:
    """Chi-square of the star alone with bands removed, the whole range of T_eff searched each time.

    The scale is closed form on every temperature of the grid and the minimum is refined by a parabola through
    three of them. Where instruments share a common error the fit itself is run instead.

    Args:
        batch: star-only fits of N candidates.
        row: shape (M,), candidate of each removal.
        dropped: shape (M, B), bands removed.
    Returns:
        shape (M,); limits count as in the fits.
    """
    if batch.errors.whiten is not None:
        return fit(batch.problem.take(row).without(dropped), STAR).chi2
    ln_flux = batch.kit.star.ln_flux
    grid = np.exp(ln_flux - ln_flux.max(axis=1, keepdims=True))
    size = max(1, PRODUCT // grid.size)
    square = grid**2
    parts = [_part(batch, grid, square, row[i : i + size], dropped[i : i + size]) for i in range(0, row.size, size)]
    return np.concatenate(parts) if parts else np.empty(0)


def _part(
    batch: FitBatch, grid: FloatArray, square: FloatArray, row: NDArray[np.intp], dropped: NDArray[np.bool_]
) -> FloatArray:
    problem, sigma = batch.problem, batch.errors.sigma[row]
    flux = problem.flux_jy[row]
    weight = np.where(problem.detected[row] & ~dropped, sigma**-2.0, 0.0)
    own = np.maximum(square @ weight.T, 1e-300)  # (T, M)
    cross = np.maximum(grid @ (weight * flux).T, 0.0)
    scale = np.divide(cross, own, out=own)
    chi2 = np.subtract(np.sum(weight * flux**2, axis=1), np.multiply(cross, scale, out=cross), out=cross)
    limited = problem.limited[row] & ~dropped
    for column in np.flatnonzero(limited.any(axis=0)):
        some = np.flatnonzero(limited[:, column])
        over = (scale[:, some] * grid[:, column, None] - flux[some, column]) / sigma[some, column]
        chi2[:, some] += np.maximum(over, 0.0) ** 2
    return parabola_minimum(chi2)


def parabola_minimum(values: FloatArray) -> FloatArray:
    """Lowest value along the first axis (T, M), refined by a parabola through it and its neighbours; >= 0.

    >>> float(parabola_minimum(np.array([[4.0], [1.0], [2.0]]))[0].round(3))  # vertex of 1 - x + 2 x^2
    0.875
    """
    column = np.arange(values.shape[1])
    lowest = values.argmin(axis=0)
    middle = np.clip(lowest, 1, values.shape[0] - 2)
    left, here, right = (values[middle + step, column] for step in (-1, 0, 1))
    bend = left - 2.0 * here + right
    with np.errstate(divide="ignore", invalid="ignore"):
        vertex = here - (right - left) ** 2 / (8.0 * bend)
    inside = (lowest == middle) & (bend > 0)
    return np.maximum(np.where(inside, vertex, values[lowest, column]), 0.0)
