"""Amplitudes against Lawson & Hanson's non-negative least squares (scipy.optimize.nnls) on random cones."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import nnls

from tui.physics.amplitudes import non_negative, solved

ROWS, BANDS = 400, 9
KINDS = ("plain", "alike", "twins", "nearly twins", "dark", "hopeless")


def cones(count, kind, seed=5):
    """Columns (R, B, K) and targets (R, B), both in sigma."""
    rng = np.random.default_rng(seed)
    columns = rng.uniform(0, 1, (ROWS, BANDS, count)) ** 3 * 10.0 ** rng.uniform(-1, 2, (ROWS, 1, 1))
    apart = {"alike": 1e-2, "twins": 0.0, "nearly twins": 2e-4}.get(kind)
    if apart is not None and count > 1:
        columns[:, :, -1] = columns[:, :, 0] * (1 + apart * rng.standard_normal((ROWS, BANDS)))
    if kind == "dark":
        columns[:, :, -1] = 0.0
    target = np.einsum("rbk,rk->rb", columns, rng.exponential(1.0, (ROWS, count)) * (rng.random((ROWS, count)) < 0.7))
    target = target + rng.standard_normal(target.shape) * rng.choice([0.0, 1e-3, 1.0], (ROWS, 1))
    return columns, -np.abs(target) if kind == "hopeless" else target


def normal_equations(columns, target):
    return np.einsum("rbk,rbl->klr", columns, columns), np.einsum("rbk,rb->kr", columns, target)


def left_over(columns, target, amplitude):
    return np.sum((target - np.einsum("rbk,kr->rb", columns, amplitude)) ** 2, axis=1)


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("count", [1, 2, 3])
def test_nothing_lower_is_found_by_nnls(count, kind):
    columns, target = cones(count, kind)
    found = non_negative(*normal_equations(columns, target))
    assert found.shape == (count, ROWS) and np.all(found >= 0)
    lowest = np.array([nnls(own, goal)[1] ** 2 for own, goal in zip(columns, target, strict=True)])
    # sources whose shapes agree to one part in a thousand are one: what that hides is a small part of a sigma squared
    assert np.all(left_over(columns, target, found) <= lowest + 1e-6 * np.sum(target**2, axis=1) + 1e-9)
    if kind == "dark":
        assert np.all(found[-1] == 0)
    if kind == "hopeless":
        assert np.all(found == 0)


@pytest.mark.parametrize("count", [1, 2, 3])
def test_single_precision_is_enough_to_rank(count):
    columns, target = cones(count, "plain")
    normal, right = normal_equations(columns, target)
    found = non_negative(normal.astype(np.float32), right.astype(np.float32))
    assert found.dtype == np.float32
    lowest = np.array([nnls(own, goal)[1] ** 2 for own, goal in zip(columns, target, strict=True)])
    assert np.all(left_over(columns, target, found) <= lowest + 1e-4 * np.sum(target**2, axis=1) + 1e-4)


@pytest.mark.parametrize("size", [1, 2, 3, 4])
def test_systems_against_numpy(size):
    rng = np.random.default_rng(6)
    root = rng.standard_normal((50, size, size + 3))
    matrix, right = root @ root.transpose(0, 2, 1), rng.standard_normal((50, size))
    exact = np.linalg.solve(matrix, right[:, :, None])[:, :, 0]
    kept = matrix.copy()
    found = solved(matrix.transpose(1, 2, 0), right.T)
    assert found.T == pytest.approx(exact, rel=1e-8)
    assert np.array_equal(matrix, kept)  # what is given is not used up


def test_a_singular_system_has_a_finite_answer():
    matrix = np.ones((2, 2, 1))
    assert np.all(np.isfinite(solved(matrix, np.ones((2, 1)))))
    assert np.all(np.isfinite(solved(np.zeros((2, 2, 1)), np.ones((2, 1)))))
