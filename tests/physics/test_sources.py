"""Tables read off between their nodes, against the functions they were made of."""

from __future__ import annotations

import numpy as np
import pytest

from tui.physics.photometry import quadrature
from tui.physics.planck import planck_jy
from tui.physics.sources import source_grid

X = np.linspace(0.0, 2.0, 81)


def smooth(x):
    return np.stack([np.sin(3 * x), -np.exp(x), 0.5 * x], axis=1)


def test_values_and_slopes_between_nodes():
    grid = source_grid("test", X, smooth(X))
    at = np.random.default_rng(1).uniform(0.03, 1.97, 200)
    value, slope = grid.at(at)
    assert value == pytest.approx(smooth(at), abs=1e-4)  # third order in the step of 0.025
    step = 1e-6
    assert slope == pytest.approx((grid.at(at + step)[0] - grid.at(at - step)[0]) / 2 / step, rel=1e-5, abs=1e-5)


def test_nodes_are_met_and_the_slope_has_no_step_there():
    grid = source_grid("test", X, smooth(X))
    assert grid.at(X)[0] == pytest.approx(smooth(X), abs=1e-5)
    inner, gap = X[1:-1], 1e-9
    assert grid.at(inner - gap)[1] == pytest.approx(grid.at(inner + gap)[1], abs=1e-5)
    assert (grid.low, grid.high) == pytest.approx((0.0, 2.0))


def test_the_parameter_is_held_inside_the_table():
    grid = source_grid("test", X, smooth(X))
    assert grid.at(np.array([-5.0, 7.0]))[0] == pytest.approx(grid.at(np.array([0.0, 2.0]))[0], abs=1e-4)


def test_some_bands_are_the_same_bands():
    grid = source_grid("test", X, smooth(X))
    at = np.array([0.31, 1.22])
    assert np.array_equal(grid.take([2, 0]).at(at)[0], grid.at(at)[0][:, [2, 0]])


@pytest.mark.parametrize("family", ["dust", "compact"])
def test_thermal_tables_against_direct_integration(grids, family):
    grid = getattr(grids, family)
    kelvin = np.array([47.0, 130.0, 333.0, 1471.0]) if family == "dust" else np.array([6111.0, 21000.0, 83333.0])
    found = np.exp(grid.at(np.log(kelvin))[0])
    for column, band in enumerate(grids.bands):
        rule = quadrature(band, 2000)
        for row, each in enumerate(kelvin):
            if each * band.pivot_um < 400:  # further down a Wien tail every grid is coarse, and nothing is seen
                continue
            exact = np.pi * np.sum(rule.weight * planck_jy(rule.wave_um, each))
            tolerance = 0.03 if band.name == "SDSS_u" and each < 2000 else 2e-3
            assert found[row, column] == pytest.approx(exact, rel=tolerance), (band.name, each)


def test_power_law_table_against_direct_integration(grids):
    slope = grids.power.low + np.array([0.13, 0.42, 0.83]) * (grids.power.high - grids.power.low)
    found = np.exp(grids.power.at(slope)[0])
    for column, band in enumerate(grids.bands):
        rule = quadrature(band, 2000)
        exact = [np.sum(rule.weight * (rule.wave_um / 3.4) ** each) for each in slope]
        assert found[:, column] == pytest.approx(exact, rel=2e-3), band.name
