"""The natural cone of the mixture bound once more, by other means: written out densely, solved by scipy at once.

Bands are summed on plain grids, the law comes from its package, the nodes of every axis are others than the program's,
and nothing is left out between a coarse and a fine grid. What it finds is an upper bound of the least chi-square, as
what the program certifies is a lower one: where they agree, both are right.
"""

from __future__ import annotations

import numpy as np
from astropy import units
from astropy.modeling.models import BlackBody
from dust_extinction.parameter_averages import G23
from scipy.optimize import nnls

RATIOS = (2.3, 3.1, 4.2, 5.6)
SCREENS = (0.0, *np.geomspace(0.1, 40.0, 24))  # A_V before stars and black bodies
FEW = (0.0, 0.5, 2.0, 6.0, 15.0)  # A_V before dust
NODES = 160


def plain_rule(band, nodes=NODES):
    """Wavelengths and photon weights of a band on an even grid."""
    wave = np.linspace(band.wave_um[0], band.wave_um[-1], nodes)
    weight = np.interp(wave, band.wave_um, band.response) / wave
    return wave, weight / weight.sum()


def black(wave_um, temperature_k):
    """B_nu (Jy/sr) of temperatures (N,) at wavelengths, shape (N, nodes)."""
    wave = np.broadcast_to(wave_um, (len(temperature_k), wave_um.size))
    with np.errstate(over="ignore"):
        return BlackBody(temperature_k[:, None] * units.K)(wave * units.um).to_value(units.Jy / units.sr)


def shades(rules, screens):
    """Share of light behind each screen and R_V, per band (nodes, S)."""
    pairs = [(av, ratio) for av in screens for ratio in (RATIOS if av else (3.1,))]
    return [
        np.stack([G23(Rv=r).extinguish(np.clip(wave, 0.0912, 32.0) * units.um, Av=av) for av, r in pairs], axis=1)
        for wave, _ in rules
    ]


def dense_cone(local):
    """Name of a family -> columns (B, N) through the bands of `local`, whose photospheres are taken as they are."""
    rules = [plain_rule(band) for band in local.bands]
    many, few = shades(rules, SCREENS), shades(rules, FEW)

    def columns(spectra, shade):
        triples = zip(spectra, rules, shade, strict=True)
        return np.stack([((spectrum * rule[1]) @ dim).ravel() for spectrum, rule, dim in triples])

    def emissive(wave):
        return np.minimum(1, grains[2][:, None] / wave) ** grains[1][:, None]

    every = slice(None, None, 3)
    teff = np.exp(local.star.low + local.star.step * np.arange(len(local.spread)))[every]
    stars = []
    for place, (rule, dim) in enumerate(zip(rules, many, strict=True)):
        planck = black(rule[0], teff) * rule[1]
        dimmed = (planck @ dim) / planck.sum(axis=1, keepdims=True)
        stars.append((np.exp(local.star.ln_flux[every, place])[:, None] * dimmed).ravel())
    cold, grains, bumps = np.geomspace(20, 1e5, 240), axes(40, 2000, 30, (0.5, 2, 5), (1, 300, 12)), feature_axes()
    return {
        "star": np.stack(stars),
        "planck": columns([black(wave, cold) for wave, _ in rules], many),
        "modified": columns([black(wave, grains[0]) * emissive(wave) for wave, _ in rules], few),
        "feature": columns([black(wave, bumps[0]) * bump(wave, *bumps[1:]) for wave, _ in rules], few),
    }


def axes(low, high, count, beta, edge):
    """All combinations of temperature, slope and break."""
    parts = np.geomspace(low, high, count), np.linspace(*beta), np.geomspace(*edge)
    return np.array(np.meshgrid(*parts, indexing="ij")).reshape(3, -1)


def feature_axes():
    """All combinations of temperature, centre and relative width of dust features (physics of the bound: 120 to 900 K,
    3.2 to 40 micron, 0.02 to 0.3)."""
    parts = np.geomspace(120, 900, 7), np.geomspace(3.2, 40, 120), np.geomspace(0.02, 0.3, 7)
    return np.array(np.meshgrid(*parts, indexing="ij")).reshape(3, -1)


def bump(wave, centre, width):
    """A damped oscillator's profile."""
    ratio = wave / centre[:, None]
    return width[:, None] ** 2 / ((ratio - 1 / ratio) ** 2 + width[:, None] ** 2)


def least_chi2(cone, flux, error, families):
    """Least chi-square of any mixture of some families, errors independent."""
    columns = np.hstack([cone[name] for name in families])
    top = columns.max(axis=0)
    columns = columns[:, top > 0] / top[top > 0] / error[:, None]
    return float(nnls(columns / np.linalg.norm(columns, axis=0), flux / error, maxiter=100_000)[1] ** 2)
