"""The paper's own example, simulated error rates, and refusal where nothing can be identified."""

from __future__ import annotations

import numpy as np
import pytest

from tui.consensus.agreement import MISSING
from tui.consensus.dawid_skene import dawid_skene, rate_intervals
from tui.errors import InputError

# Dawid & Skene 1979, Appl. Statist. 28, 20, Table 1: 45 patients; observer 1 three times, observers 2 to 5 once each.
TABLE_1 = (
    "1111111 3334334 1122122 2223121 2223222 2223322 1222111 3333433 2222223 2322223 4444444 2223343 1111111 2223212 "
    "1211111 1112111 1111111 1111111 2222221 2221322 2222222 2222221 2223222 2212222 1111111 1111111 2322222 1111111 "
    "1111111 1121121 1111111 3333233 1111111 2222222 2223232 4334343 2212232 2323233 3333432 1111111 1111111 1212111 "
    "2322222 1211111 2222222"
)
OBSERVER = (0, 0, 0, 1, 2, 3, 4)


def counted(responses: np.ndarray, kinds: int) -> np.ndarray:
    """Responses (R, N), MISSING where none -> counts (R, N, kinds)."""
    return (responses[:, :, None] == np.arange(kinds)).astype(float)


def test_the_papers_example():
    counts = np.zeros((5, 45, 4))
    for patient, row in enumerate(TABLE_1.split()):
        for observer, cell in zip(OBSERVER, row, strict=True):
            counts[observer, patient, int(cell) - 1] += 1
    fit = dawid_skene(counts, 4)
    # Their Table 2 prints the marginals and observer 1's rates to two digits.
    assert fit.prevalence.round(2).tolist() == [0.40, 0.42, 0.11, 0.07]
    printed = [[0.89, 0.11, 0.00, 0.00], [0.07, 0.88, 0.05, 0.00], [0.00, 0.34, 0.66, 0.00]]
    assert fit.rates[0].round(2)[:3].tolist() == printed
    assert fit.is_converged


def simulate(dice, rates, candidates, prevalence=0.3, answered=0.8):
    """Responses (R, N) of reviewers with these rates (R, 2, 3), and the truth."""
    truth = (dice.random(candidates) < prevalence).astype(int)
    draws = dice.random((len(rates), candidates))
    responses = (draws[:, :, None] > np.cumsum(rates, axis=2)[:, truth, :]).sum(axis=2)
    return np.where(dice.random(draws.shape) < answered, responses, MISSING), truth


RATES = np.array(
    [
        [[0.85, 0.05, 0.10], [0.10, 0.80, 0.10]],
        [[0.70, 0.20, 0.10], [0.05, 0.90, 0.05]],
        [[0.90, 0.05, 0.05], [0.30, 0.60, 0.10]],
        [[0.60, 0.10, 0.30], [0.15, 0.75, 0.10]],
    ]
)


def test_simulated_rates_lie_in_their_intervals():
    dice = np.random.default_rng(79)
    inside = []
    for _ in range(5):
        responses, _ = simulate(dice, RATES, 800)
        low, high = rate_intervals(counted(responses, 3), 2, dice, draws=120)
        inside.append((low <= RATES) & (high >= RATES))
    assert np.mean(inside) >= 0.88  # of 120 numbers, 95 % nominal; rows sum to 1, so they are not independent
    fit = dawid_skene(counted(responses, 3), 2)
    assert fit.rates == pytest.approx(RATES, abs=0.12) and fit.prevalence[1] == pytest.approx(0.3, abs=0.06)


def test_more_candidates_bring_it_closer():
    dice = np.random.default_rng(80)
    responses, truth = simulate(dice, RATES, 60_000, answered=1.0)
    fit = dawid_skene(counted(responses, 3), 2)
    assert fit.rates == pytest.approx(RATES, abs=0.02)
    assert np.mean(fit.posterior.argmax(axis=1) == truth) > 0.9


def test_likelihood_never_falls():
    responses, _ = simulate(np.random.default_rng(3), RATES, 200)
    likelihoods = [dawid_skene(counted(responses, 3), 2, max_iterations=n).log_likelihood for n in range(1, 25)]
    assert np.all(np.diff(likelihoods) >= -1e-9)


def test_two_reviewers_are_refused():
    responses, _ = simulate(np.random.default_rng(1), RATES[:2], 500)
    with pytest.raises(InputError, match="three reviewers"):
        dawid_skene(counted(responses, 3), 2)


def test_three_who_do_not_overlap_are_refused():
    responses, _ = simulate(np.random.default_rng(1), RATES[:3], 300)
    for reviewer in range(3):
        responses[reviewer, reviewer * 100 : (reviewer + 1) * 100] = MISSING  # any two overlap, never all three
    with pytest.raises(InputError):
        dawid_skene(counted(responses, 3), 2)


def test_two_reviewers_with_controls_are_recovered():
    dice = np.random.default_rng(2)
    responses, truth = simulate(dice, RATES[:2], 4000)
    known = np.where(np.arange(4000) < 1500, truth, MISSING)
    fit = dawid_skene(counted(responses, 3), 2, known)
    assert fit.rates == pytest.approx(RATES[:2], abs=0.05)
    assert np.array_equal(fit.posterior[:1500].argmax(axis=1), truth[:1500])


def test_controls_do_not_set_the_prevalence():
    dice = np.random.default_rng(4)
    responses, truth = simulate(dice, RATES, 3000, prevalence=0.2)
    controls, control_truth = simulate(dice, RATES, 1000, prevalence=0.9)
    known = np.concatenate([np.full(3000, MISSING), control_truth])
    fit = dawid_skene(counted(np.hstack([responses, controls]), 3), 2, known)
    assert fit.prevalence[1] == pytest.approx(truth.mean(), abs=0.03)


def test_a_reviewer_apart_is_left_out():
    responses, _ = simulate(np.random.default_rng(6), RATES, 400, answered=1.0)
    responses[3, 5:] = MISSING
    fit = dawid_skene(counted(responses, 3), 2)
    assert fit.identified.tolist() == [0, 1, 2] and np.all(np.isnan(fit.rates[3]))


def test_a_weight_stands_for_so_many_candidates():
    responses, _ = simulate(np.random.default_rng(8), RATES, 500)
    kinds, repeats = np.unique(responses, axis=1, return_counts=True)
    plain = dawid_skene(counted(responses, 3), 2)
    weighted = dawid_skene(counted(kinds, 3), 2, weights=repeats.astype(float))
    assert weighted.rates == pytest.approx(plain.rates, abs=1e-9)
    assert weighted.log_likelihood == pytest.approx(plain.log_likelihood, abs=1e-6)
