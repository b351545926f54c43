"""Candidates made by the fits' own models, so that the right answer is known."""

from __future__ import annotations

import numpy as np

from tui.model import Candidate, Measurement
from tui.physics import composite as c
from tui.physics.composite import kit_for, parallax_of, predict

LN_S = -45.0  # theta = 0.035 mas


def row(model, teff_k, **values):
    """A parameter row: `av`, `x` (kelvin, or the slope of a galaxy) and `amount`."""
    x = np.zeros((1, c.WIDTH))
    x[0, c.LN_T], x[0, c.LN_S], x[0, c.RV] = np.log(teff_k), LN_S, values.get("r_v", 3.1)
    x[0, c.AV], x[0, c.A2] = values.get("av", 0.0), values.get("amount", 0.0)
    if "x" in values:
        x[0, c.X2] = values["x"] if model.sources[0] == "power" else np.log(values["x"])
    return x


def make(templates, model, teff_k, *, name="SM-1", error=0.01, facts=None, seed=None, factors=None, limits=(),
    **values):
    """A candidate of a model; `factors` multiplies bands, `limits` turns bands into 2 sigma limits at their flux."""
    x = row(model, teff_k, **values)
    flux = predict(kit_for(model, templates), x).flux[0]
    rng = np.random.default_rng(seed)
    measured = []
    for band, value in zip(templates.bands, flux, strict=True):
        if not np.isfinite(value):
            continue
        value = value * (factors or {}).get(band.name, 1.0)
        if seed is not None:
            value *= 1 + error * rng.standard_normal()
        is_limit = band.name in limits
        measured.append(Measurement(band.name, float(value),
            float("nan") if is_limit else error * abs(float(value)), is_limit))
    return Candidate(name, tuple(measured), facts or {})


def sequence_parallax(templates, teff_k):
    """Parallax (mas) as a catalogue would give it for a dwarf of this T_eff and the maker's angular size."""
    kit = kit_for(c.BOUND_PAIR, templates)
    return float(parallax_of(kit, row(c.STAR, teff_k))[0][0]) - 0.017
