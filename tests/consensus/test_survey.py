"""False discovery rates and occurrence limits against published and closed forms, and against simulation."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.stats import beta, false_discovery_control

from tui.consensus.survey import Recovery, averaged_upper_limit, q_values, strict_upper_limit, upper_limit
from tui.errors import InputError

# Benjamini & Hochberg 1995, J. R. Stat. Soc. B 57, 289, section 4: 15 p-values, 4 rejected at 0.05.
BH_P = [
    0.0001, 0.0004, 0.0019, 0.0095, 0.0201, 0.0278, 0.0298, 0.0344,
    0.0459, 0.3240, 0.4262, 0.5719, 0.6528, 0.7590, 1.0000,
]  # fmt: skip
BH_Q = [
    0.001500, 0.003000, 0.009500, 0.035625, 0.060300, 0.063857, 0.063857, 0.064500,
    0.076500, 0.486000, 0.581182, 0.714875, 0.753231, 0.813214, 1.000000,
]  # fmt: skip


def test_benjamini_hochberg_example():
    q = q_values(np.array(BH_P), 15)
    assert q.round(6).tolist() == BH_Q and np.sum(q <= 0.05) == 4


def test_q_against_scipy_on_random_p():
    p = np.random.default_rng(95).random(300) ** 2
    assert q_values(p, 300) == pytest.approx(false_discovery_control(p), abs=1e-12)


def test_q_counts_the_searched_not_the_kept():
    p = np.random.default_rng(1).random(100_000)
    kept = p[p < 0.001]  # a queue chosen for being odd, of nothing but noise
    assert np.sum(q_values(kept, len(kept)) < 0.05) == len(kept)  # by its own length it would reject all of itself
    assert np.sum(q_values(kept, len(p)) < 0.05) == 0


def test_q_of_missing_p_and_too_few_searched():
    q = q_values(np.array([np.nan, 0.01]), 10)
    assert np.isnan(q[0]) and q[1] == pytest.approx(0.1)
    with pytest.raises(InputError):
        q_values(np.array([0.1, 0.2]), 1)


@pytest.mark.parametrize("complete", [1.0, 0.5, 0.031])
def test_no_event_with_equal_completeness(complete):
    expected = min(1.0, (1 - 0.05 ** (1 / 300)) / complete)
    assert upper_limit(0, 300, complete) == pytest.approx(expected, rel=1e-9)


def test_no_event_with_unequal_completeness_solves_the_product():
    complete = np.random.default_rng(2).random(80)
    limit = upper_limit(0, np.ones(80, int), complete)
    assert np.prod(1 - limit * complete) == pytest.approx(0.05, rel=1e-9)


def test_groups_of_one_completeness_are_one_group():
    assert upper_limit(3, [40, 60], 0.5) == pytest.approx(upper_limit(3, 100, 0.5), rel=1e-9)
    assert upper_limit(10, 100, 1.0, confidence=0.975) == pytest.approx(0.176223, abs=5e-7)  # two-sided 95 % upper end


def test_a_search_that_sees_too_little_sets_no_limit():
    assert upper_limit(0, 10, 0.1) == 1.0 and upper_limit(0, 10, 0.0) == 1.0 and upper_limit(0, 0) == 1.0
    assert upper_limit(5, 5) == 1.0 and strict_upper_limit(0, 1000, [Recovery(0, 40)]) == 1.0


def test_more_survivors_raise_the_limit():
    limits = [upper_limit(k, [100, 200], [0.9, 0.4]) for k in range(6)]
    assert np.all(np.diff(limits) > 0)


def test_averaged_limit_against_adaptive_quadrature():
    limit = averaged_upper_limit(0, 500, [Recovery(18, 30)])
    density = beta(18.5, 12.5).pdf
    value, _ = quad(lambda c: (1 - limit * c) ** 500 * density(c), 0, 1, points=[0.1, 0.6], epsabs=1e-12)
    assert value == pytest.approx(0.05, rel=1e-6)


def test_averaged_limit_of_two_stages_against_simulation():
    stages = [Recovery(45, 50), Recovery(9, 20)]
    limit = averaged_upper_limit(2, 400, stages)
    dice = np.random.default_rng(92)
    complete = dice.beta(45.5, 5.5, 400_000) * dice.beta(9.5, 11.5, 400_000)
    reached = np.mean(dice.binomial(400, limit * complete) <= 2)
    assert reached == pytest.approx(0.05, abs=0.0015)  # 4 standard errors of the simulation


def test_well_known_completeness_gives_the_plain_limit():
    many = [Recovery(600_000, 1_000_000)]
    assert averaged_upper_limit(0, 200, many) == pytest.approx(upper_limit(0, 200, 0.6), rel=1e-3)


def test_strict_limit_by_its_closed_form():
    low = beta.ppf(0.025, 18, 30 - 18 + 1)  # Clopper-Pearson lower 97.5 % of 18 of 30
    assert strict_upper_limit(0, 500, [Recovery(18, 30)]) == pytest.approx((1 - 0.025 ** (1 / 500)) / low, rel=1e-9)


def test_strict_lies_above_averaged_above_plain():
    stages = [Recovery(18, 30)]
    assert strict_upper_limit(1, 500, stages) > averaged_upper_limit(1, 500, stages) > upper_limit(1, 500, 0.6)


def test_strict_limit_covers():
    dice = np.random.default_rng(34)
    truth, complete = 0.02, 0.5
    survivors, recovered = dice.binomial(200, truth * complete, 400), dice.binomial(25, complete, 400)
    limits = [
        strict_upper_limit(int(k), 200, [Recovery(int(s), 25)]) for k, s in zip(survivors, recovered, strict=True)
    ]
    assert np.mean(np.array(limits) >= truth) >= 0.95


def test_impossible_numbers():
    with pytest.raises(InputError):
        upper_limit(3, 2)
    with pytest.raises(InputError):
        upper_limit(0, 10, 1.2)
