"""Non-negative least squares for many small problems at once."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tui.model import FloatArray

BoolArray = NDArray[np.bool_]

RIDGE = 1e-11  # on columns of unit length: costs at most RIDGE * |x|^2 in chi-square, keeps twin columns solvable
GRADIENT = 1e-9  # a column whose gradient (unit column) is below this times |target| is left out


def nnls_batch(columns: FloatArray, target: FloatArray, start: FloatArray | None = None) -> FloatArray:
    """The x >= 0 that minimises |columns x - target|, problem by problem.

    Args:
        columns: shape (K, n, m); a column of zeros keeps x = 0.
        target: shape (K, n).
        start: shape (K, m), >= 0, a feasible point to start from; zeros by default.
    Returns:
        x, shape (K, m), >= 0. Feasible always; optimal up to `RIDGE` and `GRADIENT`.
    Source:
        The active-set method of Lawson & Hanson 1974, Solving Least Squares Problems, ch. 23, run in step for all
        problems on their normal equations.

    >>> nnls_batch(np.array([[[1.0, 1.0], [0.0, 1.0]]]), np.array([[2.0, -1.0]])).round(6).tolist()
    [[2.0, 0.0]]
    """
    length = np.linalg.norm(columns, axis=1)
    unit = columns / np.where(length > 0, length, 1.0)[:, None, :]
    gram = np.matmul(unit.transpose(0, 2, 1), unit)
    gram[:, np.arange(gram.shape[1]), np.arange(gram.shape[1])] += RIDGE
    slope = np.matmul(unit.transpose(0, 2, 1), target[:, :, None])[:, :, 0]
    x = np.zeros_like(slope) if start is None else np.where(length > 0, start * length, 0.0)
    tolerance = GRADIENT * np.linalg.norm(target, axis=1)
    _descend(gram, slope, x, barred=length <= 0, tolerance=tolerance)
    return x / np.where(length > 0, length, 1.0)


def _descend(gram: FloatArray, slope: FloatArray, x: FloatArray, barred: BoolArray, tolerance: FloatArray) -> None:
    """Lawson & Hanson's two loops as one: every turn each problem either takes a column in or steps back."""
    passive = x > 0
    entered = np.full(len(x), -1)
    rows = np.arange(len(x))
    for _ in range(4 * x.shape[1] + 8):
        if not len(rows):
            return
        free = solve_passive(gram[rows], slope[rows], passive[rows])
        bad = passive[rows] & (free <= 0)
        stuck = bad.any(axis=1)
        back = rows[stuck]
        if len(back):
            _step_back(x, free[stuck], bad[stuck], passive, barred, entered, back)
        good = rows[~stuck]
        x[good] = free[~stuck]
        gradient = slope[good] - np.matmul(gram[good], x[good][:, :, None])[:, :, 0]
        gradient[passive[good] | barred[good]] = -np.inf
        entering = np.argmax(gradient, axis=1)
        grows = gradient[np.arange(len(good)), entering] > tolerance[good]
        entered[good[grows]] = entering[grows]
        passive[good[grows], entering[grows]] = True
        rows = np.sort(np.concatenate([back, good[grows]]))


def _step_back(
    x: FloatArray,
    free: FloatArray,
    bad: BoolArray,
    passive: BoolArray,
    barred: BoolArray,
    entered: NDArray[np.int64],
    rows: NDArray[np.int64],
) -> None:
    """Go from x towards the free solution until the first coefficient reaches zero; drop it.

    A column that entered and must leave at once (its gradient was rounding) is barred, so no cycle can form.
    """
    here = x[rows]
    gap = np.where(bad, here - free, 1.0)
    reach = np.where(bad, here / np.where(gap > 0, gap, 1.0), np.inf)
    step = np.minimum(reach.min(axis=1), 1.0)
    here = here + step[:, None] * (free - here)
    leaves = bad & (reach <= step[:, None] * (1 + 1e-12))
    turn = np.arange(len(rows))
    fresh = entered[rows]
    at_once = (fresh >= 0) & leaves[turn, fresh] & (step <= 0)
    barred[rows[at_once], fresh[at_once]] = True
    passive[rows] &= ~leaves
    x[rows] = np.where(passive[rows], np.maximum(here, 0.0), 0.0)


def solve_passive(gram: FloatArray, slope: FloatArray, passive: BoolArray) -> FloatArray:
    """Unconstrained solution in the passive columns, zero elsewhere; shapes (K, m, m), (K, m), (K, m)."""
    count = passive.sum(axis=1)
    width = int(count.max(initial=0))
    out = np.zeros_like(slope)
    if not width:
        return out
    order = np.argsort(~passive, axis=1, kind="stable")[:, :width]
    row = np.arange(len(slope))[:, None]
    real = np.arange(width)[None, :] < count[:, None]
    small = gram[row[:, :, None], order[:, :, None], order[:, None, :]]
    small = np.where(real[:, :, None] & real[:, None, :], small, 0.0)
    small[:, np.arange(width), np.arange(width)] += ~real
    right = np.where(real, slope[row, order], 0.0)
    out[row, order] = np.where(real, np.linalg.solve(small, right[:, :, None])[:, :, 0], 0.0)
    return out
