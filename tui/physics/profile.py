"""Intervals by profile likelihood: how far one parameter can go while the others make the best of it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tui.model import FloatArray
from tui.physics.composite import A2, A3, WIDTH, X2, X3
from tui.physics.fitting import FitBatch
from tui.physics.likelihood import curvature, residuals
from tui.physics.looking import held_down

RISE_68 = 1.0  # of -2 ln L, two-sided 68.3 % (Wilks 1938)
RISE_95 = 2.71  # one-sided 95 % at a bound
TRIES = 6
LEAST = 1e-12  # an amplitude this small is none
OWN_NODES = 8  # temperatures tried beside a held amplitude
STEPS, TOLERANCE = 5, 1e-2
CLOSE = 0.03  # of the square root of the rise
FARTHER = (1.6, 2.6, 4.5)  # times the first crossing: where a further dip is looked for


@dataclass(frozen=True, slots=True, eq=False)
class Intervals:
    """Ends per candidate and parameter column, each (M, 8); NaN for columns that the model does not free."""

    low: FloatArray
    high: FloatArray
    limit: np.ndarray  # bool: the best value lies at a bound, and the other end is a 95 % limit


def intervals(batch: FitBatch, held: np.ndarray | None = None) -> Intervals:
    """Profile intervals of every free parameter, errors frozen at the last pass.

    Args:
        held: (8,) bool, parameters that were held in the fit: they stay, and have no interval.
    """
    m, free = len(batch.problem), list(batch.model.free)
    held = np.zeros(WIDTH, bool) if held is None else held
    low, high = batch.kit.bounds(batch.problem.av_max)
    ends = np.full((2, m, WIDTH), np.nan)
    limit = np.zeros((m, WIDTH), bool)
    directions, scale = _directions(batch)
    sides = np.array([-1.0, 1.0])
    column = np.repeat(free, 2 * m)
    place = np.repeat(np.arange(len(free)), 2 * m)
    side = np.tile(np.repeat(sides, m), len(free))
    row = np.tile(np.arange(m), 2 * len(free))
    best = batch.x[row, column]
    edge = np.where(side < 0, low[row, column], high[row, column])
    other = np.where(side < 0, high[row, column], low[row, column])
    near = batch.kit.near(batch.problem.av_max)[row, column]
    at_other = np.abs(best - other) <= near
    goal = np.where(at_other, RISE_95, RISE_68)
    todo = np.flatnonzero((np.abs(edge - best) > near) & ~held[column])
    found = best.copy()
    if todo.size:
        way = _Way.along(column[todo], best[todo], edge[todo], side[todo])
        ray = _Ray(batch, held, row[todo], column[todo], goal[todo], directions[row, place][todo], way)
        found[todo] = way.value(slice(None), _reach(ray, way.room, scale[row, place][todo] / way.unit))
    for index, s in enumerate(sides):
        chosen = side == s
        ends[index, row[chosen], column[chosen]] = found[chosen]
    limit[row[at_other], column[at_other]] = True
    ends[:, :, held], limit[:, held] = np.nan, False
    return Intervals(ends[0], ends[1], limit)


def _directions(batch: FitBatch) -> tuple[FloatArray, FloatArray]:
    """How the free parameters move per unit of each one (M, P, P), and each one's 1 sigma (M, P), from the curvature."""
    state = residuals(batch.problem, batch.kit, batch.errors, batch.x, batch.prediction)
    normal = curvature(state)
    at_bound = batch.at_bounds()
    normal = np.where(at_bound[:, :, None] | at_bound[:, None, :], 0.0, normal)
    diagonal = np.einsum("mpp->mp", normal)
    root = np.sqrt(np.where(diagonal > 0, diagonal, 1.0))
    matrix = normal / root[:, :, None] / root[:, None, :]
    place = np.arange(root.shape[1])
    matrix[:, place, place] = 1.0 + 1e-9
    inverse = np.linalg.inv(matrix) / root[:, :, None] / root[:, None, :]
    variance = np.einsum("mpp->mp", inverse)
    single = np.sqrt(np.maximum(np.einsum("mpp->mp", curvature(state)), 1e-300))
    sigma = np.where(at_bound, 1.0 / single, np.sqrt(np.maximum(variance, 1e-300)))
    direction = inverse / np.maximum(variance, 1e-300)[:, None, :]
    direction = np.where(at_bound[:, None, :], 0.0, direction).transpose(0, 2, 1)
    direction[:, place, place] = 1.0
    return direction, sigma


@dataclass(frozen=True, slots=True, eq=False)
class _Way:
    """How K values move from their best: by steps of themselves, or, for amplitudes, of their logarithms."""

    best: FloatArray
    edge: FloatArray
    side: FloatArray
    unit: FloatArray  # what one step is worth at the best value
    room: FloatArray  # steps to the edge; an amplitude of LEAST is none
    by_factors: np.ndarray  # bool

    @classmethod
    def along(cls, column: np.ndarray, best: FloatArray, edge: FloatArray, side: FloatArray) -> _Way:
        """Amplitudes that are not zero may span decades: they move by factors."""
        by_factors = np.isin(column, (A2, A3)) & (best > LEAST)
        safe = np.where(by_factors, best, 1.0)
        decades = np.abs(np.log(np.maximum(np.where(by_factors, edge, 1.0), LEAST) / safe))
        room = np.where(by_factors, decades, np.abs(edge - best))
        return cls(best, edge, side, np.where(by_factors, best, 1.0), room, by_factors)

    def value(self, some: np.ndarray | slice, step: FloatArray) -> FloatArray:
        """Values of the searches `some` after `step`."""
        best, side = self.best[some], self.side[some]
        factor = np.exp(np.where(self.by_factors[some], side * step, 0.0))
        moved = np.where(self.by_factors[some], best * factor, best + side * step)
        return np.where(step >= self.room[some] * (1 - 1e-9), self.edge[some], moved)


@dataclass(frozen=True, slots=True, eq=False)
class _Ray:
    """K searches: from a candidate's best value of one column, to one side."""

    batch: FitBatch
    held: np.ndarray  # (8,) bool
    row: np.ndarray
    column: np.ndarray
    goal: FloatArray
    direction: FloatArray  # (K, P)
    way: _Way

    def root(self, some: np.ndarray, step: FloatArray) -> FloatArray:
        """Square root of the profile's rise at `step`, in units of the goal, for the searches `some`."""
        row, column = self.row[some], self.column[some]
        free = list(self.batch.model.free)
        place = np.arange(some.size)
        start = self.batch.x[row].copy()
        start[:, free] += self.direction[some] * (self.way.side[some] * self.way.unit[some] * step)[:, None]
        start[place, column] = self.way.value(some, step)
        held = np.tile(self.held, (some.size, 1))
        start = np.where(held, self.batch.x[row], start)
        held[place, column] = True
        start = self._with_own_parameter(start, row, column, held)
        cost = self._down(start, row, held, STEPS)
        return np.sqrt(np.maximum(cost - self.batch.cost[row], 0.0) / self.goal[some])

    def _down(self, x: FloatArray, row: np.ndarray, held: np.ndarray, steps: int) -> FloatArray:
        here = self.batch
        return held_down(here.problem, here.kit, here.errors, x, row, held, steps, TOLERANCE)[1]

    def _with_own_parameter(
        self, start: FloatArray, row: np.ndarray, column: np.ndarray, held: np.ndarray
    ) -> FloatArray:
        """`start` where a held amplitude begins beside the best of several temperatures (or slopes) of its source.

        An amplitude may span decades while the source's temperature makes up for it: no straight way leads there.
        """
        for number, (amplitude, own) in enumerate(((A2, X2), (A3, X3))):
            some = np.flatnonzero((column == amplitude) & ~self.held[own])
            if not some.size or own not in self.batch.model.free:
                continue
            grid = self.batch.kit.further[number]
            tried = np.repeat(start[some][None], OWN_NODES + 1, axis=0)
            tried[1:, :, own] = np.linspace(grid.low, grid.high, OWN_NODES)[:, None]
            flat = tried.reshape(-1, WIDTH)
            times = OWN_NODES + 1
            cost = self._down(flat, np.tile(row[some], times), np.tile(held[some], (times, 1)), 0)
            best = cost.reshape(times, -1).argmin(axis=0)
            start[some] = tried[best, np.arange(some.size)]
        return start


def _reach(ray: _Ray, room: FloatArray, scale: FloatArray) -> FloatArray:
    """Distance (K,) from the best value beyond which the profile stays above the goal, or `room`."""
    guess = np.where(np.isfinite(scale) & (scale > 0), scale * np.sqrt(ray.goal), room / 20)
    everyone = np.arange(room.size)
    zero, unknown = np.zeros(room.size), np.full(room.size, np.nan)
    step = _cross(ray, everyone, np.minimum(guess, room), (zero, zero), (unknown, unknown), room)
    far = np.minimum(step * np.array(FARTHER)[:, None], room)  # (F, K)
    asked = np.flatnonzero((far > step * 1.05).ravel())
    if not asked.size:
        return step
    root = np.full(far.shape, np.inf)
    root.ravel()[asked] = ray.root(asked % room.size, far.ravel()[asked])
    inside = root < 1.0
    some = np.flatnonzero(inside.any(axis=0))  # chi-square dips again beyond: the interval is the hull of what is allowed
    if some.size:
        last = len(FARTHER) - 1 - inside[::-1, some].argmax(axis=0)
        start, nothing = far[last, some], np.full(some.size, np.nan)
        onward = np.minimum(start * 1.3, room[some])
        step[some] = _cross(ray, some, onward, (start, root[last, some]), (nothing, nothing), room[some])
    return step


def _cross(
    ray: _Ray,
    some: np.ndarray,
    step: FloatArray,
    inner: tuple[FloatArray, FloatArray],
    outer: tuple[FloatArray, FloatArray],
    room: FloatArray,
) -> FloatArray:
    """Where the root of the rise passes 1, by bracketing; ends are (step, root), NaN where not yet known."""
    (inner, inner_root), (outer, outer_root) = (tuple(v.copy() for v in pair) for pair in (inner, outer))
    step, answer = step.copy(), step.copy()
    live = np.arange(some.size)
    for attempt in range(TRIES):
        root = ray.root(some[live], step[live])
        answer[live] = step[live]
        below = root < 1.0
        inner[live], inner_root[live] = np.where(below, step[live], inner[live]), np.where(below, root, inner_root[live])
        outer[live] = np.where(below, outer[live], step[live])
        outer_root[live] = np.where(below, outer_root[live], root)
        done = (np.abs(root - 1.0) < CLOSE) | (below & (step[live] >= room[live] * (1 - 1e-9)))
        live = live[~done]
        if not live.size or attempt == TRIES - 1:
            break
        step[live] = _next_step(inner[live], inner_root[live], outer[live], outer_root[live], room[live])
    return answer


def _next_step(
    inner: FloatArray, inner_root: FloatArray, outer: FloatArray, outer_root: FloatArray, room: FloatArray
) -> FloatArray:
    """Where the root of the rise should be 1: between the ends known, else stretched outwards, at most fivefold."""
    bracketed = np.isfinite(outer)
    share = (1.0 - inner_root) / np.maximum(np.where(bracketed, outer_root, 2.0) - inner_root, 1e-9)
    between = inner + np.clip(share, 0.08, 0.92) * (np.where(bracketed, outer, 0.0) - inner)
    stretched = inner * np.clip(1.0 / np.maximum(inner_root, 1e-3), 1.05, 5.0)
    return np.minimum(np.where(bracketed, between, stretched), room)


