"""Each reviewer's error rates and each candidate's likely class, from rulings alone or with controls.

Source: Dawid & Skene 1979, Appl. Statist. 28, 20 (EM for a latent class; equations 2.3 to 2.5). What is added here:
some candidates' classes may be known (controls), and a response need not be a class (`unclear`). The fit starts from
each candidate's own shares of responses, as the paper's does, so it takes reviewers to be right more often than wrong.

The model has reviewers err independently of one another. They do not: they look at the same evidence. So the posterior
is surer than it should be (`DEPENDENCE_CAUTION` goes with every number), and it never decides anything.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.random import Generator

from tui.consensus.agreement import MISSING, IntArray
from tui.errors import InputError
from tui.model import FloatArray

MIN_COMMON = 10  # candidates that three reviewers must have in common; our choice
TINY = 1e-12  # stands for a rate of 0 in logarithms
DEPENDENCE_CAUTION = (
    "Reviewers look at the same evidence and so err together; these rates and probabilities are surer than they "
    "should be. The rulings decide."
)


@dataclass(frozen=True, slots=True, eq=False)
class ErrorRates:
    """A fitted model. NaN where nothing is identified."""

    prevalence: FloatArray  # (classes,), share of each class among candidates that are no controls
    rates: FloatArray  # (R, classes, responses), P(response | class) of each reviewer
    posterior: FloatArray  # (N, classes)
    identified: IntArray  # indices of the reviewers who entered
    log_likelihood: float
    iterations: int
    is_converged: bool


def dawid_skene(
    counts: FloatArray,
    classes: int,
    known: IntArray | None = None,
    *,
    weights: FloatArray | None = None,
    tolerance: float = 1e-9,
    max_iterations: int = 5000,
) -> ErrorRates:
    """Fit prevalence and error rates by maximum likelihood.

    Args:
        counts: shape (R reviewers, N candidates, responses), how often each gave each response; the first `classes`
            responses name the classes in their order, any further one (`unclear`) names none.
        classes: how many classes there are.
        known: shape (N,), the class of each control, MISSING elsewhere.
        weights: shape (N,), how many candidates each row of `counts` stands for; one each by default.
    Raises:
        InputError: no three reviewers share MIN_COMMON candidates and no reviewer ruled on controls of every class:
            with two reviewers many sets of rates fit equally well.
    """
    known = np.full(counts.shape[1], MISSING) if known is None else known
    weights = np.ones(counts.shape[1]) if weights is None else weights
    identified = _identified(counts, classes, known, weights)
    if not len(identified):
        raise InputError(
            f"Error rates need three reviewers who ruled on the same {MIN_COMMON} candidates, "
            "or controls of every class."
        )
    patterns, inverse, repeats = _patterns(counts[identified], known, weights)
    fit = _Fit(patterns, repeats, classes, *_start(patterns, classes))
    is_converged = fit.run(tolerance, max_iterations)
    rates = np.full((counts.shape[0], classes, counts.shape[2]), np.nan)
    rates[identified] = fit.rates
    return ErrorRates(
        fit.prevalence, rates, fit.posterior[inverse], identified, fit.log_likelihood, fit.iterations, is_converged
    )


def rate_intervals(
    counts: FloatArray,
    classes: int,
    generator: Generator,
    known: IntArray | None = None,
    *,
    weights: FloatArray | None = None,
    draws: int = 200,
    confidence: float = 0.95,
) -> tuple[FloatArray, FloatArray]:
    """Percentile intervals of the rates, candidates drawn again with replacement; (low, high), each like `rates`.

    A rate fitted as 0 or 1 has no width here: so many candidates cannot tell it from a small one.
    """
    known = np.full(counts.shape[1], MISSING) if known is None else known
    weights = np.ones(counts.shape[1]) if weights is None else weights
    fitted = dawid_skene(counts, classes, known, weights=weights)
    patterns, _, repeats = _patterns(counts[fitted.identified], known, weights)
    total = int(repeats.sum())
    drawn = np.full((draws, *fitted.rates.shape), np.nan)
    start = np.nan_to_num(fitted.rates[fitted.identified], nan=1.0 / counts.shape[2])
    for draw in range(draws):
        drawn_weights = generator.multinomial(total, repeats / repeats.sum()).astype(float)
        fit = _Fit(patterns, drawn_weights, classes, fitted.prevalence, 0.99 * start + 0.01 / counts.shape[2])
        fit.run(1e-6, 500)
        drawn[draw][fitted.identified] = fit.rates
    return _quantiles(drawn, confidence)


def _quantiles(drawn: FloatArray, confidence: float) -> tuple[FloatArray, FloatArray]:
    """Along the first axis; NaN where no draw has a value."""
    low, high = np.full(drawn.shape[1:], np.nan), np.full(drawn.shape[1:], np.nan)
    has_value = ~np.all(np.isnan(drawn), axis=0)
    low[has_value], high[has_value] = np.nanquantile(
        drawn[:, has_value], [(1 - confidence) / 2, (1 + confidence) / 2], axis=0
    )
    return low, high


def _identified(counts: FloatArray, classes: int, known: IntArray, weights: FloatArray) -> IntArray:
    """Reviewers who share enough candidates with two others, or ruled on controls of every class."""
    answered = (counts.sum(axis=2) > 0).astype(float)
    found = []
    for one in range(len(answered)):
        together = (answered * answered[one] * weights) @ answered.T  # candidates that `one` and both others ruled on
        together[one, :] = together[:, one] = 0
        np.fill_diagonal(together, 0)
        controls = set(known[(answered[one] > 0) & (known != MISSING)].tolist())
        if together.max(initial=0) >= MIN_COMMON or len(controls) == classes:
            found.append(one)
    return np.array(found, dtype=np.int64)


@dataclass(frozen=True, slots=True, eq=False)
class _Patterns:
    """Candidates that got the same responses and have the same known class count as one, with a weight."""

    counts: FloatArray  # (R, P, responses)
    known: IntArray  # (P,)


def _patterns(
    counts: FloatArray, known: IntArray, weights: FloatArray
) -> tuple[_Patterns, IntArray, FloatArray]:
    reviewers, candidates, responses = counts.shape
    flat = np.column_stack([counts.transpose(1, 0, 2).reshape(candidates, -1), known])
    rows, inverse = np.unique(flat, axis=0, return_inverse=True)
    inverse = inverse.reshape(-1)
    repeats = np.bincount(inverse, weights=weights, minlength=len(rows))
    unfolded = rows[:, :-1].reshape(-1, reviewers, responses).transpose(1, 0, 2)
    return _Patterns(unfolded, rows[:, -1].astype(np.int64)), inverse, repeats


def _start(patterns: _Patterns, classes: int) -> tuple[None, FloatArray]:
    """No rates yet, but a posterior: each candidate's own shares of responses (equation 3.1 of the paper)."""
    shares = patterns.counts.sum(axis=0)[:, :classes]
    total = shares.sum(axis=1, keepdims=True)
    return None, np.where(total > 0, shares / np.maximum(total, 1), 1 / classes)


class _Fit:
    """Expectation maximisation on weighted patterns, from rates (R, classes, responses) or a posterior (P, classes)."""

    def __init__(
        self, patterns: _Patterns, weights: FloatArray, classes: int, prevalence: FloatArray | None, start: FloatArray
    ) -> None:
        self.patterns, self.weights, self.classes = patterns, weights, classes
        self.iterations, self.log_likelihood = 0, -np.inf
        unknown = patterns.known == MISSING
        self._counted = unknown if weights[unknown].sum() > 0 else np.ones_like(unknown)  # whose class is by chance
        if prevalence is None:
            self.posterior = self._pinned(start)
            self._maximise()
        else:
            self.prevalence, self.rates = prevalence, start

    def run(self, tolerance: float, max_iterations: int) -> bool:
        """Iterate until the log likelihood per unit of weight gains less than `tolerance`."""
        for self.iterations in range(1, max_iterations + 1):
            before = self.log_likelihood
            self._expect()
            self._maximise()
            if self.log_likelihood - before < tolerance * self.weights.sum():
                return True
        return False

    def _expect(self) -> None:
        logs = np.log(np.maximum(np.nan_to_num(self.rates, nan=1.0), TINY))
        joint = np.einsum("rpl,rkl->pk", self.patterns.counts, logs)
        joint += np.where(self._counted[:, None], np.log(np.maximum(self.prevalence, TINY)), 0.0)
        joint = np.where(self._allowed(), joint, -np.inf)
        peak = joint.max(axis=1, keepdims=True)
        scaled = np.exp(joint - peak)
        self.posterior = scaled / scaled.sum(axis=1, keepdims=True)
        self.log_likelihood = float(self.weights @ (peak[:, 0] + np.log(scaled.sum(axis=1))))

    def _maximise(self) -> None:
        weighted = self.posterior * self.weights[:, None]
        drawn = weighted[self._counted].sum(axis=0)
        self.prevalence = drawn / drawn.sum()
        given = np.einsum("pk,rpl->rkl", weighted, self.patterns.counts)
        total = given.sum(axis=2, keepdims=True)
        self.rates = np.where(total > 0, given / np.where(total > 0, total, 1), np.nan)

    def _allowed(self) -> FloatArray:
        known = self.patterns.known[:, None]
        return (known == MISSING) | (known == np.arange(self.classes))

    def _pinned(self, posterior: FloatArray) -> FloatArray:
        """The posterior, with controls put where they are known to be."""
        return np.where((self.patterns.known == MISSING)[:, None], posterior, self._allowed().astype(float))
