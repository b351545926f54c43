"""The data as descents use them, against the problem they are made of."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tests.bench.random_stars import TEN, random_problem
from tui.physics.fitting import first_errors
from tui.physics.likelihood import parallax_sigma
from tui.physics.rows import rows_of, take


@pytest.fixture(scope="module")
def drawn(grids):
    """Candidates with limits, common errors and a parallax for most."""
    return random_problem(grids, TEN, 30, 19, limits=0.4, common=0.03)[0]


def test_fluxes_are_over_sigma_and_in_units_of_the_brightest(drawn):
    errors = first_errors(drawn)
    rows = rows_of(drawn, errors, False, np.float64)
    used = drawn.detected | drawn.limited
    brightest = np.where(drawn.detected, drawn.flux_jy, 0.0).max(axis=1)
    assert rows.unit_jy == pytest.approx(brightest)
    assert rows.target.T == pytest.approx(np.where(used, drawn.flux_jy / errors.sigma, 0.0))
    assert rows.scale.T == pytest.approx(np.where(used, brightest[:, None] / errors.sigma, 0.0))
    assert np.array_equal(rows.absent.T == 0, used) and np.all(rows.absent[~used.T] < -1e20)
    assert np.array_equal(rows.detected.T.astype(bool), drawn.detected)
    assert np.array_equal(np.stack(rows.limited), np.stack(np.nonzero(drawn.limited.T)))
    assert rows.parallax is None


def test_common_errors_and_parallaxes_come_along(drawn):
    errors = first_errors(drawn)
    rows = rows_of(drawn, errors, True, np.float64)
    common, share = rows.shared
    assert common.transpose(2, 0, 1) == pytest.approx(errors.shared)
    assert share.T == pytest.approx(1 / (1 + np.sum(errors.shared**2, axis=2)))
    known = np.isfinite(drawn.parallax_mas)
    assert 0 < known.sum() < known.size
    over, weight = rows.parallax
    assert over[known] == pytest.approx((drawn.parallax_mas / parallax_sigma(drawn))[known])
    assert weight[known] == pytest.approx(1 / parallax_sigma(drawn)[known])
    assert np.all(over[~known] == 0) and np.all(weight[~known] == 0)


def test_taken_rows_are_those_of_the_candidates_taken(drawn):
    keep = np.array([7, 2, 2, 29, 0, 7])
    errors = first_errors(drawn)
    found = take(rows_of(drawn, errors, True, np.float64), keep)
    exact = rows_of(drawn.take(keep), errors.take(keep), True, np.float64)
    for name in ("target", "scale", "absent", "unit_jy", "detected"):
        assert np.array_equal(getattr(found, name), getattr(exact, name)), name
    for name in ("limited", "shared", "parallax"):
        for one, other in zip(getattr(found, name), getattr(exact, name), strict=True):
            assert np.array_equal(one, other), name


def test_single_precision_throughout(drawn):
    rows = rows_of(drawn, first_errors(drawn), True, np.float32)
    arrays = [rows.target, rows.scale, rows.absent, rows.detected, *rows.shared, *rows.parallax]
    assert {array.dtype for array in arrays} == {np.dtype(np.float32)}


def test_rows_with_limits_alone_or_nothing_have_a_unit_too(drawn):
    plain = replace(drawn, common=drawn.common[:0]).take(np.arange(2))
    limited = np.zeros_like(plain.detected)
    limited[0] = True
    bare = replace(plain, detected=np.zeros_like(limited), limited=limited)
    rows = rows_of(bare, first_errors(bare), False, np.float32)
    assert rows.unit_jy[0] == plain.flux_jy[0].max()
    assert rows.unit_jy[1] > 0 and np.all(rows.target[:, 1] == 0) and np.all(rows.scale[:, 1] == 0)
    assert np.all(np.isfinite(rows.target)) and np.all(np.isfinite(rows.scale))
