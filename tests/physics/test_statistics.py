"""Tails, criteria and adequacy against printed tables, scipy and closed forms."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import pytest
from scipy import stats

from tui.physics.statistics import adequate, aic, bic, chi2_tail, ln_chi2_tail, sigma_of_ln_p

# Upper 5 % points of chi-square, dof 1..10: Fisher & Yates 1963, Table IV, as in every textbook
FIVE_PER_CENT = (3.841, 5.991, 7.815, 9.488, 11.070, 12.592, 14.067, 15.507, 16.919, 18.307)


@pytest.mark.parametrize(("dof", "printed"), list(enumerate(FIVE_PER_CENT, start=1)))
def test_printed_five_per_cent_points(dof, printed):
    low, high = chi2_tail([printed + 0.0005, printed - 0.0005], dof)
    assert low < 0.05 < high


@pytest.mark.parametrize("dof", [1, 2, 5, 12, 40])
def test_tail_against_scipy(dof):
    chi2 = np.linspace(0.0, 300.0, 61)
    assert chi2_tail(chi2, dof) == pytest.approx(stats.chi2.sf(chi2, dof), rel=1e-10)
    assert ln_chi2_tail(chi2, dof) == pytest.approx(stats.chi2.logsf(chi2, dof), rel=1e-9, abs=1e-12)


def test_no_degree_of_freedom_has_no_tail():
    assert np.isnan(chi2_tail([1.0, 5.0], [0, -1])).all()


def exact_ln_tail(chi2, dof):
    """Even dof: Q = exp(-x) sum of x^k/k!, k < dof/2, x = chi2/2; summed in exact fractions."""
    x = Fraction(chi2) / 2
    total = sum(x**k / math.factorial(k) for k in range(dof // 2))
    return -float(x) + math.log(total.numerator) - math.log(total.denominator)


@pytest.mark.parametrize("chi2", [900, 1500, 4000, 100000])
@pytest.mark.parametrize("dof", [2, 6, 14, 40])
def test_far_tail_against_the_closed_form(chi2, dof):
    assert float(ln_chi2_tail(float(chi2), dof)) == pytest.approx(exact_ln_tail(chi2, dof), rel=1e-10)


def test_far_tail_of_one_degree_is_the_normal_tail():
    # Q(1/2, z^2/2) = 2 (1 - Phi(z)); scipy.stats.norm.logsf
    z = np.array([30.0, 38.0, 45.0, 100.0])
    assert ln_chi2_tail(z**2, 1) == pytest.approx(np.log(2) + stats.norm.logsf(z), rel=1e-10)


def test_far_tail_joins_the_near_one():
    chi2 = np.linspace(1250.0, 1400.0, 301)  # the tail leaves the range of doubles here
    assert np.ptp(np.diff(ln_chi2_tail(chi2, 9))) < 1e-3


def test_sigma_of_p_against_scipy():
    p = np.array([0.9, 0.5, 0.1, 1e-3, 1e-12, 1e-200])
    assert sigma_of_ln_p(np.log(p)) == pytest.approx(stats.norm.isf(p), rel=1e-9, abs=1e-9)
    # two-sided 1 to 5 sigma: 0.3173, 0.0455, 2.70e-3, 6.33e-5, 5.73e-7
    two = np.array([3.173105e-01, 4.550026e-02, 2.699796e-03, 6.334248e-05, 5.733031e-07])
    assert sigma_of_ln_p(np.log(two / 2)) == pytest.approx([1, 2, 3, 4, 5], abs=2e-7)


def test_sigma_of_p_too_small_for_a_double():
    sigma = sigma_of_ln_p([-2000.0, -50000.0])
    assert stats.norm.logsf(sigma) == pytest.approx([-2000.0, -50000.0], rel=1e-9)


@pytest.mark.parametrize(
    ("chi2", "points", "dof", "answer"),
    [(6.63, 3, 1, True), (6.64, 3, 1, False), (9.22, 2, 0, False), (9.20, 2, 0, None), (1.0, 2, -1, None), (0.0, 0,
     -2, None)],
    ids=["at 1 %", "below 1 %", "no dof, hopeless", "no dof, possible", "fewer points than parameters", "no point"],
)
def test_adequate(chi2, points, dof, answer):
    # 1 % points: 6.6349 at one degree of freedom, 9.2103 at two
    assert adequate(chi2, points, dof, 0.01) is answer


def test_more_points_cannot_save_what_their_own_number_refuses():
    assert adequate(20.0, 3, 12, 0.01) is False


def test_criteria():
    # Akaike 1974; Schwarz 1978, by hand: 10 + 2*3, 10 + 3 ln 12
    assert float(aic(10.0, 3)) == 16.0
    assert float(bic(10.0, 3, 12)) == pytest.approx(10 + 3 * math.log(12))
