"""Could dust between the stars make these fluxes?"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np

from tui.checks.prepare import fact
from tui.checks.record import Group, any_stands, fits_of, ordered_fits, stands
from tui.checks.remarks import common_remarks, gain_over_star
from tui.model import Candidate, Evidence, Fit, Settings
from tui.physics.composite import STAR_AV, STAR_AV_RV
from tui.physics.fitting import FitBatch, fit
from tui.physics.problem import Problem
from tui.physics.reddening import AV_MAX

KIND = "extinction"
VERSION = 2  # raise it whenever the same candidate could get other numbers
DISC_HEIGHT_KPC = 0.1
AV_PER_KPC = 1.8  # mag; Whittet 2003
LAWS_DIFFER_AV = 2.0  # beyond this the laws' own differences reach several per cent in the infrared
EXCESS_SIGMA = 3.0
INFRARED_UM = 2.0


def fit_extinction(problem: Problem, star: FitBatch, settings: Settings) -> list[FitBatch]:
    """Star behind a screen of free A_V, and of free R_V where the settings say so."""
    wide = _with_av(problem, AV_MAX)
    fixed = fit(wide, STAR_AV, r_v=fixed_r_v(settings), start=star.x, errors=star.errors)
    if settings.r_v != "free" or settings.law == "wc19":
        return [fixed]
    return [fixed, fit(wide, STAR_AV_RV, start=np.where(np.arange(8) == 3, 3.1, fixed.x), errors=fixed.errors)]


def fixed_r_v(settings: Settings) -> float:
    """R_V where it is not free."""
    return 3.1 if settings.r_v == "free" else float(settings.r_v)


def _with_av(problem: Problem, av_max: float) -> Problem:
    return replace(problem, av_max=np.full(len(problem), av_max))


def assess(
    candidates: Sequence[Candidate],
    problem: Problem,
    star_batch: FitBatch,
    star: Sequence[Evidence],
    settings: Settings,
) -> list[Evidence]:
    """Extinction evidence for each candidate; order kept."""
    rows = np.arange(len(problem))
    groups = [Group(batch, rows) for batch in fit_extinction(problem, star_batch, settings)]
    fits = ordered_fits(groups, len(problem))
    evidence = [
        one_evidence(candidate, fits[row], star[row], problem, row, settings) for row, candidate in enumerate(candidates)
    ]
    return try_other_law(evidence, problem, settings)


def try_other_law(evidence: list[Evidence], problem: Problem, settings: Settings) -> list[Evidence]:
    """Say of each infrared excess behind much extinction whether it survives another law."""
    pivot = dict(zip(problem.templates.names, problem.templates.pivot_um, strict=True))
    excess = {row: band for row, one in enumerate(evidence) if (band := infrared_excess(one, pivot))}
    if not excess:
        return evidence
    rows = np.array(sorted(excess))
    again = fits_of(fit(_with_av(problem.take(rows), AV_MAX), STAR_AV, other_law=True), with_intervals=False)
    law = problem.templates.other_law
    for row, other in zip(rows, again, strict=True):
        evidence[row] = with_other_law(evidence[row], excess[row], other, law, int(problem.points[row]), settings)
    return evidence


def infrared_excess(one: Evidence, pivot_um: Mapping[str, float]) -> str:
    """The infrared band brightest above a refused fit behind more than 2 mag; empty where there is none."""
    if one.adequate is not False or one.best is None or one.best.params["av"].value <= LAWS_DIFFER_AV:
        return ""
    pulls = {band: pull for band, pull in one.best.pulls.items() if pivot_um[band] > INFRARED_UM and pull > EXCESS_SIGMA}
    return max(pulls, key=lambda band: pulls[band], default="")


def with_other_law(one: Evidence, band: str, other: Fit, law: str, points: int, settings: Settings) -> Evidence:
    """The evidence with what another law makes of its excess."""
    survives = other.pulls[band] > EXCESS_SIGMA and stands(other, points, settings) is not True
    verb = "survives" if survives else "does not survive"
    remark = (
        f"The excess in {band} ({one.best.pulls[band]:+.1f} sigma) {verb} the law {law}: "
        f"there {other.pulls[band]:+.1f} sigma, p = {other.p:.2g}, A_V {other.params['av'].value:.2f}."
    )
    facts = {**one.facts, "other_law": law, "other_law_p": other.p, "excess_survives_other_law": survives}
    return replace(one, cautions=(*one.cautions, remark), facts=facts)


def one_evidence(
    candidate: Candidate,
    fits: list[tuple[Fit, int]],
    star: Evidence,
    problem: Problem,
    row: int,
    settings: Settings,
) -> Evidence:
    """Put one candidate's evidence together."""
    if star.best is None:
        return Evidence(KIND, VERSION, None, (), star.cautions[:1], {}, bands=star.bands)
    best = fits[0][0]
    av = best.params["av"].value
    ceiling, cause = av_limit(candidate, float(problem.parallax_mas[row]))
    told = gain_over_star(best, star.best) | {"law": settings.law, "av_line_of_sight": ceiling}
    cautions = common_remarks(best, star.adequate, settings)
    if av > ceiling:
        cautions.append(f"A_V {av:.2f} mag is more than {cause} allows ({ceiling:.2f} mag).")
    if av > LAWS_DIFFER_AV:
        cautions.append(
            f"At A_V {av:.1f} the laws themselves differ: G23 exceeds Wang & Chen 2019 by 14, 30, 38 % in J, H, Ks."
        )
    answer = any_stands([stands(one, points, settings) for one, points in fits])
    return Evidence(KIND, VERSION, answer, tuple(one for one, _ in fits), tuple(cautions), told, bands=star.bands)


def av_limit(candidate: Candidate, parallax_mas: float) -> tuple[float, str]:
    """Most extinction the line of sight can hold, mag, and what says so; infinite where nothing does.

    The candidate's own `av_max`, else an exponential disc: 1.8 mag/kpc h/|sin b| (1 - exp(-d |sin b|/h)), h = 0.1 kpc.
    """
    told = fact(candidate, "av_max")
    if np.isfinite(told):
        return told, "its line of sight"
    latitude = galactic_latitude(fact(candidate, "ra"), fact(candidate, "dec"))
    if not parallax_mas > 0:
        return float("inf"), ""
    distance_kpc = 1.0 / parallax_mas
    sine = abs(np.sin(latitude)) if np.isfinite(latitude) else 0.0
    if sine < 1e-3:
        return AV_PER_KPC * distance_kpc, "1.8 mag a kpc"
    column = DISC_HEIGHT_KPC / sine * -np.expm1(-distance_kpc * sine / DISC_HEIGHT_KPC)
    return float(AV_PER_KPC * column), "a dust disc of 1.8 mag a kpc"


POLE_RA, POLE_DEC = np.radians(192.85948), np.radians(27.12825)  # J2000; ESA 1997, Hipparcos catalogue vol. 1


def galactic_latitude(ra_deg: float, dec_deg: float) -> float:
    """Galactic latitude, radian; NaN where the position is unknown."""
    ra, dec = np.radians(ra_deg), np.radians(dec_deg)
    sine = np.sin(dec) * np.sin(POLE_DEC) + np.cos(dec) * np.cos(POLE_DEC) * np.cos(ra - POLE_RA)
    return float(np.arcsin(np.clip(sine, -1, 1)))
