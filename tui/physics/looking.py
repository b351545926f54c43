"""The lowest of several descents, errors frozen: from many places a few steps, on with those that may still win."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tui.model import FloatArray
from tui.physics.binding import Held
from tui.physics.components import Tables, tables_of
from tui.physics.composite import A2, A3, LN_S, Kit
from tui.physics.likelihood import Errors
from tui.physics.problem import Problem
from tui.physics.rows import Rows, rows_of, take
from tui.physics.separable import parameters
from tui.physics.walk import Walked, walk

HEATS = ((2, 20.0), (3, 8.0), (4, 3.0), (5, 1.5), (12, 0.5))  # steps, and how far behind the best a start is given up
ROUGH = 50.0  # a best cost above which starts may lie farther behind
NEAR_END = 0.1  # promised fall of the cost below which a start's end is known
NO_BETTER = 0.03  # of the cost: an end must be lower by more to be worth going on
ALIKE = 0.02  # parameters this close after a heat lead to the same minimum
KEPT = 4  # minima remembered
COARSE = 3e-3  # of the cost
FEW = 300  # rows that are not worth a group of their own
BLOCK = 4000  # rows that go down together; more would only cost memory


@dataclass(frozen=True, slots=True, eq=False)
class Minima:
    """The lowest minima of M candidates, the lowest first; the lowest again where there are fewer."""

    x: FloatArray  # (KEPT, M, 8)
    cost: FloatArray  # (KEPT, M)

    def put(self, rows: np.ndarray, some: Minima) -> Minima:
        """These with those of some candidates put in."""
        x, cost = self.x.copy(), self.cost.copy()
        x[:, rows], cost[:, rows] = some.x, some.cost
        return Minima(x, cost)

    @staticmethod
    def joined(parts: list[Minima]) -> Minima:
        """The minima of several groups of candidates, one after the other."""
        return Minima(*(np.concatenate([getattr(part, name) for part in parts], axis=1) for name in ("x", "cost")))


def put(array: FloatArray, rows: np.ndarray, some: FloatArray) -> FloatArray:
    """A copy of an array (M, ...) with some rows put in."""
    array = array.copy()
    array[rows] = some
    return array


def look(problem: Problem, kit: Kit, errors: Errors, starts: FloatArray) -> Minima:
    """Minima reached from starts (S, M, 8), of which temperatures and screens count, errors frozen.

    All starts go a few steps; those then far above the best of their candidate go no further, nor do those that are
    near their end and will not be lower. In single precision: it is enough to tell which minimum is the lowest.
    """
    tables = tables_of(kit, np.float32)
    rows = rows_of(problem, errors, kit.model.bound_pair, np.float32)
    count, m = starts.shape[:2]
    owner = np.tile(np.arange(m), count)
    theta, bounds = _bounded(tables, kit, problem.av_max, starts.reshape(count * m, -1))
    live = first_of_each(theta, owner)
    owner, theta = owner[live], theta[:, live]
    parked: list[tuple[np.ndarray, Walked]] = []
    for steps, behind in HEATS:
        at = _in_blocks(rows, tables, owner, theta, bounds, steps, COARSE)
        going, resting = _sorted_out(at, owner, m, behind)
        parked.append((owner[resting], at.take(resting)))
        owner, at = owner[going], at.take(going)
        theta = at.theta
        if not owner.size:
            break
    parked.append((owner, at))
    return _lowest(rows, tables, np.concatenate([each for each, _ in parked]), Walked.joined([at for _, at in parked]), m)


def _sorted_out(at: Walked, owner: np.ndarray, m: int, behind: float) -> tuple[np.ndarray, np.ndarray]:
    """Which rows go on, and which rest where they are; the others are given up."""
    best = np.full(m, np.inf)
    np.minimum.at(best, owner, at.cost)
    order = np.lexsort((at.cost, owner))
    mine = best[owner[order]]
    order = order[at.cost[order] <= mine + behind * (1.0 + mine / ROUGH)]
    order = order[first_of_each(np.round(at.theta[:, order] / ALIKE), owner[order])]
    leader = np.ones(order.size, bool)
    leader[1:] = owner[order][1:] != owner[order][:-1]
    end = at.cost - at.promise
    of_leader = np.full(m, np.inf)
    of_leader[owner[order[leader]]] = end[order[leader]]
    known = at.promise[order] < NEAR_END
    rests = known & ~leader & (end[order] > of_leader[owner[order]] - NO_BETTER)
    rests |= at.promise[order] <= 0
    return order[~rests], order[rests]


def _lowest(rows: Rows, tables: Tables, owner: np.ndarray, at: Walked, m: int) -> Minima:
    """The KEPT lowest rows of every candidate, of those that are alike the lowest."""
    order = np.lexsort((at.cost, owner))
    order = order[first_of_each(np.round(at.theta[:, order] / ALIKE), owner[order])]
    first = np.searchsorted(owner[order], np.arange(m))
    last = np.searchsorted(owner[order], np.arange(m), side="right")
    place = first + np.arange(KEPT)[:, None]
    chosen = order[np.where(place < last, place, first)]  # (KEPT, M)
    x = parameters(rows.unit_jy[owner], tables, at.theta, at.amplitude, at.ln_top)
    return Minima(x[chosen], at.cost[chosen].astype(float))


def _bounded(
    tables: Tables, kit: Kit, av_max: FloatArray, x: FloatArray
) -> tuple[FloatArray, tuple[FloatArray, FloatArray]]:
    """Rows (R, 8) as parameters (P, R) within bounds, and the bounds of each candidate, (P, M)."""
    columns = list(tables.columns)
    low, high = (np.ascontiguousarray(edge[:, columns].T, tables.dtype) for edge in kit.bounds(av_max))
    theta = np.ascontiguousarray(x[:, columns].T, tables.dtype)
    times = theta.shape[1] // low.shape[1]
    return np.clip(theta, np.tile(low, times), np.tile(high, times)), (low, high)


def _in_blocks(
    rows: Rows,
    tables: Tables,
    owner: np.ndarray,
    theta: FloatArray,
    bounds: tuple[FloatArray, FloatArray],
    steps: int,
    tolerance: float,
    held: Held | None = None,
) -> Walked:
    """Walk from `theta` (P, R), each row with the data of its owner; those with limits, which cost more, apart."""
    dtype, count = theta.dtype, len(tables.sources)
    single = [np.empty(owner.size, dtype) for _ in range(2)]
    found = Walked(np.empty_like(theta), *single, *(np.empty((count, owner.size), dtype) for _ in range(2)))
    with_limits = np.isin(owner, rows.limited[1])
    groups = [np.flatnonzero(~with_limits), np.flatnonzero(with_limits)] if owner.size > FEW else [np.arange(owner.size)]
    for some in (group[first : first + BLOCK] for group in groups for first in range(0, group.size, BLOCK)):
        own = owner[some]
        edges = tuple(edge[:, own] for edge in bounds)
        stays = None if held is None else held.take(some)
        at = walk(take(rows, own), tables, theta[:, some], edges, steps, tolerance, stays)
        for name in ("theta", "cost", "promise", "amplitude", "ln_top"):
            getattr(found, name)[..., some] = getattr(at, name)
    np.nan_to_num(found.cost, copy=False, nan=np.inf)
    return found


def first_of_each(theta: FloatArray, owner: np.ndarray) -> np.ndarray:
    """Column numbers, in order, without the columns of theta (P, R) that repeat an earlier one of the same owner."""
    keys = np.concatenate([owner[None], theta])
    order = np.lexsort(keys[::-1])  # stable: equal columns stay in order
    new = np.ones(order.size, bool)
    new[1:] = (keys[:, order[1:]] != keys[:, order[:-1]]).any(axis=0)
    return np.sort(order[new])


def gone_down(
    problem: Problem, kit: Kit, errors: Errors, x: FloatArray, steps: int, tolerance: float
) -> tuple[FloatArray, FloatArray]:
    """Parameters (M, 8) and cost (M,) after a descent from rows `x`, in double precision, errors frozen."""
    tables = tables_of(kit, np.float64)
    rows = rows_of(problem, errors, kit.model.bound_pair, np.float64)
    theta, bounds = _bounded(tables, kit, problem.av_max, x)
    at = _in_blocks(rows, tables, np.arange(len(problem)), theta, bounds, steps, tolerance)
    return parameters(rows.unit_jy, tables, at.theta, at.amplitude, at.ln_top), at.cost


def held_down(
    problem: Problem,
    kit: Kit,
    errors: Errors,
    x: FloatArray,
    owner: np.ndarray,
    held: np.ndarray,
    steps: int,
    tolerance: float,
) -> tuple[FloatArray, FloatArray]:
    """Parameters (R, 8) and cost (R,) after a descent from rows `x` in which some parameters stay.

    Args:
        owner: (R,) whose data a row goes by.
        held: (R, 8) bool.
    """
    tables = tables_of(kit, np.float64)
    rows = rows_of(problem, errors, kit.model.bound_pair, np.float64)
    columns = list(tables.columns)
    bounds = tuple(np.ascontiguousarray(edge[:, columns].T) for edge in kit.bounds(problem.av_max))
    sources = [column for column in (A2, A3) if column in kit.model.free]
    stays = Held(
        np.ascontiguousarray(held[:, columns].T),
        np.where(held[:, LN_S], x[:, LN_S], np.nan),
        np.ascontiguousarray(np.where(held[:, sources], x[:, sources], np.nan).T),
    )
    at = _in_blocks(rows, tables, owner, np.ascontiguousarray(x[:, columns].T), bounds, steps, tolerance, stays)
    found = parameters(rows.unit_jy[owner], tables, at.theta, at.amplitude, at.ln_top)
    return np.where(held, x, found), at.cost
