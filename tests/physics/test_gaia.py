"""Gaia's excess factor and scatter against Riello et al. 2021 and the mission's own summary."""

from __future__ import annotations

import numpy as np
import pytest

from tui.data.load_flags import gaia_excess_rows, gaia_scatter_rows
from tui.physics.gaia import (
    bright_correction,
    corrected_excess,
    excess_law,
    excess_sigma,
    expected_excess,
    own_scatter,
    quiet_locus,
    quiet_scatter,
    transit_scatter,
)

LAW = excess_law(gaia_excess_rows())
QUIET = quiet_locus(gaia_scatter_rows())


# Riello et al. 2021, A&A 649, A3, Table 2 evaluated by hand; 0.82 is the Sun's BP - RP (Casagrande & VandenBerg 2018).
@pytest.mark.parametrize(
    ("bp_rp", "mean"), [(0.82, 1.20128), (2.5, 1.40665), (-0.2, 1.14890), (4.5, 1.68999)], ids=str
)
def test_mean_excess(bp_rp, mean):
    assert expected_excess(np.array([bp_rp]), LAW)[0] == pytest.approx(mean, rel=0, abs=5e-6)  # half the last digit


# The same paper, Eq. 18, evaluated by hand.
@pytest.mark.parametrize(("g", "sigma"), [(10, 0.00636), (15, 0.01403), (18, 0.03824), (20, 0.07795)], ids=str)
def test_sigma(g, sigma):
    assert excess_sigma(np.array([g]), LAW)[0] == pytest.approx(sigma, rel=0, abs=5e-6)


def test_ranges_meet():
    # The published branches are continuous at 0.5 to the last digit and at 4.0 to 4e-5.
    for edge, step in ((0.5, 2e-6), (4.0, 5e-5)):
        below, above = expected_excess(np.array([edge - 1e-9, edge + 1e-9]), LAW)
        assert abs(below - above) < step


def test_corrected_excess_of_an_isolated_star_is_zero():
    colours = np.linspace(-0.5, 5.0, 12)
    assert corrected_excess(expected_excess(colours, LAW), colours, LAW) == pytest.approx(np.zeros(12), abs=1e-12)
    assert np.isnan(corrected_excess(np.array([1.2]), np.array([np.nan]), LAW)[0])


def test_quiet_scatter_gives_the_typical_error_of_the_release():
    # Gaia EDR3 contents page (cosmos.esa.int): typical G errors 0.3, 1, 6 mmag at G < 13, 17, 20; median source with
    # some 200 observations in the tool the table is made from. One digit is printed: 0.3 stands for 0.25 to 0.35.
    error_mmag = 1085.7 * quiet_scatter(np.array([12.5, 17.0, 20.0]), QUIET) / np.sqrt(200.0)
    assert np.round(error_mmag, 1)[0] in (0.2, 0.3)
    assert error_mmag[1:] == pytest.approx([1.0, 6.0], rel=0.05)


def test_scatter_of_a_star_that_varies():
    rng = np.random.default_rng(5)
    flux = 1000 * (1 + 0.03 * rng.normal(size=400))  # 3 % of its own, no other noise
    measured = transit_scatter(np.array([400]), np.array([flux.mean() / (flux.std(ddof=1) / np.sqrt(400))]))
    assert measured[0] == pytest.approx(0.03, rel=0.12)  # 3 sigma of a standard deviation of 400
    quiet = quiet_scatter(np.array([14.0]), QUIET)
    assert own_scatter(np.hypot(0.03, quiet), quiet)[0] == pytest.approx(0.03)
    assert own_scatter(quiet * 0.9, quiet)[0] == 0.0


def test_missing_numbers_stay_missing():
    assert np.isnan(transit_scatter(np.array([0.0, 200.0]), np.array([100.0, -1.0]))).all()
    assert np.isnan(quiet_scatter(np.array([3.0, 21.5]), QUIET)).all()


def test_bright_correction():
    # Riello et al. 2021, appendix C.1: vanishes near G = 8, some hundredths at the bright end; nothing elsewhere.
    assert bright_correction(np.array([8.5, 1.5])).tolist() == [0.0, 0.0]
    assert abs(bright_correction(np.array([7.999]))[0]) < 0.003
    assert bright_correction(np.array([4.0]))[0] == pytest.approx(
        -0.09892 + 0.059 * 4 - 0.009775 * 16 + 0.0004934 * 64
    )
