"""Levenberg-Marquardt in all parameters alike, amplitudes among them: a judge that shares no step with the fits."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tui.model import FloatArray
from tui.physics.composite import Kit, predict
from tui.physics.likelihood import Errors, residuals
from tui.physics.problem import Problem

STEPS = 40
SHORT_STEP = 1e-2  # damping above which steps are short
BLOCK = 20_000  # rows that go down together; more would only cost memory
TOLERANCE = 1e-5  # of the cost


@dataclass(frozen=True, slots=True, eq=False)
class Descent:
    """Where the descent ended."""

    x: FloatArray  # (M, 8)
    cost: FloatArray  # (M,)


def descend(
    problem: Problem,
    kit: Kit,
    errors: Errors,
    start: FloatArray,
    *,
    held: np.ndarray | None = None,
    steps: int = STEPS,
    tolerance: float = TOLERANCE,
) -> Descent:
    """Lowest cost reached from `start` (M, 8), parameters kept within their bounds.

    Args:
        held: (M, 8) bool, parameters that stay as they are.
    Source: Marquardt 1963, J. SIAM 11, 431; steps at an active bound are projected.
    """
    if len(problem) <= BLOCK:
        return _descend(problem, kit, errors, start, held, steps, tolerance)
    parts = []
    for first in range(0, len(problem), BLOCK):
        rows = np.arange(first, min(first + BLOCK, len(problem)))
        still = None if held is None else held[rows]
        parts.append(_descend(problem.take(rows), kit, errors.take(rows), start[rows], still, steps, tolerance))
    return Descent(np.concatenate([part.x for part in parts]), np.concatenate([part.cost for part in parts]))


def _descend(
    problem: Problem,
    kit: Kit,
    errors: Errors,
    start: FloatArray,
    held: np.ndarray | None,
    steps: int,
    tolerance: float,
) -> Descent:
    low, high = kit.bounds(problem.av_max)
    free = list(kit.model.free)
    x = np.clip(start, low, high)
    x[:, [c for c in range(x.shape[1]) if c not in free]] = start[:, [c for c in range(x.shape[1]) if c not in free]]
    fixed = np.zeros((x.shape[0], len(free)), bool) if held is None else held[:, free]
    cost = np.full(x.shape[0], np.inf)
    damping = np.full(x.shape[0], 1e-3)
    rows = np.arange(x.shape[0])
    state = residuals(problem, kit, errors, x, predict(kit, x))
    cost[:] = state.cost
    local = (problem, errors, low[:, free], high[:, free], fixed)
    value, slopes = state.value, state.slopes
    for _ in range(steps):
        here, some_errors, lo, hi, still = local
        step, promised = _step(value, slopes, damping[rows], x[rows][:, free], lo, hi, still)
        trial = x[rows]
        trial[:, free] = np.clip(trial[:, free] + step, lo, hi)
        new = residuals(here, kit, some_errors, trial, predict(kit, trial))
        new_cost = new.cost
        gain = cost[rows] - new_cost
        better = gain > 0
        x[rows[better]] = trial[better]
        cost[rows[better]] = new_cost[better]
        damping[rows] = np.where(better, damping[rows] * 0.1, damping[rows] * 8.0)
        np.copyto(value, new.value, where=better[:, None])
        np.copyto(slopes, new.slopes, where=better[:, None, None])
        short = damping[rows] > SHORT_STEP  # a small gain by a short step says little
        going = np.where(better, (gain > tolerance) | short, (promised > tolerance) & (damping[rows] < 1e6))
        if not going.any():
            break
        if not going.all():
            rows, value, slopes = rows[going], value[going], slopes[going]
            local = (here.take(going), some_errors.take(going), lo[going], hi[going], still[going])
    return Descent(x, cost)


def _step(
    value: FloatArray,
    slopes: FloatArray,
    damping: FloatArray,
    x: FloatArray,
    low: FloatArray,
    high: FloatArray,
    fixed: np.ndarray,
) -> tuple[FloatArray, FloatArray]:
    """One damped step (M, P) and the fall of cost it promises (M,); a parameter held by its bound rests."""
    normal = slopes @ slopes.transpose(0, 2, 1)
    gradient = (slopes @ value[:, :, None])[:, :, 0]
    rests = fixed | ((x <= low) & (gradient > 0)) | ((x >= high) & (gradient < 0))
    diagonal = np.einsum("mpp->mp", normal)
    scale = np.maximum(diagonal, 1e-12 * (1e-300 + diagonal.max(axis=1, keepdims=True)))
    root = np.where(rests | (scale <= 0), 1.0, np.sqrt(scale))
    moves = np.where(rests, 0.0, 1.0 / root)
    matrix = normal * moves[:, :, None] * moves[:, None, :]
    place = np.arange(x.shape[1])
    matrix[:, place, place] = np.where(rests, 1.0, matrix[:, place, place] + damping[:, None] + 1e-12)
    right = -gradient * moves
    unit = np.linalg.solve(matrix, right[:, :, None])[:, :, 0]
    return unit / root * (moves > 0), np.sum(unit * right, axis=1)
