"""Exact bounds against closed forms and scipy's own."""

from __future__ import annotations

import pytest
from scipy.stats import binomtest

from tui.consensus.proportion import Rate, lower_bound, upper_bound
from tui.errors import InputError


# Clopper & Pearson 1934 with no event: 1 - alpha**(1/n), to six digits.
@pytest.mark.parametrize(
    ("trials", "one_sided", "two_sided"),
    [
        (10, 0.258866, 0.308497),
        (20, 0.139108, 0.168433),
        (30, 0.095034, 0.115703),
        (50, 0.058155, 0.071122),
        (100, 0.029513, 0.036217),
        (300, 0.009936, 0.012221),
    ],
)
def test_no_event(trials, one_sided, two_sided):
    assert round(upper_bound(0, trials, 0.05), 6) == one_sided == round(1 - 0.05 ** (1 / trials), 6)
    assert round(Rate(0, trials).high, 6) == two_sided and Rate(0, trials).low == 0.0


@pytest.mark.parametrize(
    ("events", "trials", "low", "high"),
    [(1, 20, 0.001265, 0.248733), (3, 30, 0.021117, 0.265288), (10, 100, 0.049005, 0.176223), (20, 20, 0.831567, 1.0)],
)
def test_two_sided_intervals(events, trials, low, high):
    rate = Rate(events, trials)
    assert (round(rate.low, 6), round(rate.high, 6)) == (low, high)
    scipys = binomtest(events, trials).proportion_ci(method="exact")
    assert (rate.low, rate.high) == pytest.approx((scipys.low, scipys.high), abs=1e-9)


def test_without_a_trial_nothing_is_known():
    rate = Rate(0, 0)
    assert rate.value is None and rate.low is None and rate.high is None and rate.as_dict()["value"] is None


def test_more_events_than_trials():
    with pytest.raises(InputError):
        lower_bound(3, 2, 0.05)
