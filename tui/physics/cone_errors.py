"""The mixture bound with errors that follow the mixture: floors on its flux, the spread of stars on its starlight."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tui.model import FloatArray
from tui.physics.cone import EMPTY, BoolArray, Bound, Fluxes, mixture_bound, p_bound, whiten
from tui.physics.generators import Generators
from tui.physics.pricing import IntArray

PASSES = 8
SETTLED = 0.1  # chi-square by which the last change of the errors may still have moved the mixture, or
SETTLED_SHARE = 0.003  # this share of chi-square, where that is larger: far beyond any doubt
MONOTONE = 3  # from this pass on errors only grow, so that none swing
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
        variance = np.where(used, self.error**2 + floor**2 + spread_flux**2, 1.0)
        covariance = variance[:, :, None] * np.eye(self.flux.shape[1])
        if len(self.common):
            shared = self.common[None] * np.where(self.detected, model, 0.0)[:, None, :]
            covariance = covariance + np.einsum("kib,kic->kbc", shared, shared)
        return Fluxes(np.where(used, self.flux, 0.0), covariance, used, self.limited)

    def first(self) -> Fluxes:
        """Before any mixture: the measured fluxes are the model, and all of them starlight."""
        model = np.where(self.detected, np.maximum(self.flux, 0.0), 0.0)
        return self.fluxes(model, model * self.spread_at(np.array(FIRST_K)))


def spread_flux(generators: Generators, errors: ErrorModel, index: IntArray, scale: FloatArray) -> FloatArray:
    """Spread of the starlight in mixtures, Jy, (K, B): the sources' spreads added up, as one star's are common."""
    real = np.maximum(index, 0)
    star_k = np.where((index >= 0) & (scale > 0), generators.star_k[real], 0.0)
    return np.einsum("kmb,kmb,km->kb", generators.column(real), errors.spread_at(star_k), scale)


def consistent_bound(generators: Generators, errors: ErrorModel, enough: float) -> Bound:
    """`mixture_bound` with the errors of its own best mixture, iterated until chi-square moves by less than 0.1.

    A candidate is left as natural (`at_most`) as soon as one mixture, with its own errors, has p >= `enough`.
    """
    rows = np.arange(len(errors.flux))
    work = _Work(generators, errors, enough)
    work.solve(rows, errors.first(), None, "coarse")
    for depth in ("coarse", "middle", "fine"):
        open_rows = np.flatnonzero(~work.natural)
        for number in range(PASSES):
            if not len(open_rows):
                break
            fluxes = work.errors_of(open_rows, grow=number >= MONOTONE)
            chi2, natural = work.judge(open_rows, fluxes)
            moved = np.abs(chi2 - work.bound.feasible[open_rows]) >= np.maximum(SETTLED, SETTLED_SHARE * chi2)
            again = ~natural & (moved | ((depth != "coarse") & (number == 0)))
            work.natural[open_rows[~again & work.left[open_rows]]] = True
            open_rows = open_rows[again]
            if len(open_rows):
                work.solve(open_rows, fluxes.take(again), work.pool(open_rows), depth)
    work.natural |= work.left & ~np.isfinite(work.bound.gap)
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
        left = np.where(white.limit, np.minimum(white.flux - self.bound.model[rows], 0.0), white.flux - self.bound.model[rows])
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
        old = self.bound
        width = max(old.index.shape[1], new.index.shape[1])
        index = np.pad(old.index, ((0, 0), (0, width - old.index.shape[1])), constant_values=EMPTY)
        scale = np.pad(old.scale, ((0, 0), (0, width - old.scale.shape[1])))
        index[rows], scale[rows] = EMPTY, 0.0
        index[rows[:, None], np.arange(new.index.shape[1])] = new.index
        scale[rows[:, None], np.arange(new.index.shape[1])] = new.scale
        self.left[rows] = new.at_most
        for name in ("chi2", "feasible", "p", "gap", "weights", "model", "covariance"):
            getattr(old, name)[rows] = getattr(new, name)
        self.bound = Bound(
            old.chi2, old.feasible, old.points, old.p, self.natural, old.gap, old.weights, old.model, index, scale, old.covariance
        )
