"""What a queue says about the survey behind it: false discoveries, and limits on how common the sought stars are.

A limit holds only for what the search could have seen. Until a background rate is given, survivors give upper limits
only: some of them may be nothing.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from tui.consensus.proportion import CONFIDENCE, lower_bound, upper_bound
from tui.errors import InputError
from tui.model import FloatArray

NODES = 160  # of the quadrature over an uncertain completeness: 1e-6 of the limit, see its test
HALVINGS = 60  # of the interval 0 to 1: to rounding


def q_values(p_values: FloatArray, n_searched: int) -> FloatArray:
    """False discovery rate at which each candidate would be let through, noise alone considered.

    Args:
        p_values: shape (N,), of the candidates that the search kept, its smallest; NaN where none was computed.
        n_searched: how many stars were searched, not how many were kept.
    Returns:
        q (N,), at most 1; NaN where p is.
    Raises:
        InputError: fewer stars searched than p-values given.
    Source:
        Benjamini & Hochberg 1995, J. R. Stat. Soc. B 57, 289: q_(i) = min over j >= i of n_searched p_(j) / j.

    >>> q_values(np.array([0.01, 0.0001, 0.5]), n_searched=100).round(4).tolist()
    [0.5, 0.01, 1.0]
    """
    q = np.full(len(p_values), np.nan)
    order = np.argsort(p_values, kind="stable")[: int(np.sum(~np.isnan(p_values)))]
    if n_searched < len(order):
        raise InputError(f"{n_searched} stars searched cannot have given {len(order)} candidates.")
    ratio = n_searched * p_values[order] / np.arange(1, len(order) + 1)
    q[order] = np.minimum(np.minimum.accumulate(ratio[::-1])[::-1], 1.0)
    return q


@dataclass(frozen=True, slots=True)
class Recovery:
    """An injection test: how many of the injected were recovered."""

    recovered: int
    injected: int


def upper_limit(
    events: int, n_searched: FloatArray | Sequence[int] | int, completeness: FloatArray | Sequence[float] | float = 1.0,
    *, confidence: float = CONFIDENCE,
) -> float:  # fmt: skip
    """One-sided upper limit of the share of stars that are of the sought kind.

    Args:
        events: survivors that may be such: unexplained + pending.
        n_searched: stars searched, or of each group of equal completeness.
        completeness: probability that such a star would be among the survivors, of each group.
        confidence: 0.95 one-sided; for the upper end of a two-sided 95 % interval give 0.975, and say so.
    Returns:
        r, the root of P(at most `events` | r) = 1 - confidence, each star of group i an event with probability r c_i;
        1.0 where no r up to 1 is excluded, and then the search sets no limit.
    Source:
        No event: the product over stars of (1 - r c_i) = 0.05, with equal c: (1 - 0.05**(1/N)) / c. Else Clopper &
        Pearson 1934, Biometrika 26, 404, divided by c.
    """
    stars, complete = np.broadcast_arrays(
        np.atleast_1d(np.asarray(n_searched, float)), np.atleast_1d(np.asarray(completeness, float))
    )
    _require(events, stars, complete)
    if len(stars) == 1:
        if complete[0] == 0:
            return 1.0
        return min(1.0, upper_bound(min(events, int(stars[0])), int(stars[0]), 1 - confidence) / float(complete[0]))
    return _root(lambda share: _at_most(events, stars, share * complete), 1 - confidence)


def averaged_upper_limit(
    events: int, n_searched: int, recoveries: Sequence[Recovery], *, confidence: float = CONFIDENCE
) -> float:
    """One-sided upper limit with an uncertain completeness averaged over.

    Args:
        recoveries: injection tests of the stages that a star must pass one after the other (search, vetting); each
            stage's completeness has the density Beta(s + 1/2, m - s + 1/2), and their product is averaged over.
    Returns:
        r as in `upper_limit`, of the averaged probability; 1.0 where the search sets no limit.
    Source:
        Cousins & Highland 1992, Nucl. Instrum. Methods A 320, 331, with Jeffreys' prior.
    """
    complete, weights = _completeness_nodes(recoveries)
    _require(events, np.array([float(n_searched)]), complete)

    def average(share: float) -> float:
        return float(weights @ _binomial_at_most(events, n_searched, share * complete))

    return _root(average, 1 - confidence)


def strict_upper_limit(
    events: int, n_searched: int, recoveries: Sequence[Recovery], *, confidence: float = CONFIDENCE
) -> float:
    """One-sided upper limit that holds whatever the completeness: half the error to it, half to the count.

    Each stage's completeness is taken at its exact lower bound, the half of the error shared among the stages
    (Bonferroni); at 95 % with one stage: lower bound at 97.5 %, count with 0.025.
    """
    half = (1 - confidence) / 2
    complete = 1.0
    for stage in recoveries:
        complete *= lower_bound(stage.recovered, stage.injected, half / len(recoveries))
    return upper_limit(events, n_searched, complete, confidence=1 - half)


def _require(events: int, stars: FloatArray, complete: FloatArray) -> None:
    if events < 0 or np.any(stars < 0) or events > stars.sum():
        raise InputError(f"{events} survivors cannot come from {stars.sum():.0f} stars searched.")
    if np.any((complete < 0) | (complete > 1)):
        raise InputError("A completeness lies between 0 and 1.")


def _completeness_nodes(recoveries: Sequence[Recovery]) -> tuple[FloatArray, FloatArray]:
    """Values and weights of the product of the stages' completeness: quadrature in each stage's quantile."""
    from scipy.special import betaincinv

    nodes, weights = np.polynomial.legendre.leggauss(NODES)
    root, half = (nodes + 1) / 2, weights / 2  # quantile = root**2: the small completenesses decide, crowd them
    complete, weight = np.ones(1), np.ones(1)
    for stage in recoveries:
        found, missed = stage.recovered + 0.5, stage.injected - stage.recovered + 0.5
        values = betaincinv(found, missed, root**2)
        complete = np.outer(complete, values).ravel()
        weight = np.outer(weight, half * 2 * root).ravel()
    return complete, weight


def _binomial_at_most(events: int, stars: float, probability: FloatArray) -> FloatArray:
    """P(at most `events`) among `stars`, each with this probability."""
    from scipy.special import bdtr

    return np.ones_like(probability) if events >= stars else bdtr(float(events), int(stars), probability)


def _at_most(events: int, stars: FloatArray, probability: FloatArray) -> float:
    """P(at most `events`) over groups of stars that differ in probability: truncated convolution."""
    from scipy.stats import binom

    counts = np.arange(events + 1)
    reached = np.zeros(events + 1)
    reached[0] = 1.0
    for number, each in zip(stars, probability, strict=True):
        reached = np.convolve(reached, binom.pmf(counts, int(number), each))[: events + 1]
    return float(reached.sum())


def _root(falling: Callable[[float], float], target: float) -> float:
    """Where a function that falls from 0 to 1 meets the target; 1.0 where it never does."""
    if falling(1.0) > target:
        return 1.0
    low, high = 0.0, 1.0
    for _ in range(HALVINGS):
        middle = (low + high) / 2
        low, high = (middle, high) if falling(middle) > target else (low, middle)
    return high
