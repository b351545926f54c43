"""From candidates and settings to the arrays that every check fits."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from tui.model import Candidate, FloatArray, Settings
from tui.physics.parallax import usable_parallax
from tui.physics.photometry import mag_from_flux
from tui.physics.problem import Problem, build_problem
from tui.physics.templates import Templates

AV_PER_KPC = 1.8  # mag; Whittet 2003, mean rate in the disc
AV_UNKNOWN = 5.0  # mag, where neither the line of sight nor the distance is known
AV_LEAST = 0.05  # mag; never no room at all


def fact(candidate: Candidate, name: str) -> float:
    """A numeric fact of a candidate, NaN where it has none."""
    value = candidate.facts.get(name)
    if value is None or isinstance(value, (bool, str)):
        return float("nan")
    return float(value)


def facts(candidates: Sequence[Candidate], name: str) -> FloatArray:
    """The same for many, shape (M,)."""
    return np.array([fact(candidate, name) for candidate in candidates], dtype=np.float64)


def parallaxes(candidates: Sequence[Candidate], templates: Templates, settings: Settings) -> tuple[FloatArray, FloatArray]:
    """Usable parallaxes and errors, mas, (M,) each; NaN where none."""
    zero = {band.name: band.zero_point_jy for band in templates.bands}.get("Gaia_G", np.nan)
    g_flux = np.array([_flux(candidate, "Gaia_G") for candidate in candidates])
    return usable_parallax(
        facts(candidates, "parallax"),
        facts(candidates, "parallax_error"),
        facts(candidates, "ruwe"),
        mag_from_flux(g_flux, zero),
        settings.ruwe_max,
    )


def _flux(candidate: Candidate, band: str) -> float:
    return next((m.flux_jy for m in candidate.measurements if m.band == band and not m.limit), float("nan"))


def av_ceiling(candidates: Sequence[Candidate], parallax_mas: FloatArray, settings: Settings) -> FloatArray:
    """Most extinction that the line of sight allows, mag, (M,): `av_max`, else 1.8 mag/kpc, else 5 mag."""
    if settings.av_prior:
        return np.full(len(candidates), float(settings.av_prior))
    told = facts(candidates, "av_max")
    with np.errstate(invalid="ignore"):
        by_distance = np.maximum(AV_PER_KPC / np.where(parallax_mas > 0, parallax_mas, np.nan), AV_LEAST)
    known = np.where(np.isfinite(told), np.maximum(told, AV_LEAST), by_distance)
    return np.clip(np.where(np.isfinite(known), known, AV_UNKNOWN), AV_LEAST, 30.0)


def prepare(candidates: Sequence[Candidate], templates: Templates, settings: Settings) -> Problem:
    """Arrays for all checks of these candidates.

    Raises:
        TemplateError: a candidate has a band that the grids lack.
    """
    usable = parallaxes(candidates, templates, settings)
    return build_problem(
        candidates,
        templates,
        parallaxes=usable,
        av_max=av_ceiling(candidates, usable[0], settings),
        common=settings.common,
    )
