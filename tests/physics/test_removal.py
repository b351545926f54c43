"""Removals against the fit itself with the same errors."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tests.bench.descents import descend
from tui.data import load
from tui.physics.composite import STAR
from tui.physics.fitting import fit
from tui.physics.problem import Problem
from tui.physics.removal import chi2_without
from tui.physics.templates import build_photosphere, build_templates

NAMES = ("Gaia_BP", "Gaia_G", "Gaia_RP", "J", "H", "Ks", "W1", "W2", "W3", "W4")


@pytest.fixture(scope="module")
def templates():
    bands = [load.bands()[name] for name in NAMES]
    photosphere = build_photosphere("dwarfs", load.dwarfs(), bands, load.bands())
    return build_templates(bands, photosphere, "g23", (), r_v=3.1, source_floor=0.03)


def stars(templates, count, common=0):
    rng = np.random.default_rng(21)
    ln_t = rng.uniform(np.log(3200), np.log(15000), count)
    flux = np.exp(templates.star.at(ln_t)[0] - 44.0) * (1 + 0.03 * rng.normal(size=(count, 10)))
    flux[:, 9] *= np.where(rng.random(count) < 0.5, 1.7, 1.0)
    limited = np.zeros(flux.shape, bool)
    nothing = np.full(count, np.nan)
    shared = np.full((common, 10), 0.02)
    return Problem(templates, flux, 0.02 * flux, ~limited, limited, nothing, nothing, np.full(count, 5.0), shared)


def test_removal_is_the_fit_without_the_bands(templates):
    batch = fit(stars(templates, 60), STAR)
    row = np.repeat(np.arange(60), 10)
    dropped = np.tile(np.eye(10, dtype=bool), (60, 1))
    found = chi2_without(batch, row, dropped)
    exact = descend(batch.problem.take(row).without(dropped), batch.kit, batch.errors.take(row), batch.x[row]).cost
    # A descent may rest in a higher minimum; the scan of all temperatures is above it by the parabola's error at most.
    assert np.all(found < exact + 0.15)
    assert np.quantile(np.abs(found - exact), 0.95) < 0.05


def test_limits_are_kept_by_force(templates):
    # The scale is that of the detections, then limits add max(0, (model - limit)/sigma)^2: on a 20 times finer grid.
    batch = fit(stars(templates, 8), STAR)
    limited = np.zeros((8, 10), bool)
    limited[:, 8] = True
    flux = np.where(limited, 0.7, 1.0) * batch.problem.flux_jy
    problem = replace(batch.problem, detected=~limited, limited=limited, flux_jy=flux)
    batch = replace(batch, problem=problem)
    dropped = np.zeros((8, 10), bool)
    dropped[:, 9] = True
    fine = np.linspace(templates.star.low, templates.star.high, 5300)
    grid = np.exp(templates.star.at(fine)[0] - 44.0)
    for row in range(8):
        weight = np.where(problem.detected[row] & ~dropped[row], batch.errors.sigma[row] ** -2.0, 0.0)
        flux, sigma = problem.flux_jy[row], batch.errors.sigma[row]
        scale = (grid @ (weight * flux)) / (grid**2 @ weight)
        chi2 = ((flux - scale[:, None] * grid) ** 2) @ weight
        chi2 += np.maximum((scale * grid[:, 8] - flux[8]) / sigma[8], 0.0) ** 2
        found = chi2_without(batch, np.array([row]), dropped[row : row + 1])[0]
        assert found == pytest.approx(chi2.min(), abs=0.15)


def test_shared_errors_take_the_long_way(templates):
    batch = fit(stars(templates, 3, common=1), STAR)
    dropped = np.zeros((3, 10), bool)
    dropped[:, 9] = True
    again = fit(batch.problem.without(dropped), STAR)
    assert chi2_without(batch, np.arange(3), dropped) == pytest.approx(again.chi2)


def test_nothing_to_remove(templates):
    batch = fit(stars(templates, 2), STAR)
    assert chi2_without(batch, np.zeros(0, int), np.zeros((0, 10), bool)).shape == (0,)
    plain = chi2_without(batch, np.arange(2), np.zeros((2, 10), bool))
    assert plain == pytest.approx(batch.cost, abs=0.1)
