"""Could a second source in the beam make these fluxes?"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from tui.checks.record import RAD_TO_MAS, Group, any_stands, ordered_fits, stands
from tui.checks.remarks import common_remarks, gain_over_star
from tui.model import Candidate, Evidence, Fit, Settings
from tui.physics.composite import A2, BOUND_PAIR, COMPACT, FREE_PAIR, GALAXY, LN_S, LN_T, X2
from tui.physics.constants import PARSEC, R_SUN
from tui.physics.fitting import FitBatch, finish, fit
from tui.physics.problem import Problem

KIND = "blend"
VERSION = 3  # raise it whenever the same candidate could get other numbers
COMPACT_RADIUS = (0.005, 0.3)  # R_sun: white dwarfs and hot subdwarfs
EQUAL_PAIR_MAG = 0.753
ANY_PAIR_MAG = 0.92  # unequal pairs reach 0.17 mag more, since the fitted temperature is below the primary's
MODELS = (BOUND_PAIR, FREE_PAIR, COMPACT, GALAXY)


def fit_blend(problem: Problem, star: FitBatch) -> list[FitBatch]:
    """Fits of every kind of second source, behind one screen."""
    has_sequence = bool(np.isfinite(problem.templates.radius_m).any())
    batches: list[FitBatch] = []
    for model in MODELS:
        if model.bound_pair and not has_sequence:
            continue
        before = batches[-1] if batches else star
        batch = fit(problem, model, start=None if model.bound_pair else star.x, errors=before.errors)
        batches.append(hotter_first(batch) if model.sources == ("star",) else batch)
    return batches


def hotter_first(batch: FitBatch) -> FitBatch:
    """The same fits with the hotter star of a pair as the first."""
    x = batch.x.copy()
    swap = (x[:, X2] > x[:, LN_T]) & (batch.model.bound_pair | (x[:, A2] > 1e-12))
    if not swap.any():
        return batch
    first, second = x[swap, LN_T], x[swap, X2]
    if batch.model.bound_pair:
        shift = (batch.kit.ln_radius2.at(second)[0] - batch.kit.ln_radius2.at(first)[0])[:, 0]
    else:
        shift = np.log(x[swap, A2]) + (batch.kit.ratio.at(first)[0] - batch.kit.ratio.at(second)[0])[:, 0]
        x[swap, A2] = 1.0 / x[swap, A2]
    x[swap, LN_T], x[swap, X2] = second, first
    x[swap, LN_S] += shift
    return finish(batch.problem, batch.kit, batch.errors, x)


def assess(
    candidates: Sequence[Candidate],
    problem: Problem,
    star_batch: FitBatch,
    star: Sequence[Evidence],
    settings: Settings,
) -> list[Evidence]:
    """Blend evidence for each candidate; order kept."""
    rows = np.arange(len(problem))
    fits = ordered_fits([Group(batch, rows) for batch in fit_blend(problem, star_batch)], len(problem))
    return [one_evidence(fits[row], star[row], problem, row, settings) for row in range(len(candidates))]


def one_evidence(
    fits: list[tuple[Fit, int]], star: Evidence, problem: Problem, row: int, settings: Settings
) -> Evidence:
    """Put one candidate's evidence together."""
    if star.best is None:
        return Evidence(KIND, VERSION, None, (), star.cautions[:1], {}, bands=star.bands)
    answer = any_stands([stands(each, points, settings) for each, points in fits])
    best = fits[0][0]
    told = gain_over_star(best, star.best)
    told |= {name: star.facts.get(name) for name in ("over_luminosity", "over_luminosity_error")}
    cautions = common_remarks(best, star.adequate, settings)
    cautions += luminosity_remark(told["over_luminosity"], told["over_luminosity_error"])
    cautions += compact_remark(best, float(problem.parallax_mas[row]))
    if not np.isfinite(problem.parallax_mas[row]):
        cautions.append("No usable parallax: colours alone rarely tell a pair from one star.")
    return Evidence(KIND, VERSION, answer, tuple(each for each, _ in fits), tuple(cautions), told, bands=star.bands)


def luminosity_remark(value: object, error: object) -> list[str]:
    """What the brightness above the dwarf sequence says of a second star."""
    if not isinstance(value, float) or not np.isfinite(value) or not isinstance(error, float):
        return []
    if value > ANY_PAIR_MAG + 2 * error:
        return [
            f"Brighter than one dwarf by {value:.2f} +- {error:.2f} mag, which no pair of dwarfs is (an equal one: "
            f"{EQUAL_PAIR_MAG}): evolved, young, or its temperature is wrong."
        ]
    if value > 2 * error:
        return [f"Brighter than one dwarf by {value:.2f} +- {error:.2f} mag (an equal pair: {EQUAL_PAIR_MAG})."]
    return [f"As bright as one dwarf: {value:+.2f} +- {error:.2f} mag (an equal pair: {EQUAL_PAIR_MAG})."]


def compact_remark(best: Fit, parallax_mas: float) -> list[str]:
    """Whether a compact companion has a size that such stars have."""
    ratio = best.params.get("radius_ratio")
    if ratio is None or ratio.value <= 0 or not parallax_mas > 0:
        return []
    star_m = best.params["theta"].value / RAD_TO_MAS * 1000.0 * PARSEC / parallax_mas
    radius = ratio.value * star_m / R_SUN
    if COMPACT_RADIUS[0] <= radius <= COMPACT_RADIUS[1]:
        return []
    return [f"The hot companion's radius, {radius:.2g} R_sun, is outside {COMPACT_RADIUS[0]} to {COMPACT_RADIUS[1]}."]
