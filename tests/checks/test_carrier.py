"""Carrier search against linear least squares done by hand, and its p against simulation."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import kstest

from tui.checks.carrier import find_carriers, removal_trials, sidak

BANDS = ("BP", "G", "RP", "J", "H", "Ks", "W1", "W2", "W3", "W4")
INSTRUMENTS = ("Gaia",) * 3 + ("2MASS",) * 3 + ("WISE",) * 4
BASIS = np.stack([np.ones(10), np.linspace(-1, 1, 10)])  # two parameters, as a star has


def linear_chi2(pulls, dropped):
    """Chi-square of a two-parameter linear fit to `pulls` without the dropped bands."""
    kept = ~dropped
    design = BASIS[:, kept].T
    rest = pulls[kept] - design @ np.linalg.lstsq(design, pulls[kept], rcond=None)[0]
    return float(rest @ rest)


def carriers_of(values):
    present = np.ones(values.shape, bool)
    trials = removal_trials(present, BANDS, INSTRUMENTS)
    without = np.array([linear_chi2(values[row], mask) for row, mask in zip(trials.row, trials.dropped, strict=True)])
    star = np.array([linear_chi2(row, np.zeros(10, bool)) for row in values])
    return find_carriers(trials, BANDS, star, np.full(len(values), 10.0), without, values)


def test_one_bad_band_is_found_with_its_own_pull():
    values = np.random.default_rng(1).normal(size=(1, 10))
    values[0, 9] += 9.0
    (carrier,) = carriers_of(values)
    assert carrier.name == "W4" and carrier.bands == ("W4",)
    assert carrier.tried == 13  # ten bands and three instruments
    kept = BASIS[:, :9].T
    fit, *_ = np.linalg.lstsq(kept, values[0, :9], rcond=None)
    spread = 1.0 + BASIS[:, 9] @ np.linalg.inv(kept.T @ kept) @ BASIS[:, 9]  # variance of the prediction and the datum
    assert carrier.pull == pytest.approx((values[0, 9] - BASIS[:, 9] @ fit) / np.sqrt(spread), rel=1e-9)
    assert carrier.p_without > 0.01 > carrier.p


def test_a_bad_instrument_is_named_as_one():
    values = np.random.default_rng(2).normal(size=(1, 10))
    values[0, 3:6] += np.array([6.0, -6.0, 6.0])
    (carrier,) = carriers_of(values)
    assert carrier.name == "2MASS" and carrier.bands == ("J", "H", "Ks")


def test_p_is_fair_when_nothing_is_wrong():
    # The removals share data, so Sidak's bound is on the safe side; it must not be below the nominal rate by much.
    values = np.random.default_rng(3).normal(size=(1500, 10))
    p = np.array([carrier.p for carrier in carriers_of(values)])
    for level in (0.01, 0.05, 0.2):
        rate = np.mean(p < level)
        assert rate < level + 3 * np.sqrt(level * (1 - level) / 1500)
    single = np.array([sidak(p1, 1) for p1 in np.random.default_rng(4).uniform(size=400)])
    assert kstest(single, "uniform").pvalue > 0.001


def test_no_removal_leaves_a_fit_without_freedom():
    present = np.zeros((2, 10), bool)
    present[0, :3] = True  # one instrument of three bands: nothing may be taken out
    present[1, :4] = True
    trials = removal_trials(present, BANDS, INSTRUMENTS)
    assert 0 not in trials.row.tolist()
    assert [trials.names[i] for i in np.flatnonzero(trials.row == 1)] == ["BP", "G", "RP", "J"]


def test_sidak_by_hand():
    assert sidak(0.05, 1) == pytest.approx(0.05)
    assert sidak(0.05, 3) == pytest.approx(1 - 0.95**3)
    assert sidak(1e-30, 18) == pytest.approx(1.8e-29)
    assert sidak(1.0, 4) == 1.0
