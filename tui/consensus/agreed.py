"""How far a team agreed, from first, sealed rulings: over all, by check, by pair of reviewers, and with the program."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from itertools import combinations

import numpy as np
from numpy.random import Generator

from tui.consensus import agreement as ag
from tui.consensus.agreement import MISSING, IntArray
from tui.consensus.controls import lean_followed
from tui.consensus.dawid_skene import DEPENDENCE_CAUTION, dawid_skene, rate_intervals
from tui.consensus.proportion import Rate
from tui.errors import InputError
from tui.model import CHECKS, SURE, FloatArray, Ruling

RESPONSES = (*SURE, "unclear")  # the first two are classes too
CODES = {word: code for code, word in enumerate(RESPONSES)}
DRAWS = 1000  # resamples of each interval: 95 % ends to some 2 % of the width


@dataclass(frozen=True, slots=True)
class Agreed:
    """Agreement on one check, or over all. None is undefined, never perfect."""

    rulings: int  # first, sealed ones
    rated: int  # candidates (over all: candidates and checks) that two or more ruled on
    pairs: int  # pairs of rulings compared
    raw: float | None = None  # share of pairs that say the same
    alpha: float | None = None  # Krippendorff
    interval: tuple[float, float] | None = None  # of alpha, 95 %, candidates drawn again
    fleiss: float | None = None  # only where all that were ruled twice have equally many rulings
    caution: str = ""  # prevalence


@dataclass(frozen=True, slots=True)
class PairAgreed:
    """Agreement of two reviewers over all checks."""

    one: str  # reviewer id
    two: str
    rated: int
    raw: float | None
    kappa: float | None  # Cohen
    interval: tuple[float, float] | None


@dataclass(frozen=True, slots=True)
class ReviewerRates:
    """One reviewer's fitted answers to each true class, with 95 % intervals: class -> response -> (rate, low, high)."""

    reviewer_id: str
    rates: Mapping[str, Mapping[str, tuple[float, float, float]]]


@dataclass(frozen=True, slots=True)
class TeamAgreement:
    """All that can be said of agreement."""

    overall: Agreed
    checks: Mapping[str, Agreed]
    pairs: tuple[PairAgreed, ...]
    lean: Rate
    lean_by_check: Mapping[str, Rate]
    error_rates: tuple[ReviewerRates, ...] = ()
    error_rates_note: str = ""  # why there are none, or the caution that goes with them
    reviewers: tuple[str, ...] = field(default=())  # ids, in the order of joining

    @property
    def weakest(self) -> str:
        """The check with the lowest alpha; empty where none is defined."""
        known = {check: one.alpha for check, one in self.checks.items() if one.alpha is not None}
        return min(known, key=known.__getitem__, default="")


def team_agreement(
    first: Sequence[Ruling],
    adequate: Mapping[str, bool | None],
    reviewers: Sequence[str],
    generator: Generator,
    truth: Mapping[str, str] | None = None,
) -> TeamAgreement:
    """Measure it.

    Args:
        first: first, sealed rulings (`history.first_sealed`), of all candidates.
        adequate: digest of cited evidence -> its `adequate`.
        reviewers: ids, in the order in which pairs are named.
        generator: the source of chance for the intervals.
        truth: control -> nature, where the truth file is at hand: it helps to identify error rates.
    """
    units, ratings = _ratings(first, reviewers)
    candidates = np.unique([name for name, _ in units], return_inverse=True)[1] if units else np.zeros(0, np.int64)
    of_check = np.array([check for _, check in units])
    error_rates, note = _error_rates(ratings, units, reviewers, generator, truth or {})
    return TeamAgreement(
        overall=_agreed(ratings, candidates, generator),
        checks={check: _agreed(ratings[:, of_check == check], None, generator) for check in CHECKS},
        pairs=_pairs(ratings, candidates, reviewers, generator),
        lean=lean_followed(first, adequate),
        lean_by_check={
            check: lean_followed((ruling for ruling in first if ruling.check == check), adequate) for check in CHECKS
        },
        error_rates=error_rates,
        error_rates_note=note,
        reviewers=tuple(reviewers),
    )


def _ratings(first: Iterable[Ruling], reviewers: Sequence[str]) -> tuple[list[tuple[str, str]], IntArray]:
    """The (candidate, check) that were ruled on, sorted, and the responses (R, N) to them."""
    answers = {(one.candidate, one.check, one.reviewer_id): CODES[one.ruling] for one in first}
    units = sorted({(name, check) for name, check, _ in answers})
    place = {unit: column for column, unit in enumerate(units)}
    row = {reviewer_id: number for number, reviewer_id in enumerate(reviewers)}
    ratings = np.full((len(reviewers), len(units)), MISSING, np.int64)
    for (name, check, reviewer_id), code in answers.items():
        if reviewer_id in row:
            ratings[row[reviewer_id], place[name, check]] = code
    return units, ratings


def _agreed(ratings: IntArray, candidates: IntArray | None, generator: Generator) -> Agreed:
    """One line of agreement; `candidates` (N,) says which columns are of one star, None that each is its own."""
    counts = ag.tallied(ratings, len(RESPONSES))
    twice = counts[counts.sum(axis=1) >= 2]
    parts = ag.alpha_parts(counts)
    pairs = ag.raw_parts(counts).sum(axis=0) if len(counts) else np.zeros(2)
    return Agreed(
        rulings=int(counts.sum()),
        rated=len(twice),
        pairs=int(pairs[1]),
        raw=ag.raw_from(pairs),
        alpha=ag.alpha_from(parts.sum(axis=0)),
        interval=_interval(parts, candidates, ag.alpha_from, generator),
        fleiss=_fleiss(twice),
        caution=ag.prevalence_caution(twice, RESPONSES),
    )


def _interval(parts: FloatArray, candidates: IntArray | None, statistic, generator: Generator):
    """Bootstrap over candidates; those that nothing can be compared on do not enter."""
    if candidates is not None:
        summed = np.zeros((int(candidates.max(initial=-1)) + 1, parts.shape[1]))
        np.add.at(summed, candidates, parts)
        parts = summed
    compared = parts[np.any(parts != 0, axis=1)]
    if statistic(compared.sum(axis=0)) is None:
        return None
    return ag.bootstrap_interval(compared, statistic, generator, draws=DRAWS)


def _fleiss(counts: FloatArray) -> float | None:
    try:
        return ag.fleiss_kappa(counts)
    except InputError:
        return None  # unequal numbers of rulings: alpha is the statistic for those


def _pairs(
    ratings: IntArray, candidates: IntArray, reviewers: Sequence[str], generator: Generator
) -> tuple[PairAgreed, ...]:
    found = []
    for one, two in combinations(range(len(reviewers)), 2):
        parts = ag.confusion_parts(ratings[one], ratings[two], len(RESPONSES))
        total = parts.sum(axis=0)
        rated = int(total.sum())
        if rated:
            raw = float(np.trace(total.reshape(len(RESPONSES), -1)) / rated)
            interval = _interval(parts, candidates, ag.kappa_from, generator)
            found.append(PairAgreed(reviewers[one], reviewers[two], rated, raw, ag.kappa_from(total), interval))
    return tuple(found)


def _error_rates(
    ratings: IntArray,
    units: Sequence[tuple[str, str]],
    reviewers: Sequence[str],
    generator: Generator,
    truth: Mapping[str, str],
) -> tuple[tuple[ReviewerRates, ...], str]:
    """Dawid & Skene over all checks together, or why not."""
    known = np.array([known_class(truth.get(name, ""), check) for name, check in units], np.int64)
    if not len(known):
        return (), "No first, sealed rulings yet."
    columns, repeats = np.unique(np.vstack([ratings, known]), axis=1, return_counts=True)
    counts = (columns[:-1, :, None] == np.arange(len(RESPONSES))).astype(float)
    weights = repeats.astype(float)
    try:
        fit = dawid_skene(counts, len(SURE), columns[-1], weights=weights)
    except InputError as refusal:
        return (), str(refusal)
    low, high = rate_intervals(counts, len(SURE), generator, columns[-1], weights=weights)
    found = tuple(_reviewer_rates(reviewers[r], fit.rates[r], low[r], high[r]) for r in fit.identified)
    return found, DEPENDENCE_CAUTION


def known_class(nature: str, check: str) -> int:
    """The class of one check of a control: `explains` on its nature; on nature `none`, `short` everywhere.

    On the other checks of a control of some nature nothing is known: an adequate fit there may be right too.
    """
    if nature == check:
        return CODES["explains"]
    return CODES["short"] if nature == "none" else MISSING


def _reviewer_rates(reviewer_id: str, rates: FloatArray, low: FloatArray, high: FloatArray) -> ReviewerRates:
    return ReviewerRates(
        reviewer_id,
        {
            truth: {
                response: (float(rates[k, j]), float(low[k, j]), float(high[k, j]))
                for j, response in enumerate(RESPONSES)
            }
            for k, truth in enumerate(SURE)
        },
    )
