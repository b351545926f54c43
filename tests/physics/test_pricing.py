"""Pricing of columns against plain sums in float64."""

from __future__ import annotations

import numpy as np
import pytest

from tui.physics.pricing import price, single_sources


@pytest.fixture
def problem():
    rng = np.random.default_rng(8)
    return rng.random((5, 7, 64)).astype(np.float32), rng.standard_normal((9, 7)), 0.1 + rng.random((9, 7))


def test_the_best_column_of_each_block_is_found(problem):
    blocks, gradient, weight = problem
    value, place = price(blocks, gradient, weight)
    ratio = np.einsum("kb,nbw->knw", gradient, blocks) / np.einsum("kb,nbw->knw", weight, blocks)
    assert value == pytest.approx(ratio.max(axis=2), rel=1e-4)
    assert np.array_equal(place, ratio.argmax(axis=2))


@pytest.mark.parametrize("flux_jy", [1e-150, 1e-40, 1e-25, 1e25, 1e150])
def test_the_unit_of_flux_does_not_matter(problem, flux_jy):
    # errors of size f make weights 1/f and gradients 1/f: the ratio, a pull, stays
    blocks, gradient, weight = problem
    plain, tiny = price(blocks, gradient, weight), price(blocks, gradient / flux_jy, weight / flux_jy)
    assert tiny[0] == pytest.approx(plain[0], rel=1e-5) and np.array_equal(tiny[1], plain[1])
    alone = single_sources(blocks, gradient / flux_jy, weight / flux_jy)
    assert np.array_equal(alone[1], single_sources(blocks, gradient, weight)[1])


def test_errors_of_very_unlike_size_give_no_nonsense(problem):
    blocks, gradient, weight = problem
    spread = 10.0 ** np.linspace(-60, 0, 7)
    value, _ = price(blocks, gradient * spread, weight * spread)
    assert np.all(np.isfinite(value))


def test_a_candidate_without_any_weight_is_priced_at_nothing(problem):
    blocks, gradient, weight = problem
    value, _ = price(blocks, gradient * 0, weight * 0)
    assert np.all(value == 0)
    assert np.all(single_sources(blocks, gradient * 0, weight * 0)[0] == 0)
