"""Columns of the natural cone: their grids, some of their bands, some of their sources."""

from __future__ import annotations

import numpy as np
import pytest

from tui.data import load
from tui.physics.generators import BLOCK
from tui.physics.natural_sources import build_generators
from tui.physics.photometry import quadrature

NAMES = ("V", "J", "W1", "W3")


@pytest.fixture(scope="module")
def generators():
    bands = load.bands()
    teff = np.geomspace(3000.0, 10000.0, 9)
    spectrum = (np.array([0.1, 50.0]), np.array([1.0, 1.0]))
    ln_flux = np.log(np.stack([teff / 1e4, teff / 5e3, np.full(9, 2.0), np.full(9, 1.0)], axis=1))
    return build_generators([quadrature(bands[name]) for name in NAMES], teff, ln_flux, user={"flat": spectrum})


def test_grids_hold_each_other_and_no_column_is_dark(generators):
    coarse, middle = set(generators.coarse.index.tolist()), set(generators.middle.index.tolist())
    assert coarse < middle and max(middle) < generators.flux.shape[0] * BLOCK
    assert np.all(generators.flux.max(axis=1) > 0.999)
    assert np.all(generators.flux > 0)
    some = generators.middle.index[::997]
    flat = generators.middle.flux.transpose(0, 2, 1).reshape(-1, len(NAMES))[::997]
    assert generators.column(some) == pytest.approx(flat)


def test_bands_are_picked_by_row(generators):
    local = generators.through([2, 0])
    index = np.array([5, 70_000])
    assert local.column(index) == pytest.approx(generators.column(index)[:, [2, 0]])


def test_cool_mixtures_leave_screened_hot_stars_out(generators):
    cool = generators.cooler(4000.0)
    kept = np.unique(cool.middle.index)
    assert np.all((generators.star_k[kept] <= 4000.0) | generators.unscreened(kept))
    assert np.any(generators.star_k[kept] > 4000.0)


def test_a_template_is_dark_where_it_has_no_light(generators):
    assert generators.dark(NAMES) == {"flat": []}
    bands = load.bands()
    rules = [quadrature(bands[name]) for name in NAMES]
    optical = {"blue": (np.array([0.3, 1.0]), np.array([1.0, 1.0]))}
    teff = np.geomspace(3000.0, 10000.0, 9)
    made = build_generators(rules, teff, np.zeros((9, 4)), user=optical)
    assert made.added == ("blue",) and made.dark(NAMES) == {"blue": ["J", "W1", "W3"]}
    assert made.describe(made.layout.families[-1].first) == {"family": "template blue", "av": 0.0, "r_v": 3.1}
