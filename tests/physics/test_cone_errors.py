"""The mixture bound with errors that follow the mixture: the proof holds with the errors that stand beside it."""

from __future__ import annotations

import numpy as np
import pytest

from tui.physics.cone import GAP, GAP_SHARE
from tui.physics.cone_errors import (
    SETTLED,
    SETTLED_SHARE,
    ErrorModel,
    consistent_bound,
    cool_limits,
    spread_flux,
    widened,
)
from tui.physics.natural_sources import build_generators
from tui.physics.photometry import Quadrature
from tui.physics.planck import ln_planck_jy

WAVES = np.array([0.45, 0.6, 0.8, 1.25, 1.65, 2.2, 3.4, 4.6, 12.0, 22.0])
TEFF_K = np.geomspace(2300.0, 40000.0, 60)
FLOOR = 0.03


@pytest.fixture(scope="module")
def generators():
    """The whole natural cone seen at ten wavelengths, black bodies in the place of stars."""
    rules = [Quadrature(np.array([wave]), np.ones(1)) for wave in WAVES]
    return build_generators(rules, TEFF_K, ln_planck_jy(WAVES[None, :], TEFF_K[:, None]))


def errors_of(flux, cool=0.10, hot=0.02, common=()):
    """Errors of 1 %, floors of 3 %, and a spread that falls from `cool` to `hot` at 5000 K."""
    flux = np.atleast_2d(flux)
    spread = np.where(TEFF_K[:, None] < 5000.0, cool, hot) * np.ones(len(WAVES))
    step = float(np.log(TEFF_K[1] / TEFF_K[0]))
    there = np.ones(flux.shape, bool)
    shared = np.array(common, dtype=np.float64).reshape(-1, len(WAVES))
    floor = np.full(len(WAVES), FLOOR)
    return ErrorModel(flux, 0.01 * flux, there, ~there, floor, spread, (float(np.log(TEFF_K[0])), step), shared)


def odd_stars():
    """Four stars with light gone at 1.65 micron, from a fifth to nearly all."""
    ln = ln_planck_jy(WAVES, 5772.0)
    flux = np.exp(ln - ln.max())
    return np.stack([flux * np.where(WAVES == 1.65, left, 1.0) for left in (0.8, 0.6, 0.3, 0.05)])


@pytest.mark.parametrize("common", [(), [0.02] * 3 + [0.0] * 7], ids=["floors", "common errors"])
def test_the_proof_holds_with_the_errors_given(generators, common):
    errors = errors_of(odd_stars(), common=common)
    found = consistent_bound(generators, errors, 0.01, 0.1)
    columns = np.stack(generators.rows).astype(np.float64)
    for row in np.flatnonzero(~found.at_most):
        v, covariance = found.weights[row], found.covariance[row]
        assert np.max((v @ columns) / (np.abs(v) @ columns)) < 1e-9
        assert (v @ errors.flux[row]) ** 2 / (v @ covariance @ v) == pytest.approx(found.chi2[row])
        left = errors.flux[row] - found.model[row]
        assert left @ np.linalg.solve(covariance, left) == pytest.approx(found.feasible[row], rel=1e-6)
    assert found.at_most.tolist() == [True, False, False, False]


def test_errors_are_those_of_the_mixture_found(generators):
    errors = errors_of(odd_stars())
    found = consistent_bound(generators, errors, 0.01, 0.1)
    starlight = spread_flux(generators, errors, found.index, found.scale)
    own = errors.fluxes(found.model, starlight).covariance
    for row in np.flatnonzero(~found.at_most):
        left = errors.flux[row] - found.model[row]
        settled = max(SETTLED, SETTLED_SHARE * found.feasible[row])
        assert left @ np.linalg.solve(own[row], left) == pytest.approx(found.feasible[row], abs=settled)
        assert 0 <= found.feasible[row] - found.chi2[row] < 2 * max(GAP, GAP_SHARE * found.feasible[row])


def test_spread_reaches_a_quarter_up_in_temperature():
    step = 0.01
    spread = np.zeros((100, 1))
    spread[:10] = 0.2
    wide = widened(spread, step)[:, 0]
    assert wide[:10].tolist() == [0.2] * 10
    assert np.flatnonzero(wide).max() == 9 + round(np.log(1.25) / step)


def test_limits_lie_where_the_spread_falls():
    errors = errors_of(odd_stars())
    (limit,) = cool_limits(errors)
    assert limit < 5000.0 < limit * (TEFF_K[1] / TEFF_K[0]) ** 2
