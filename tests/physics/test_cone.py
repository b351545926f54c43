"""The mixture bound on cones small enough for scipy's own non-negative least squares (Lawson & Hanson 1974)."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import nnls
from scipy.stats import chi2 as chi2_law

from tui.physics.cone import Fluxes, certificate, mixture_bound, p_bound, whiten
from tui.physics.natural_sources import build_generators
from tui.physics.nnls_batch import nnls_batch
from tui.physics.photometry import Quadrature
from tui.physics.planck import ln_planck_jy

WAVES = np.array([0.45, 0.6, 0.8, 1.25, 1.65, 2.2, 3.4, 4.6, 12.0, 22.0])


@pytest.fixture(scope="module")
def generators():
    """The whole natural cone seen at ten wavelengths, black bodies in the place of stars."""
    rules = [Quadrature(np.array([wave]), np.ones(1)) for wave in WAVES]
    teff = np.geomspace(2300.0, 40000.0, 60)
    return build_generators(rules, teff, ln_planck_jy(WAVES[None, :], teff[:, None]))


def every_column(generators):
    """All columns, shape (B, columns)."""
    return generators.flux.transpose(1, 0, 2).reshape(len(WAVES), -1).astype(np.float64)


def fluxes_of(flux, error, limit=None):
    """Independent errors; every band present."""
    flux = np.atleast_2d(flux)
    covariance = np.einsum("kb,bc->kbc", np.broadcast_to(error, flux.shape) ** 2, np.eye(flux.shape[1]))
    return Fluxes(flux, covariance, np.ones(flux.shape, bool), np.zeros(flux.shape, bool) if limit is None else limit)


@pytest.mark.parametrize(("bands", "columns"), [(4, 3), (5, 12), (14, 40), (20, 64)])
def test_batch_agrees_with_scipy_nnls_on_random_cones(bands, columns):
    rng = np.random.default_rng(bands)
    matrix = np.exp(-rng.uniform(0, 15, (40, 1, columns)) * np.linspace(0, 1, bands)[None, :, None]) * 33
    target = matrix @ np.where(rng.random(columns) < 0.2, 1.0, 0.0) + rng.standard_normal((40, bands))
    x = nnls_batch(matrix, target)
    ours = np.sum((np.einsum("kbm,km->kb", matrix, x) - target) ** 2, axis=1)
    scipys = np.array([nnls(a, b, maxiter=10_000)[1] ** 2 for a, b in zip(matrix, target, strict=True)])
    assert np.all(x >= 0)
    assert ours == pytest.approx(scipys, abs=1e-3)  # GRADIENT and RIDGE leave no more


def test_batch_starts_from_any_feasible_point():
    rng = np.random.default_rng(3)
    matrix, target = rng.random((20, 6, 15)), rng.random((20, 6))
    start = rng.random((20, 15)) * (rng.random((20, 15)) < 0.3)
    again = np.einsum("kbm,km->kb", matrix, nnls_batch(matrix, target, start))
    fresh = np.einsum("kbm,km->kb", matrix, nnls_batch(matrix, target))
    assert np.sum((again - target) ** 2, axis=1) == pytest.approx(np.sum((fresh - target) ** 2, axis=1), abs=1e-6)


def test_twin_and_empty_columns_do_no_harm():
    matrix = np.array([[[1.0, 1.0, 0.0], [1.0, 1.0, 0.0]]])
    x = nnls_batch(matrix, np.array([[2.0, 2.0]]))
    assert x[0, :2].sum() == pytest.approx(2.0) and x[0, 2] == 0


def test_bound_brackets_the_least_chi_square_over_all_columns(generators):
    rng = np.random.default_rng(5)
    flux = np.exp(rng.normal(0, 0.4, (6, len(WAVES)))) * WAVES**-1.0
    found = mixture_bound(generators, fluxes_of(flux, 0.05 * flux), enough=2.0)
    for row in range(len(flux)):
        sigma = 0.05 * flux[row]
        columns = every_column(generators) / sigma[:, None]
        used = found.index[row][found.index[row] >= 0]
        pool = np.unique(np.concatenate([used, rng.integers(0, columns.shape[1], 4000)]))
        least = nnls(columns[:, pool], flux[row] / sigma, maxiter=50_000)[1] ** 2
        assert found.chi2[row] <= least + 1e-6
        assert found.feasible[row] >= found.chi2[row] - 1e-9
        assert found.feasible[row] - found.chi2[row] <= max(1.0, 0.05 * least)


def test_weights_of_the_certificate_shine_on_no_column(generators):
    notch = ln_planck_jy(WAVES, 5772.0)
    flux = np.exp(notch - notch.max()) * np.where(WAVES == 1.65, 0.4, 1.0)
    found = mixture_bound(generators, fluxes_of(flux, 0.03 * flux))
    v, columns = found.weights[0], every_column(generators)
    assert found.p[0] < 1e-6
    assert np.max((v @ columns) / (np.abs(v) @ columns)) < 1e-12
    assert (v @ flux) ** 2 / np.sum((v * 0.03 * flux) ** 2) == pytest.approx(found.chi2[0])


def test_unfinished_solves_never_claim_more_than_the_least_chi_square():
    rng = np.random.default_rng(6)
    for _ in range(300):
        bands, columns = int(rng.integers(2, 12)), int(rng.integers(2, 40))
        g, flux = rng.random((bands, columns)), rng.random(bands)
        root = np.diag(0.05 + 0.1 * rng.random(bands)) + 0.05 * rng.random((bands, bands))
        covariance = root @ root.T
        half = np.linalg.inv(np.linalg.cholesky(covariance))
        least = nnls(half @ g, half @ flux, maxiter=10_000)[1] ** 2
        weight = 1 / np.sqrt(np.diag(covariance))
        r = np.linalg.solve(covariance, flux - g @ (rng.random(columns) * (rng.random(columns) < 0.3)))
        delta = np.array([max(np.max(r @ g / (weight @ g)), 0.0)])
        claimed, _ = certificate(flux[None], covariance[None], r[None], weight[None], delta)
        assert claimed[0] <= least * (1 + 1e-9) + 1e-9


def test_common_errors_and_absent_bands_count_as_their_covariance_says():
    flux, sigma = np.array([[3.0, 2.0, 7.0]]), np.array([0.3, 0.2, 0.1])
    covariance = (np.diag(sigma**2) + np.outer([0.1, 0.2, 0], [0.1, 0.2, 0]))[None]
    there = np.array([[True, True, False]])
    white = whiten(Fluxes(flux, covariance, there, ~there & False))
    inverse = np.linalg.inv(covariance[0, :2, :2])
    assert np.sum(white.target**2) == pytest.approx(flux[0, :2] @ inverse @ flux[0, :2])
    assert white.points[0] == 2 and np.all(white.whitener[0, 2] == 0) and white.weight[0, 2] == 0


def test_a_limit_is_met_by_any_fainter_mixture_and_not_by_a_brighter_one(generators):
    ln = ln_planck_jy(WAVES, 5000.0)
    flux = np.exp(ln - ln.max())
    error = 0.03 * flux
    high, low = flux.copy(), flux.copy()
    high[4], low[4] = 50 * flux[4], 0.5 * flux[4]  # limits at 1.65 micron
    limit = np.zeros((2, len(WAVES)), bool)
    limit[:, 4] = True
    found = mixture_bound(generators, fluxes_of(np.stack([high, low]), error, limit), enough=2.0)
    assert found.chi2[0] < 0.5 and found.model[0, 4] == pytest.approx(flux[4], rel=0.1)
    assert found.p[1] < 1e-4 and found.weights[1, 4] <= 0


def test_p_is_a_chi_square_tail_with_one_degree_less_and_the_chance_of_no_signal():
    # Abramowitz & Stegun table 26.8: chi-square 21.666 at Q = 0.01, 9 degrees of freedom
    assert p_bound(np.array([21.666]), np.array([10]), np.array([1e4]))[0] == pytest.approx(0.01, abs=5e-6)
    assert p_bound(np.array([3.0]), np.array([4]), np.array([1.0]))[0] == pytest.approx(
        chi2_law.sf(3.0, 3) + 0.158655, abs=1e-5
    )  # Phi(-1) = 0.158655
    assert p_bound(np.array([50.0]), np.array([1]), np.array([1e4]))[0] == 1.0


def test_a_doppler_shifted_planck_source_is_another_planck_source(generators):
    rng = np.random.default_rng(7)
    temperature, shift = rng.uniform(800, 20000, 30), np.exp(rng.uniform(-0.5, 0.5, 30))
    ln = 3 * np.log(shift)[:, None] + ln_planck_jy(WAVES[None] * shift[:, None], temperature[:, None])
    flux = np.exp(np.maximum(ln - ln.max(axis=1, keepdims=True), -20))
    found = mixture_bound(generators, fluxes_of(flux, 0.03 * flux), enough=0.9999)
    assert np.all(found.p > 0.9)
