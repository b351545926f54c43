"""How far reviewers agree beyond chance. Where a statistic is 0/0 it is undefined, and stays None, never 1.

Each statistic is a function of sums over candidates. `..._parts` gives the summands, one row a candidate (or a check of
one), and the statistic itself takes their total: so rows can be summed by candidate and resampled fast.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
from numpy.random import Generator
from numpy.typing import NDArray

from tui.errors import InputError
from tui.model import FloatArray

IntArray = NDArray[np.int64]
MISSING = -1
PREVALENT = 0.9  # share of one class from which on kappa and alpha say little; our choice
UNDEFINED_DRAWS = 0.05  # more resamples than this without a value: no interval; our choice
DRAW_BLOCK = 100  # resamples held in memory at once


def tallied(ratings: IntArray, classes: int) -> FloatArray:
    """Counts (N, classes) of ratings (R reviewers, N candidates), coded 0 ... classes - 1, or MISSING."""
    counts = np.zeros((ratings.shape[1], classes))
    for value in range(classes):
        counts[:, value] = np.sum(ratings == value, axis=0)
    return counts


def raw_parts(counts: FloatArray) -> FloatArray:
    """Rows (pairs of reviewers who agree, pairs of reviewers), shape (N, 2)."""
    total = counts.sum(axis=1)
    return np.column_stack([np.sum(counts * (counts - 1), axis=1) / 2, total * (total - 1) / 2])


def raw_from(total: FloatArray) -> float | None:
    """Share of pairs that agree, of the summed `raw_parts`."""
    return float(total[0] / total[1]) if total[1] > 0 else None


def raw_agreement(counts: FloatArray) -> float | None:
    """Share of all pairs of ratings on one candidate that are the same; counts (N, classes)."""
    return raw_from(raw_parts(counts).sum(axis=0))


def alpha_parts(counts: FloatArray) -> FloatArray:
    """Rows (observed disagreement of a candidate, its counts by class), shape (N, 1 + classes).

    A candidate with a single rating can be paired with nothing and gives zeros.
    """
    paired = np.where(counts.sum(axis=1, keepdims=True) >= 2, counts, 0.0)
    total = paired.sum(axis=1)
    unlike = total**2 - np.sum(paired**2, axis=1)
    return np.column_stack([unlike / np.maximum(total - 1, 1), paired])


def alpha_from(total: FloatArray) -> float | None:
    """Krippendorff's alpha of the summed `alpha_parts`."""
    pairable = total[1:].sum()
    expected = pairable**2 - np.sum(total[1:] ** 2)
    return float(1 - (pairable - 1) * total[0] / expected) if expected > 0 else None


def krippendorff_alpha(counts: FloatArray) -> float | None:
    """Krippendorff's alpha for classes without order; ratings may be missing.

    Args:
        counts: shape (N, classes), how many reviewers put each candidate in each class.
    Returns:
        1 perfect, 0 chance; None where fewer than two classes are in use among candidates rated twice.
    Source:
        Krippendorff 2011, Computing Krippendorff's Alpha-Reliability, section C (nominal, missing data).
    """
    return alpha_from(alpha_parts(counts).sum(axis=0))


def confusion_parts(one: IntArray, two: IntArray, classes: int) -> FloatArray:
    """Two reviewers' ratings (N,) each: one row a candidate with a 1 in the cell (one, two), shape (N, classes**2)."""
    parts = np.zeros((len(one), classes * classes))
    both = np.flatnonzero((one != MISSING) & (two != MISSING))
    parts[both, one[both] * classes + two[both]] = 1.0
    return parts


def kappa_from(total: FloatArray) -> float | None:
    """Cohen's kappa of the summed `confusion_parts`."""
    side = round(len(total) ** 0.5)
    return cohen_kappa(total.reshape(side, side))


def cohen_kappa(confusion: FloatArray) -> float | None:
    """Cohen's kappa of two reviewers.

    Args:
        confusion: shape (classes, classes), counts; rows the one, columns the other.
    Returns:
        None without candidates, or where both used one and the same class only.
    Source:
        Cohen 1960, Educ. Psychol. Meas. 20, 37.
    """
    total = confusion.sum()
    if total == 0:
        return None
    observed = np.trace(confusion) / total
    expected = float(confusion.sum(axis=0) @ confusion.sum(axis=1)) / total**2
    return float((observed - expected) / (1 - expected)) if expected < 1 else None


def fleiss_kappa(counts: FloatArray) -> float | None:
    """Fleiss' kappa, for candidates that all have the same number of ratings.

    Args:
        counts: shape (N, classes).
    Returns:
        None without candidates, or where one class only is in use.
    Raises:
        InputError: the numbers of ratings differ, or are below two: then only alpha is defined.
    Source:
        Fleiss 1971, Psychol. Bull. 76, 378, equations 3, 5, 7.
    """
    if len(counts) == 0:
        return None
    raters = counts.sum(axis=1)
    if raters[0] < 2 or np.any(raters != raters[0]):
        raise InputError("Fleiss' kappa needs the same number of ratings, two or more, on every candidate.")
    observed = float(np.mean(np.sum(counts * (counts - 1), axis=1) / (raters[0] * (raters[0] - 1))))
    expected = float(np.sum((counts.sum(axis=0) / counts.sum()) ** 2))
    return (observed - expected) / (1 - expected) if expected < 1 else None


def bootstrap_interval(
    parts: FloatArray,
    statistic: Callable[[FloatArray], float | None],
    generator: Generator,
    *,
    draws: int = 2000,
    confidence: float = 0.95,
) -> tuple[float, float] | None:
    """Percentile interval of a statistic, candidates drawn again with replacement.

    Args:
        parts: shape (N, K), one row a candidate; sum its checks first, for they are not independent.
        statistic: of a total (K,), such as `alpha_from`.
        generator: the source of chance.
    Returns:
        (low, high); None with fewer than two candidates, or where more than one resample in twenty is undefined.
    Source:
        Efron & Tibshirani 1993, An Introduction to the Bootstrap, section 13.3.
    """
    if len(parts) < 2:
        return None
    rows, repeats = np.unique(parts, axis=0, return_counts=True)  # few kinds of row: cheap at any queue length
    values: list[float] = []
    for start in range(0, draws, DRAW_BLOCK):
        weights = generator.multinomial(len(parts), repeats / len(parts), size=min(DRAW_BLOCK, draws - start))
        values += [value for total in weights @ rows if (value := statistic(total)) is not None]
    if len(values) < (1 - UNDEFINED_DRAWS) * draws:
        return None
    low, high = np.quantile(values, [(1 - confidence) / 2, (1 + confidence) / 2])
    return float(low), float(high)


def prevalence_caution(counts: FloatArray, names: Sequence[str]) -> str:
    """A sentence where one class takes nearly all ratings; empty otherwise.

    Source:
        Feinstein & Cicchetti 1990, J. Clin. Epidemiol. 43, 543: high agreement but low kappa.
    """
    total = counts.sum()
    share = counts.sum(axis=0) / total if total else np.zeros(len(names))
    commonest = int(np.argmax(share)) if len(share) else 0
    if total == 0 or share[commonest] < PREVALENT:
        return ""
    return (
        f"{100 * share[commonest]:.0f} % of these rulings say {names[commonest]}: kappa and alpha are then low, "
        "or undefined, even where reviewers nearly always agree."
    )
