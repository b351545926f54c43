"""Does a plain star explain the fluxes: is the candidate odd at all?"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from tui.checks.prepare import fact
from tui.checks.record import fits_of, stands
from tui.checks.remarks import common_remarks, joined, source_named, source_remark
from tui.checks.spectra import ln_p_of_parts, named
from tui.model import Candidate, Evidence, Fit, Settings
from tui.physics.composite import LN_S, LN_T
from tui.physics.constants import PARSEC
from tui.physics.fitting import FitBatch
from tui.physics.statistics import ln_chi2_tail, sigma_of_ln_p

KIND = "star"
VERSION = 4  # raise it whenever the same candidate could get other numbers
SEQUENCE_SCATTER_MAG = 0.25  # of real dwarfs about the mean sequence
EVOLVED_MAG = 1.3  # more than any triple of equals (1.193 mag) explains
DIM_MAG = -0.5
CERTAIN_LN_P = -1e-15  # a p of 1 would have no finite sigma
EDGE = 0.02  # of ln T: this near to the end of the source's range counts as at it


@dataclass(frozen=True, slots=True)
class Oddness:
    """How far the star alone is from the data: sigma of its p, and the band that stands out most."""

    sigma: float
    band: str
    pull: float


def oddness(evidence: Evidence) -> Oddness:
    """Oddness of a candidate from its star evidence; NaN where nothing could be tested."""
    told = evidence.facts
    sigma = told.get("oddness")
    band, pull = str(told.get("odd_band") or ""), float(told.get("odd_pull") or 0.0)
    return Oddness(float("nan") if sigma is None else float(sigma), band, pull)


def assess(candidates: Sequence[Candidate], batch: FitBatch, settings: Settings) -> list[Evidence]:
    """Star evidence from star-only fits, one row a candidate; order kept."""
    fits = fits_of(batch)
    extra = over_luminosity(batch)
    return [
        one_evidence(candidate, batch, row, fits[row], extra[row], settings) for row, candidate in enumerate(candidates)
    ]


def one_evidence(
    candidate: Candidate, batch: FitBatch, row: int, fit: Fit, extra: tuple[float, float], settings: Settings
) -> Evidence:
    """Put one candidate's evidence together."""
    left_out = silent_bands(candidate, batch)
    bands = tuple(fit.pulls)
    if not batch.problem.detected[row].any():
        reason = ["No band was measured that can be fitted: there are only limits or none at all."]
        return Evidence(KIND, VERSION, None, (), (*reason, *left_out), {}, bands=bands)
    told = odd_facts(fit, int(batch.problem.points[row]))
    told["over_luminosity"], told["over_luminosity_error"] = extra
    adequate = stands(fit, int(batch.problem.points[row]), settings)
    cautions = [
        *common_remarks(fit, adequate, settings, is_star=True),
        *range_remarks(batch, row),
        *luminosity_remarks(*extra),
        *parallax_remarks(candidate, batch, row, settings),
        *unknown_errors(candidate),
        *left_out,
        *source_remark(batch.problem.templates.photosphere),
    ]
    return Evidence(KIND, VERSION, adequate, (fit,), tuple(cautions), told, bands=bands)


def odd_facts(fit: Fit, points: int) -> dict[str, object]:
    """Oddness of a star-only fit; where no degree of freedom is left, by all its points."""
    dof = fit.dof if fit.dof > 0 else points
    ln_p = min(float(ln_chi2_tail(fit.chi2, dof)), ln_p_of_parts(fit), CERTAIN_LN_P)
    sigma = float(sigma_of_ln_p(ln_p))
    band = max(fit.pulls, key=lambda name: abs(fit.pulls[name]), default="")
    return {"oddness": sigma, "odd_band": band, "odd_pull": fit.pulls.get(band, 0.0)}


def silent_bands(candidate: Candidate, batch: FitBatch) -> list[str]:
    """A remark on bands that were measured and cannot be predicted."""
    silent = set(batch.problem.templates.silent)
    measured = {m.band for m in candidate.measurements if not m.exclude} & silent
    if not measured:
        return []
    source = source_named(batch.problem.templates.photosphere)
    return [f"Not fitted: {joined(named(sorted(measured)))}; the photosphere source {source} says nothing there."]


def unknown_errors(candidate: Candidate) -> list[str]:
    """A remark on detections whose error the catalogue does not give."""
    bands = [m.band for m in candidate.measurements if not m.limit and not m.exclude and not m.error_jy > 0]
    return [f"No error was given for {joined(sorted(set(bands)))}: the band's floor stands for it."] if bands else []


def range_remarks(batch: FitBatch, row: int) -> list[str]:
    """A remark where the temperature runs into the end of the photosphere source."""
    star, ln_t = batch.kit.star, batch.x[row, LN_T]
    ends = [name for name, edge in (("coolest", star.low), ("hottest", star.high)) if abs(ln_t - edge) < EDGE]
    if not ends:
        return []
    source = source_named(batch.problem.templates.photosphere)
    return [f"The fit lies at the {ends[0]} template of {source} ({np.exp(ln_t):.0f} K): the star may lie outside it."]


def over_luminosity(batch: FitBatch) -> list[tuple[float, float]]:
    """Brightness above the dwarf sequence and its error, mag, per row; NaN without parallax or sequence.

    5 log10 of the radius that theta and the parallax give over the sequence's radius at the fitted T_eff: an
    equal pair gives 0.753.
    """
    parallax = batch.problem.parallax_mas
    error = batch.problem.parallax_error_mas
    ln_r2, slope = batch.kit.ln_radius2.at(batch.x[:, LN_T])
    with np.errstate(invalid="ignore", divide="ignore"):
        ln_own = batch.x[:, LN_S] + 2 * np.log(1000.0 * PARSEC / parallax)
        excess = 2.5 / np.log(10) * (ln_own - ln_r2[:, 0])
        flux_slope = batch.kit.ratio.at(batch.x[:, LN_T])[1][:, 0]
        temperature = 2.5 / np.log(10) * np.abs(flux_slope + slope[:, 0]) * 0.02
        total = np.sqrt(SEQUENCE_SCATTER_MAG**2 + temperature**2 + (2.17 * error / parallax) ** 2)
    known = np.isfinite(parallax) & (ln_r2[:, 0] != 0.0)
    return [
        (float(value), float(sigma)) if ok else (float("nan"), float("nan"))
        for value, sigma, ok in zip(excess, total, known, strict=True)
    ]


def luminosity_remarks(value: float, error: float) -> list[str]:
    """What a brightness off the dwarf sequence may mean."""
    if not np.isfinite(value):
        return []
    if value > EVOLVED_MAG:
        return [f"Brighter than a dwarf by {value:.2f} +- {error:.2f} mag: evolved or young, or several stars."]
    if value < DIM_MAG:
        return [f"Fainter than a dwarf by {-value:.2f} +- {error:.2f} mag: a subdwarf, or dimmed."]
    return []


def parallax_remarks(candidate: Candidate, batch: FitBatch, row: int, settings: Settings) -> list[str]:
    """Why a parallax that was loaded is not used."""
    if np.isfinite(batch.problem.parallax_mas[row]) or not np.isfinite(fact(candidate, "parallax")):
        return []
    if fact(candidate, "ruwe") > settings.ruwe_max:
        return [f"Parallax not used: RUWE {fact(candidate, 'ruwe'):.2f} is above {settings.ruwe_max:g}."]
    return ["Parallax not used: it is less than 5 times its error."]
