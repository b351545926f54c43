"""Gaia's own numbers as evidence: corrected BP/RP excess and scatter of G, for many candidates at once."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from tui.checks.doubts import INFORMATIVE, SUSPICION, Doubt
from tui.model import Band, Candidate, FloatArray
from tui.physics.gaia import (
    ExcessLaw,
    QuietLocus,
    corrected_excess,
    excess_sigma,
    own_scatter,
    quiet_scatter,
    transit_scatter,
)

EXCESS_SIGMA = 5.0  # Riello et al. 2021, section 9.4, use 3 to 5; the tails of C* are not Gaussian
NOTE_SIGMA = 3.0
# The locus is the median of all stars; how widely quiet stars lie about it is not published with it. Only a
# scatter three times the locus, with 2 % or more of the star's own, is held against a star: our choice of limits.
SCATTER_RATIO = 3.0
LEAST_SCATTER = 0.02
GAIA_BANDS = ("Gaia_G", "Gaia_BP", "Gaia_RP")


def gaia_numbers(
    candidates: Sequence[Candidate], bands: Mapping[str, Band], excess: ExcessLaw, quiet: QuietLocus
) -> dict[str, FloatArray]:
    """C*, its error and significance, and scatter of G, shape (N,) each; NaN where Gaia's columns are missing."""
    g, bp, rp = (_mags(candidates, band, bands) for band in GAIA_BANDS)
    colour = _column(candidates, "bp_rp")
    colour = np.where(np.isfinite(colour), colour, bp - rp)
    c_star = corrected_excess(_column(candidates, "phot_bp_rp_excess_factor"), colour, excess)
    sigma = excess_sigma(g, excess)
    ratio = _column(candidates, "phot_g_mean_flux_over_error")
    with np.errstate(divide="ignore", invalid="ignore"):
        counted = _column(candidates, "phot_g_mean_flux") / _column(candidates, "phot_g_mean_flux_error")
    scatter = transit_scatter(_column(candidates, "phot_g_n_obs"), np.where(np.isfinite(ratio), ratio, counted))
    expected = quiet_scatter(g, quiet)
    return {
        "c_star": c_star, "c_star_sigma": sigma, "c_star_significance": c_star / sigma,
        "gaia_scatter": scatter, "gaia_quiet_scatter": expected, "gaia_scatter_ratio": scatter / expected,
        "gaia_own_scatter": own_scatter(scatter, expected),
    }  # fmt: skip


def gaia_facts(numbers: Mapping[str, FloatArray], row: int) -> dict[str, float]:
    """The finite numbers of one candidate, rounded for showing; without C* its error says nothing."""
    facts = {key: round(float(values[row]), 5) for key, values in numbers.items() if np.isfinite(values[row])}
    if "c_star" not in facts:
        facts.pop("c_star_sigma", None)
    if "gaia_scatter" not in facts:
        facts.pop("gaia_quiet_scatter", None)
    return facts


def gaia_doubts(facts: Mapping[str, float], present: Sequence[str]) -> list[Doubt]:
    """What the numbers say about the Gaia bands that were measured."""
    doubts = []
    significance = facts.get("c_star_significance", math.nan)
    if abs(significance) >= NOTE_SIGMA:
        severity = SUSPICION if abs(significance) >= EXCESS_SIGMA else INFORMATIVE
        which = "more" if significance > 0 else "less"
        text = (
            f"BP and RP together hold {which} light than G by C* = {facts['c_star']:+.3f}, "
            f"{abs(significance):.1f} sigma of isolated stars"
        )
        doubts += [Doubt(band, "colour excess", text, severity) for band in GAIA_BANDS[1:] if band in present]
    ratio, own = facts.get("gaia_scatter_ratio", math.nan), facts.get("gaia_own_scatter", math.nan)
    if ratio >= SCATTER_RATIO and own >= LEAST_SCATTER:
        text = (
            f"single observations in G scatter by {100 * facts['gaia_scatter']:.1f} %, {ratio:.1f} times an ordinary "
            "star of this brightness: bands of other epochs may not belong to the same state"
        )
        doubts += [Doubt(band, "scatter", text, SUSPICION) for band in GAIA_BANDS if band in present]
    return doubts


def _column(candidates: Sequence[Candidate], name: str) -> FloatArray:
    return np.array([_number(candidate.facts.get(name)) for candidate in candidates], dtype=float)


def _number(value: Any) -> float:
    return float(value) if isinstance(value, (int, float, np.number)) and not isinstance(value, bool) else math.nan


def _mags(candidates: Sequence[Candidate], band: str, bands: Mapping[str, Band]) -> FloatArray:
    fact = {"Gaia_G": "phot_g_mean_mag", "Gaia_BP": "phot_bp_mean_mag", "Gaia_RP": "phot_rp_mean_mag"}[band]
    mags = _column(candidates, fact)
    for row, candidate in enumerate(candidates):
        if not np.isfinite(mags[row]) and band in bands:
            mags[row] = measured_mag(candidate, bands[band])
    return mags


def measured_mag(candidate: Candidate, band: Band) -> float:
    """Magnitude of the first detection in a band, in the band's system; NaN where there is none."""
    for measurement in candidate.measurements:
        if measurement.band == band.name and not measurement.limit and measurement.flux_jy > 0:
            return -2.5 * math.log10(measurement.flux_jy / band.zero_point_jy)
    return math.nan
