"""What a parallax may be used for, against the published zero point and error inflation."""

from __future__ import annotations

import numpy as np
import pytest

from tui.physics.parallax import inflated_error, usable_parallax

ONE = np.ones(1)


# El-Badry, Rix & Heintz 2021, MNRAS 506, 2269, eq. 16:
# f = 0.21 exp(-((G - 12.65)/0.90)^2) + 1.141 + 0.0040 G - 0.00062 G^2; the form as in two public code copies
@pytest.mark.parametrize(("g_mag", "printed"), [(12.65, 1.3024), (13.55, 1.1586), (18.0, 1.0121)])
def test_error_inflation(g_mag, printed):
    assert float(inflated_error(ONE, np.array([g_mag]))[0]) == pytest.approx(printed, abs=6e-5)


def test_error_inflation_without_g():
    assert float(inflated_error(2 * ONE, np.array([np.nan]))[0]) == pytest.approx(2.282)


def test_zero_point_is_taken_off():
    # Lindegren et al. 2021, A&A 649, A4: quasars' median is -0.017 mas, so true = catalogue + 0.017
    value, error = usable_parallax(10 * ONE, 0.02 * ONE, ONE, 15.0 * ONE, 1.4)
    assert float(value[0]) == pytest.approx(10.017)
    assert float(error[0]) == pytest.approx(0.02 * (1.141 + 0.06 - 0.1395 + 0.21 * np.exp(-((2.35 / 0.9) ** 2))),
        abs=1e-6)


@pytest.mark.parametrize(
    ("parallax", "error", "ruwe"),
    [(0.4, 0.1, 1.0), (-3.0, 0.1, 1.0), (10.0, 0.02, 1.41), (10.0, 0.0, 1.0), (np.nan, 0.1, 1.0), (10.0, np.nan, 1.0)],
    ids=["below 5 sigma", "negative", "RUWE", "no error", "none", "error unknown"],
)
def test_parallax_that_is_never_inverted(parallax, error, ruwe):
    value, sigma = usable_parallax(parallax * ONE, error * ONE, ruwe * ONE, 15.0 * ONE, 1.4)
    assert np.isnan(value).all() and np.isnan(sigma).all()


def test_unknown_ruwe_does_not_forbid():
    value, _ = usable_parallax(10 * ONE, 0.02 * ONE, np.nan * ONE, 15.0 * ONE, 1.4)
    assert np.isfinite(value).all()
