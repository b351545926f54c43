"""Random candidates of every nature with known truth, drawn from the fits' own models with real errors and limits."""

from __future__ import annotations

import numpy as np

from tui.physics import composite as c
from tui.physics.composite import kit_for, predict
from tui.physics.likelihood import errors_for
from tui.physics.problem import Problem

TEN = ("Gaia_BP", "Gaia_G", "Gaia_RP", "J", "H", "Ks", "W1", "W2", "W3", "W4")
FOURTEEN = (*TEN, "SDSS_g", "SDSS_r", "SDSS_i", "V")
TWENTY = (*FOURTEEN, "SDSS_u", "SDSS_z", "B", "MIPS24", "PACS70", "IRAC1")
NATURES = (c.STAR, c.STAR_AV, c.DUST_AV, c.TWO_DUST, c.FREE_PAIR, c.BOUND_PAIR, c.COMPACT, c.GALAXY)
NOISE = 0.02  # of the flux: catalogue errors
SECOND = {"dust": (60.0, 1500.0), "star": (2700.0, 7000.0), "compact": (8000.0, 80000.0), "power": (1.0, 1.0)}  # K
AMOUNT = {"dust": (-4.0, -1.0), "star": (-1.5, 0.0), "compact": (-4.5, -2.5), "power": (-2.0, 0.5)}  # log10


def local_grids(grids, names):
    """Grids of some bands, in order of wavelength."""
    return grids.take([name for name in grids.names if name in names])


def random_rows(rng, model, local, count, av_max):
    """Parameter rows (N, 8) of a model, spread over what surveys meet."""
    kit = kit_for(model, local)
    x = np.zeros((count, c.WIDTH))
    x[:, c.LN_T] = rng.uniform(np.log(2800), np.log(20000), count)
    x[:, c.LN_S] = rng.uniform(-49, -43, count)
    x[:, c.RV] = 3.1
    if c.AV in model.free:
        x[:, c.AV] = np.minimum(rng.exponential(0.6, count), 0.9 * av_max)
    for (column, amplitude), grid in zip(((c.X2, c.A2), (c.X3, c.A3)), kit.further, strict=False):
        low, high = SECOND[model.sources[0]]
        x[:, column] = rng.uniform(np.log(low), np.log(high), count)
        if model.sources[0] == "power":
            x[:, column] = rng.uniform(grid.low, grid.high, count)
        x[:, amplitude] = 10.0 ** rng.uniform(*AMOUNT[model.sources[0]], count)
    return x


def random_problem(grids, names, count, seed, *, natures=NATURES, limits=0.15, common=0.0, av_max=5.0):
    """A problem of `count` candidates and the truth: (Problem, rows (M, 8), nature number (M,)).

    Args:
        limits: share of detections below 3 sigma, or long of 10 micron by chance, turned into 2 sigma limits.
        common: fractional error that the bands of each instrument share.
    """
    rng = np.random.default_rng(seed)
    local = local_grids(grids, names)
    instruments = sorted({band.instrument for band in local.bands}) if common else []
    shared = np.array([[common if band.instrument == one else 0.0 for band in local.bands] for one in instruments])
    shared = shared.reshape(len(instruments), len(local.bands))
    nature = rng.integers(0, len(natures), count)
    x = np.zeros((count, c.WIDTH))
    flux, star, second = (np.zeros((count, len(local.bands))) for _ in range(3))
    parallax = np.full(count, np.nan)
    for number, model in enumerate(natures):
        rows = np.flatnonzero(nature == number)
        if not rows.size:
            continue
        x[rows] = random_rows(rng, model, local, rows.size, av_max)
        kit = kit_for(model, local)
        seen = predict(kit, x[rows])
        flux[rows], star[rows] = seen.flux, seen.star
        second[rows] = 0.0 if seen.second is None else seen.second
        parallax[rows] = c.parallax_of(kit, x[rows])[0] * np.exp(rng.normal(0, 0.115, rows.size))
    parallax[rng.random(count) < 0.3] = np.nan
    blank = np.zeros(flux.shape, bool)
    empty = Problem(
        local, flux, NOISE * flux, ~blank, blank, parallax, 0.02 * parallax, np.full(count, av_max), shared
    )
    sigma = errors_for(empty, flux, star, x[:, c.LN_T], (second, x[:, c.X2])).sigma
    seen = flux + sigma * rng.standard_normal(flux.shape)
    seen = seen + flux * (rng.standard_normal((count, len(instruments))) @ shared)
    long = np.array([band.pivot_um > 10 for band in local.bands])
    limited = (long & (rng.random(flux.shape) < limits)) | (seen <= 0)
    top = flux * rng.uniform(0.8, 4.0, flux.shape)  # some limits are overshot by the truth by a little
    problem = Problem(
        local, np.where(limited, top, seen), np.where(limited, top / 2, NOISE * flux), ~limited, limited,
        parallax, 0.02 * parallax, np.full(count, av_max), shared,
    )  # fmt: skip
    return problem, x, nature
