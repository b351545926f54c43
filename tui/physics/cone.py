"""The mixture bound: how near can any non-negative mixture of natural sources come to a candidate's fluxes?

Many candidates are solved at once by column generation: a small pool of columns per candidate is solved exactly,
all columns are priced by one matrix product, the best ones join the pool. A certificate on the fine grid turns
any state of the solve, finished or not, into a chi-square that no mixture can undercut.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaincc, ndtr

from tui.model import FloatArray
from tui.physics.generators import Generators, Grid
from tui.physics.nnls_batch import nnls_batch
from tui.physics.pricing import IntArray, price, single_sources

BoolArray = NDArray[np.bool_]

GAP = 0.1  # delta w.F, in chi-square, at which a solve is finished, or
GAP_SHARE = 0.003  # this share of chi-square, where that is larger: far beyond any doubt
COARSE_ROUNDS, MIDDLE_ROUNDS, FINE_ROUNDS = 12, 6, 8
ENTERING = 12  # columns that join a pool a round
EMPTY = -1  # pool entry without a column; the unit column of band b, slack of a limit, is -2 - b


@dataclass(frozen=True, slots=True, eq=False)
class Fluxes:
    """K candidates' fluxes in B bands: shapes (K, B), covariance (K, B, B)."""

    flux: FloatArray  # Jy; the limit where `limit`
    covariance: FloatArray  # Jy^2
    present: BoolArray  # measured, to be fitted
    limit: BoolArray  # an upper limit: any flux from zero to it is as good

    def take(self, rows: IntArray) -> Fluxes:
        """Some of the candidates."""
        return Fluxes(self.flux[rows], self.covariance[rows], self.present[rows], self.limit[rows])


@dataclass(frozen=True, slots=True, eq=False)
class Bound:
    """What the bound says of K candidates."""

    chi2: FloatArray  # certified lower bound of the least chi-square; where `at_most`, an upper bound
    feasible: FloatArray  # chi-square of the best mixture found
    points: IntArray  # bands counted, n
    p: FloatArray  # the chance that a natural mixture comes out so badly, at most; at least this where `at_most`
    at_most: BoolArray  # a mixture was found that cannot be refused, so the solve was left there
    gap: FloatArray  # delta w.F: by about so much could a better mixture lower `feasible`; inf where not priced finely
    weights: FloatArray  # (K, B) v of the certificate, 1/Jy: v.g <= 0 for every natural source; zero where `at_most`
    model: FloatArray  # (K, B) Jy, of the best mixture found, slack left out
    index: IntArray  # (K, m) its columns, EMPTY where none
    scale: FloatArray  # (K, m) their scales, >= 0
    covariance: FloatArray  # (K, B, B) Jy^2, with which chi-square was taken


@dataclass(frozen=True, slots=True, eq=False)
class _White:
    """Fluxes with what whitens them."""

    flux: FloatArray
    limit: BoolArray
    whitener: FloatArray  # (K, B, B): inverse Cholesky factor, zero for absent bands
    weight: FloatArray  # (K, B): 1/sqrt(C_ii), zero for absent bands
    target: FloatArray  # (K, B): whitened flux
    points: IntArray

    def take(self, rows: IntArray) -> _White:
        return _White(*(getattr(self, name)[rows] for name in self.__slots__))


def whiten(fluxes: Fluxes) -> _White:
    """Cholesky factors of the covariance in the bands present; the others count for nothing."""
    pair = fluxes.present[:, :, None] & fluxes.present[:, None, :]
    size = fluxes.flux.shape[1]
    variance = np.where(fluxes.present, np.einsum("kbb->kb", fluxes.covariance), 1.0)
    sigma = np.sqrt(variance)
    correlation = np.where(pair, fluxes.covariance, 0.0) / (sigma[:, :, None] * sigma[:, None, :])
    correlation[:, np.arange(size), np.arange(size)] = 1.0
    if np.count_nonzero(correlation) == correlation.shape[0] * size:
        factor = correlation
    else:
        factor = np.linalg.inv(np.linalg.cholesky(correlation))
    weight = np.where(fluxes.present, 1.0 / sigma, 0.0)
    whitener = factor * weight[:, None, :] * fluxes.present[:, :, None]
    flux = np.where(fluxes.present, fluxes.flux, 0.0)
    target = np.einsum("kab,kb->ka", whitener, flux)
    points = fluxes.present.sum(axis=1)
    return _White(flux, fluxes.limit & fluxes.present, whitener, weight, target, points)


def p_bound(chi2: FloatArray, points: IntArray, signal2: FloatArray) -> FloatArray:
    """Largest chance that a mixture in the cone gives a least chi-square of `chi2` or more.

    The cone holds the true mixture's own ray, on which the least chi-square has points - 1 degrees of freedom
    unless its scale comes out negative, which happens with probability Phi(-S), S^2 = F C^-1 F (`signal2`).
    """
    freedom = np.maximum(points - 1, 1) / 2.0
    p = gammaincc(freedom, np.maximum(chi2, 0.0) / 2.0) + ndtr(-np.sqrt(np.maximum(signal2, 0.0)))
    return np.where(points > 1, np.minimum(p, 1.0), 1.0)


def certificate(
    flux: FloatArray, covariance: FloatArray, gradient: FloatArray, weight: FloatArray, delta: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """A chi-square that no mixture undercuts, and the weights v that prove it; shapes (K,) and (K, B).

    v = r - delta w has v.g <= 0 for every column g when delta >= max r.g / w.g, for any r; then for every mixture m
    v.F <= v.(F - m) <= sqrt(v C v) |F - m|. Rows of `covariance` may hold anything where `weight` is zero.

    Args:
        gradient: r, shape (K, B), 1/Jy; best r = C^-1 (F - m) at the best m, but any r is proof.
        weight: w, shape (K, B), >= 0.
        delta: shape (K,), >= 0.
    """
    v = np.where(weight > 0, gradient - delta[:, None] * weight, 0.0)
    used = np.where(weight[:, :, None] * weight[:, None, :] > 0, covariance, 0.0)
    length2 = np.einsum("ka,kab,kb->k", v, used, v)
    reach = np.maximum(np.einsum("kb,kb->k", v, flux), 0.0)
    return np.where(length2 > 0, reach**2 / np.where(length2 > 0, length2, 1.0), 0.0), v


@dataclass(slots=True, eq=False)
class _State:
    """A solve under way: the pool of each candidate and where its mixture stands."""

    index: IntArray  # (K, m)
    scale: FloatArray  # (K, m)
    model: FloatArray  # (K, B)
    gradient: FloatArray  # (K, B): C^-1 (F - model)
    chi2: FloatArray  # (K,)

    def take(self, rows: IntArray) -> _State:
        return _State(*(getattr(self, name)[rows] for name in self.__slots__))


_Parts = tuple[IntArray, _State]  # rows of the batch and where they stand


def _columns(generators: Generators, index: IntArray) -> FloatArray:
    """Columns of a pool, shape (K, B, m); zero where empty, unit where slack."""
    real = index >= 0
    columns = generators.column(np.where(real, index, 0)) * real[:, :, None]
    size = columns.shape[2]
    row, place = np.nonzero(index <= -2)
    columns[row, place] = np.eye(size)[-2 - index[row, place]]
    return columns.transpose(0, 2, 1)


def _solve_pool(generators: Generators, white: _White, index: IntArray, start: FloatArray) -> _State:
    columns = _columns(generators, index)
    scale = nnls_batch(np.matmul(white.whitener, columns), white.target, start)
    model = np.einsum("kbm,km->kb", columns, scale)
    left = np.einsum("kab,kb->ka", white.whitener, white.flux - model)
    gradient = np.einsum("kab,ka->kb", white.whitener, left)
    return _State(index, scale, model, gradient, np.einsum("ka,ka->k", left, left))


def _grow(state: _State, ratio: FloatArray, best: IntArray) -> tuple[IntArray, FloatArray]:
    """New pools: the columns in use and all slack, then the blocks' best columns that would help."""
    keep = (state.scale > 0) | (state.index <= -2)
    order = np.argsort(~keep, axis=1, kind="stable")[:, : max(int(keep.sum(axis=1).max(initial=0)), 1)]
    row = np.arange(len(ratio))[:, None]
    kept = np.where(keep[row, order], state.index[row, order], EMPTY)
    scale = np.where(keep[row, order], state.scale[row, order], 0.0)
    count = min(ENTERING, ratio.shape[1])
    top = np.argpartition(-ratio, count - 1, axis=1)[:, :count]
    entering = np.where(ratio[row, top] > 0, best[row, top], EMPTY)
    return np.hstack([kept, entering]), np.hstack([scale, np.zeros(entering.shape)])


def _delta(white: _White, state: _State, ratio: FloatArray) -> FloatArray:
    """max r.g / w.g over all columns priced and all slack, not less than float32 products may have lost."""
    pull = np.abs(state.gradient) / np.where(white.weight > 0, white.weight, 1.0)
    lost = 2.0 * (white.weight.shape[1] + 2) * 2.0**-24 * pull.max(axis=1)
    slack = np.where(white.limit, state.gradient / np.where(white.weight > 0, white.weight, 1.0), 0.0).max(axis=1)
    return np.maximum(np.maximum(ratio.max(axis=1) + lost, slack), 0.0)


class _Solver:
    """One batch of candidates against one set of columns."""

    def __init__(self, generators: Generators, fluxes: Fluxes, enough: float) -> None:
        self.generators, self.fluxes, self.enough = generators, fluxes, enough
        self.white = whiten(fluxes)
        self.signal2 = np.einsum("ka,ka->k", self.white.target, self.white.target)
        self.reach = np.einsum("kb,kb->k", self.white.weight, np.abs(self.white.flux))
        count, size = fluxes.flux.shape
        self.certified = np.zeros(count)
        self.gap = np.full(count, np.inf)
        self.weights = np.zeros((count, size))

    def natural(self, rows: IntArray, chi2: FloatArray) -> BoolArray:
        """The mixture found is already good enough."""
        return p_bound(chi2, self.white.points[rows], self.signal2[rows]) >= self.enough

    def start(self) -> _State:
        """The best single sources, one from each part of the coarse grid, and all slack."""
        white, grid = self.white, self.generators.coarse
        gradient = np.einsum("kab,ka->kb", white.whitener, white.target)
        ratio, place = single_sources(grid.flux, gradient, white.weight)
        width = int(white.limit.sum(axis=1).max(initial=0))
        order = np.argsort(~white.limit, axis=1, kind="stable")[:, :width]
        slack = np.where(np.take_along_axis(white.limit, order, axis=1), -2 - order, EMPTY)
        blank = _State(slack, np.zeros(slack.shape), white.flux * 0, gradient, self.signal2)
        pool, scale = _grow(blank, ratio, grid.index[_flat(grid.flux, place)])
        return _solve_pool(self.generators, white, pool, scale)

    def rounds(self, parts: _Parts, grid: Grid | None, limit: int) -> _Parts:
        """Price and re-solve until each candidate is natural, finished, or out of rounds; None: the fine grid."""
        rows, state = parts
        ended = []
        blocks = self.generators.flux if grid is None else grid.flux
        for turn in range(limit):
            stop = self.natural(rows, state.chi2)
            ended.append((rows[stop], state.take(np.flatnonzero(stop))))
            rows, state = rows[~stop], state.take(np.flatnonzero(~stop))
            if not len(rows):
                break
            white = self.white.take(rows)
            ratio, place = price(blocks, state.gradient, white.weight)
            delta = _delta(white, state, ratio)
            gap = delta * self.reach[rows]
            if grid is None:
                self.certify(rows, state, delta, gap)
            stop = gap < np.maximum(GAP, GAP_SHARE * state.chi2)
            stop |= turn == limit - 1
            ended.append((rows[stop], state.take(np.flatnonzero(stop))))
            go = np.flatnonzero(~stop)
            best = _flat(blocks, place[go]) if grid is None else grid.index[_flat(grid.flux, place[go])]
            rows = rows[go]
            pool, scale = _grow(state.take(go), ratio[go], best)
            state = _solve_pool(self.generators, white.take(go), pool, scale)
        return _merged(ended)

    def certify(self, rows: IntArray, state: _State, delta: FloatArray, gap: FloatArray) -> None:
        """Keep the best proof so far."""
        white = self.white
        chi2, v = certificate(
            white.flux[rows], self.fluxes.covariance[rows], state.gradient, white.weight[rows], delta
        )
        better = chi2 >= self.certified[rows]
        self.certified[rows[better]] = chi2[better]
        self.weights[rows[better]] = v[better]
        self.gap[rows] = gap

    def run(self, pool: tuple[IntArray, FloatArray] | None, depth: str) -> Bound:
        """Coarse grid first unless there is a pool, then the finer grids for those still not natural."""
        rows = np.arange(len(self.reach))
        parts = rows, _solve_pool(self.generators, self.white, *pool) if pool else self.start()
        if pool is None or depth == "coarse":
            parts = self.rounds(parts, self.generators.coarse, COARSE_ROUNDS)
        if depth in ("middle", "fine"):
            parts = self.rounds(parts, self.generators.middle, MIDDLE_ROUNDS)
        if depth == "fine":
            parts = self.rounds(parts, None, FINE_ROUNDS)
        return self.bound(*parts)

    def bound(self, rows: IntArray, state: _State) -> Bound:
        """The candidates put back in order."""
        order = np.argsort(rows)
        state = state.take(order)
        row, place = np.nonzero((state.index <= -2) & (state.scale > 0))
        state.model[row, -2 - state.index[row, place]] -= state.scale[row, place]
        easy = self.natural(np.arange(len(rows)), state.chi2)
        chi2 = np.where(easy, state.chi2, self.certified)
        return Bound(
            chi2=chi2,
            feasible=state.chi2,
            points=self.white.points,
            p=p_bound(chi2, self.white.points, self.signal2),
            at_most=easy,
            gap=self.gap,
            weights=np.where(easy[:, None], 0.0, self.weights),
            model=state.model,
            index=state.index,
            scale=state.scale,
            covariance=self.fluxes.covariance,
        )


def _flat(blocks: NDArray[np.float32], place: IntArray) -> IntArray:
    """Places in blocks, shape (K, blocks), as places in the list of all columns."""
    return np.arange(blocks.shape[0]) * blocks.shape[2] + place


def wide(array: NDArray, width: int, fill: float) -> NDArray:
    """An array (K, m) with further columns of `fill` up to `width`; numpy's own pad costs ten times as much."""
    if array.shape[1] == width:
        return array
    out = np.full((len(array), width), fill, dtype=array.dtype)
    out[:, : array.shape[1]] = array
    return out


def _merged(parts: list[_Parts]) -> _Parts:
    """The parts as one, pools filled up with empty entries, so that they are priced together."""
    width = max(state.index.shape[1] for _, state in parts)
    state = _State(
        np.concatenate([wide(one.index, width, EMPTY) for _, one in parts]),
        np.concatenate([wide(one.scale, width, 0.0) for _, one in parts]),
        *(np.concatenate([getattr(one, name) for _, one in parts]) for name in ("model", "gradient", "chi2")),
    )
    return np.concatenate([rows for rows, _ in parts]), state


def mixture_bound(
    generators: Generators,
    fluxes: Fluxes,
    enough: float = 0.1,
    pool: tuple[IntArray, FloatArray] | None = None,
    depth: str = "fine",
) -> Bound:
    """Bound the least chi-square of any natural mixture, for each candidate.

    Args:
        generators: columns on the same B bands.
        fluxes: K candidates.
        enough: a mixture whose p is at least this is not improved further.
        pool: columns (K, m) and scales (K, m) to begin from, of an earlier `Bound`.
        depth: "coarse" or "middle": that grid only, which finds a mixture but proves nothing (`chi2` is then 0 where
            not `at_most`).
    """
    return _Solver(generators, fluxes, enough).run(pool, depth)
