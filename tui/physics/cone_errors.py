"""The mixture bound with errors that follow the mixture: floors on its flux, the spread of stars on its starlight."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from tui.model import FloatArray
from tui.physics.cone import EMPTY, BoolArray, Bound, Fluxes, certificate, mixture_bound, p_bound, whiten, wide
from tui.physics.generators import Generators
from tui.physics.pricing import IntArray

PASSES = 8
SETTLED = 0.1  # chi-square by which the last change of the errors may still have moved the mixture, or
SETTLED_SHARE = 0.003  # this share of chi-square, where that is larger: far beyond any doubt
MONOTONE = 3  # from this pass on errors only grow, so that none swing
LEAST_ERROR = 1e-12  # of the brightest band: a value of 0 without an error must not outweigh all else
WIDEN = 1.25  # in temperature, the reach of each star's spread towards hotter ones
FIRST_K = 6000.0  # temperature whose spread is taken before any mixture is known


@dataclass(frozen=True, slots=True, eq=False)
class ErrorModel:
    """What the covariance of K candidates in B bands is made of.

    sigma^2 = error^2 + (floor max(F, model))^2 + (spread F_star)^2, and common^2 model model' over an instrument.
    """

    flux: FloatArray  # (K, B) Jy; the limit where `limited`; anything where neither
    error: FloatArray  # (K, B) Jy, of the measurement itself
    detected: BoolArray  # (K, B)
    limited: BoolArray  # (K, B)
    floor: FloatArray  # (B,) fraction
    spread: FloatArray  # (N, B) fraction of the star's flux, over an even grid of ln T
    ln_t: tuple[float, float]  # first ln T and step of that grid
    common: FloatArray  # (I, B) fraction, one row an instrument

    def take(self, rows: IntArray) -> ErrorModel:
        """Some of the candidates."""
        each = (getattr(self, name)[rows] for name in ("flux", "error", "detected", "limited"))
        return ErrorModel(*each, self.floor, self.spread, self.ln_t, self.common)

    def spread_at(self, temperature_k: FloatArray) -> FloatArray:
        """Spread at the grid's nearest temperature, shape (..., B); zero where the temperature is 0."""
        ln = np.log(np.maximum(temperature_k, 1.0))
        place = np.clip(np.rint((ln - self.ln_t[0]) / self.ln_t[1]), 0, len(self.spread) - 1).astype(np.intp)
        return self.spread[place] * (np.asarray(temperature_k) > 0)[..., None]

    def fluxes(self, model: FloatArray, spread_flux: FloatArray) -> Fluxes:
        """Fluxes with the covariance for a model and the spread of its starlight, both (K, B) in Jy."""
        used = self.detected | self.limited
        floor = self.floor * np.maximum(np.where(self.detected, self.flux, 0.0), model)
        least = LEAST_ERROR * np.max(np.where(used, np.abs(self.flux), 0.0), axis=1, initial=1e-290)[:, None]
        variance = np.where(used, self.error**2 + floor**2 + spread_flux**2 + least**2, 1.0)
        covariance = variance[:, :, None] * np.eye(self.flux.shape[1])
        if len(self.common):
            shared = self.common[None] * np.where(self.detected, model, 0.0)[:, None, :]
            covariance = covariance + np.einsum("kib,kic->kbc", shared, shared)
        return Fluxes(np.where(used, self.flux, 0.0), covariance, used, self.limited)

    def first(self, temperature_k: float = FIRST_K) -> Fluxes:
        """Before any mixture: the measured fluxes are the model, and all of them light of such stars."""
        model = np.where(self.detected, np.maximum(self.flux, 0.0), 0.0)
        return self.fluxes(model, model * self.spread_at(np.array(temperature_k)))


def spread_flux(generators: Generators, errors: ErrorModel, index: IntArray, scale: FloatArray) -> FloatArray:
    """Spread of the starlight in mixtures, Jy, (K, B): the sources' spreads added up, as one star's are common."""
    real = np.maximum(index, 0)
    star_k = np.where((index >= 0) & (scale > 0), generators.star_k[real], 0.0)
    return np.einsum("kmb,kmb,km->kb", generators.column(real), errors.spread_at(star_k), scale)


def widened(spread: FloatArray, step: float) -> FloatArray:
    """Spread over ln T, each value the largest down to T/WIDEN: dust makes a cool star pass for one so much hotter."""
    count = int(round(np.log(WIDEN) / step)) + 1
    padded = np.pad(spread, ((count - 1, 0), (0, 0)), mode="edge")
    return np.lib.stride_tricks.sliding_window_view(padded, count, axis=0).max(axis=2)


def cool_limits(errors: ErrorModel) -> list[float]:
    """Temperatures (K) above which the spread of some band is lower by a third or more, the coolest first."""
    before, after = errors.spread[:-1], errors.spread[1:]
    steps = np.flatnonzero((after < before * (2 / 3)).any(axis=1))
    return [float(np.exp(errors.ln_t[0] + step * errors.ln_t[1])) for step in steps]


def consistent_bound(generators: Generators, errors: ErrorModel, refuse: float, enough: float) -> Bound:
    """`mixture_bound` with the errors of its own best mixture, iterated until chi-square moves by less than 0.1.

    A candidate is left as natural (`at_most`) as soon as one mixture, with its own errors, has p >= `enough`. What a
    mixture's errors are depends on its stars, so for those with p < `refuse` mixtures of cool stars, which scatter
    more, are tried too, unless the proof found holds with such errors as well.
    """
    work = _Work(generators, errors, enough)
    work.settle(errors.first(), ("coarse", "middle", "fine"))
    for limit_k in cool_limits(errors):
        rows = np.flatnonzero(~work.natural & (work.bound.p < refuse))
        fluxes = errors.take(rows).first(limit_k)
        rows = rows[work.proven(rows, fluxes)[1] >= refuse]
        if len(rows):
            local = errors.take(rows)
            again = _Work(generators.cooler(limit_k), local, enough)
            again.settle(local.first(limit_k), ("coarse", "middle"), hopeless=refuse)
            work.adopt(rows, again)
    return work.bound


class _Work:
    """Where the solves of all candidates stand."""

    def __init__(self, generators: Generators, errors: ErrorModel, enough: float) -> None:
        self.generators, self.errors, self.enough = generators, errors, enough
        count, size = errors.flux.shape
        self.natural = np.zeros(count, bool)
        self.left = np.zeros(count, bool)  # the last solve was left at a mixture good enough with the errors it had
        self.model = np.zeros((count, size))  # that the errors were last taken from
        self.starlight = np.zeros((count, size))
        zero = np.zeros(count)
        self.bound = Bound(
            zero.copy(), zero.copy(), (errors.detected | errors.limited).sum(axis=1), zero + 1.0, self.natural,
            zero + np.inf, np.zeros((count, size)), np.zeros((count, size)),
            np.full((count, 1), EMPTY), np.zeros((count, 1)), errors.first().covariance,
        )  # fmt: skip

    def proven(self, rows: IntArray, fluxes: Fluxes) -> tuple[FloatArray, FloatArray]:
        """Chi-square and p by the weights found, which hold for every mixture, with other errors."""
        white = whiten(fluxes)
        weights = self.bound.weights[rows]
        chi2, _ = certificate(white.flux, fluxes.covariance, weights, white.weight, np.zeros(len(rows)))
        return chi2, p_bound(chi2, white.points, np.sum(white.target**2, axis=1))

    def settle(self, fluxes: Fluxes, depths: Sequence[str], hopeless: float = 0.0) -> None:
        """Solve on each grid in turn until the errors no longer move chi-square.

        A candidate is given up where half the chi-square of a coarser grid would still have p < `hopeless`.
        """
        self.solve(np.arange(len(self.natural)), fluxes, None, "coarse")
        for depth in depths:
            rows = np.flatnonzero(~self.natural)
            if hopeless and depth != "coarse":
                rows = rows[p_bound(self.bound.feasible[rows] / 2, self.bound.points[rows], np.inf) >= hopeless]
            for number in range(PASSES):
                if not len(rows):
                    break
                fluxes = self.errors_of(rows, grow=number >= MONOTONE)
                chi2, natural = self.judge(rows, fluxes)
                moved = np.abs(chi2 - self.bound.feasible[rows]) >= np.maximum(SETTLED, SETTLED_SHARE * chi2)
                again = ~natural & (moved | ((depth != "coarse") & (number == 0)))
                if depth == "fine" and number:
                    again[again] = ~self.stands(rows[again], fluxes.take(np.flatnonzero(again)), chi2[again])
                self.natural[rows[~again & self.left[rows]]] = True
                rows = rows[again]
                if len(rows):
                    self.solve(rows, fluxes.take(again), self.pool(rows), depth)
        self.natural |= self.left

    def stands(self, rows: IntArray, fluxes: Fluxes, chi2: FloatArray) -> BoolArray:
        """Whether the proof found with other errors shows the mixture to be the nearest with these; noted where so.

        Args:
            chi2: of the mixture found, with these errors.
        """
        least, p = self.proven(rows, fluxes)
        near = chi2 - least < np.maximum(SETTLED, SETTLED_SHARE * chi2)
        done, old = rows[near], self.bound
        for name, value in (("chi2", least), ("feasible", chi2), ("p", p), ("covariance", fluxes.covariance)):
            getattr(old, name)[done] = value[near]
        return near

    def adopt(self, rows: IntArray, other: _Work) -> None:
        """Take over those of another solve of `rows` that came out natural."""
        found = np.flatnonzero(other.natural)
        self.natural[rows[found]] = True
        self.put(rows[found], other.bound, found)

    def pool(self, rows: IntArray) -> tuple[IntArray, FloatArray]:
        """The columns in use, to begin the next solve from."""
        return self.bound.index[rows], self.bound.scale[rows]

    def errors_of(self, rows: IntArray, grow: bool) -> Fluxes:
        """Fluxes with the errors of the best mixture found so far."""
        errors = self.errors.take(rows)
        model = self.bound.model[rows]
        starlight = spread_flux(self.generators, errors, self.bound.index[rows], self.bound.scale[rows])
        if grow:
            model = np.maximum(model, self.model[rows])
            starlight = np.maximum(starlight, self.starlight[rows])
        self.model[rows], self.starlight[rows] = model, starlight
        return errors.fluxes(model, starlight)

    def judge(self, rows: IntArray, fluxes: Fluxes) -> tuple[FloatArray, BoolArray]:
        """Chi-square of the best mixture with its own errors, and whether that cannot be refused."""
        white = whiten(fluxes)
        left = white.flux - self.bound.model[rows]
        left = np.where(white.limit, np.minimum(left, 0.0), left)
        chi2 = np.sum(np.einsum("kab,kb->ka", white.whitener, left) ** 2, axis=1)
        p = p_bound(chi2, white.points, np.sum(white.target**2, axis=1))
        natural = p >= self.enough
        done = rows[natural]
        self.natural[done] = True
        for name, value in (("chi2", chi2), ("feasible", chi2), ("p", p)):
            getattr(self.bound, name)[done] = value[natural]
        self.bound.weights[done] = 0.0
        self.bound.covariance[done] = fluxes.covariance[natural]
        return chi2, natural

    def solve(self, rows: IntArray, fluxes: Fluxes, pool: tuple[IntArray, FloatArray] | None, depth: str) -> None:
        """Solve some candidates anew and note where they stand."""
        new = mixture_bound(self.generators, fluxes, self.enough, pool, depth)
        self.left[rows] = new.at_most
        self.put(rows, new, np.arange(len(rows)))

    def put(self, rows: IntArray, new: Bound, places: IntArray) -> None:
        """Note what `new` says of its `places` as that of `rows`."""
        old = self.bound
        width = max(old.index.shape[1], new.index.shape[1])
        index, scale = wide(old.index, width, EMPTY), wide(old.scale, width, 0.0)
        index[rows], scale[rows] = EMPTY, 0.0
        index[rows[:, None], np.arange(new.index.shape[1])] = new.index[places]
        scale[rows[:, None], np.arange(new.index.shape[1])] = new.scale[places]
        for name in ("chi2", "feasible", "p", "gap", "weights", "model", "covariance"):
            getattr(old, name)[rows] = getattr(new, name)[places]
        self.bound = replace(old, at_most=self.natural, index=index, scale=scale)
