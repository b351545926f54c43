"""Constancy of repeats against chi-square by hand and by simulation."""

from __future__ import annotations

import numpy as np
import pytest

from tui.checks.epochs import constancy, epoch_constancy
from tui.model import Candidate, Measurement


def test_chi_square_by_hand():
    # 10 +- 1, 12 +- 1, 20 +- 2: mean 106/9 weighted 1, 1, 1/4 -> 27/2.25 = 12; chi2 = 4 + 0 + 16
    outcome = constancy([10.0, 12.0, 20.0], [1.0, 1.0, 2.0])
    assert outcome.mean_jy == pytest.approx(12.0)
    assert outcome.chi2 == pytest.approx(20.0)
    assert outcome.p == pytest.approx(np.exp(-10.0))  # Q for two degrees of freedom
    assert not outcome.is_constant


def test_p_of_constant_stars_is_uniform():
    rng = np.random.default_rng(8)
    p = np.array([constancy(1 + 0.02 * rng.normal(size=4), np.full(4, 0.02)).p for _ in range(2000)])
    for level in (0.01, 0.1, 0.5):
        assert abs(np.mean(p < level) - level) < 4 * np.sqrt(level * (1 - level) / 2000)


def measured(flux, error=0.01, source="AllWISE", **more):
    return Measurement("W1", flux, error, source=source, epoch=str(flux), **more)


def test_bands_measured_once_say_nothing():
    assert epoch_constancy(Candidate("one", (measured(1.0),))) == []
    left_out = (measured(2.0, limit=True), measured(3.0, exclude=True))
    assert epoch_constancy(Candidate("one", (measured(1.0), *left_out))) == []


def test_a_change_is_a_suspicion_and_calm_is_told():
    (loud,) = epoch_constancy(Candidate("one", (measured(1.0), measured(1.2))))
    assert loud.as_doubt().is_suspicion and "disagree" in loud.as_doubt().text
    (calm,) = epoch_constancy(Candidate("one", (measured(1.0), measured(1.01))))
    assert not calm.as_doubt().is_suspicion and "2 epochs agree" in calm.as_doubt().text


def test_other_catalogues_do_not_share_a_calibration():
    pair = (measured(1.0), measured(1.06, source="other"))
    assert not epoch_constancy(Candidate("one", pair))[0].is_constant
    assert epoch_constancy(Candidate("one", pair), {"W1": 0.024})[0].is_constant
