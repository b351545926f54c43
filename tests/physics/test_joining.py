"""Grids of two sets of bands beside each other are the grids of all of them."""

from __future__ import annotations

import numpy as np

from tui.data.load import bands
from tui.physics.joining import joined
from tui.physics.photometry import quadrature
from tui.physics.photosphere import planck_photosphere
from tui.physics.templates import build_templates

TEFF_K = np.exp(np.linspace(np.log(3000), np.log(9000), 60))


def grids(names):
    chosen = [bands()[name] for name in names]
    return build_templates(chosen, planck_photosphere(TEFF_K, [quadrature(band) for band in chosen]), "g23", [])


def test_joined_grids_are_those_built_together():
    parts, whole = joined(grids(["W1", "V"]), grids(["J", "B"]), "key"), grids(["B", "V", "J", "W1"])
    assert parts.names == whole.names and parts.points == "key" and parts.digest != whole.digest
    at = (np.array([np.log(5000.0)]), np.array([1.0]), np.array([3.1]))
    for name in ("star", "dust", "compact", "power"):
        assert np.allclose(getattr(parts, name).ln_flux, getattr(whole, name).ln_flux, rtol=1e-12)
    for name in ("star_reddening", "dust_reddening", "compact_reddening"):
        assert np.allclose(getattr(parts, name).at(*at)[0], getattr(whole, name).at(*at)[0], rtol=1e-9)
