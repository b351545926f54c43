"""Could dust near the star, warmed by it, make these fluxes?"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np

from tui.checks.prepare import fact
from tui.checks.record import Group, any_stands, dust_radius, fits_of, luminosity_sun, ordered_fits, stands
from tui.checks.remarks import common_remarks, gain_over_star
from tui.model import Candidate, Evidence, Fit, FloatArray, Param, Settings
from tui.physics.composite import A2, A3, DUST, DUST_AV, TWO_DUST, X2, X3, kit_for, predict
from tui.physics.context import shell_dimming, steady_state_ceiling
from tui.physics.fitting import FitBatch, finish, fit
from tui.physics.problem import Problem
from tui.physics.statistics import chi2_tail

KIND = "dust"
VERSION = 3  # raise it whenever the same candidate could get other numbers
SUBLIMATION_K = 1500.0  # silicates; common practice, no single source
EXTREME_F = 0.1
NO_DISC_F = 0.5
TRANSIENT = 1000.0  # times the steady-state ceiling; Wyatt et al. 2007
TWO_BANDS = 5  # bands that must carry an excess before a second temperature is tried
EXCESS_PULL = 3.0
LIMIT_TEMPERATURES_K = (30.0, 50.0, 80.0, 120.0, 200.0, 300.0, 500.0, 800.0, 1200.0)
ONE_SIDED_95 = 2.71
DUST_PARAMETERS = 2  # its temperature and its fraction: degrees of freedom of what dust gains
LEAST_DIMMING_MAG = 0.05  # of a shell: less than that no A_V contradicts
LEAST_AV_SIGMA = 0.02  # mag


def fit_dust(problem: Problem, star: FitBatch, settings: Settings) -> list[Group]:
    """Fits of star + dust; those with two temperatures only of the rows that ask for them."""
    everyone = np.arange(len(problem))
    bare = fit(problem, DUST, start=star.x, errors=star.errors)
    screened = fit(problem, DUST_AV, start=bare.x, errors=bare.errors)
    groups = [Group(bare, everyone), Group(screened, everyone)]
    rows = asks_for_two(problem, screened, settings)
    if not rows.size:
        return groups
    two = fit(problem.take(rows), TWO_DUST, start=screened.x[rows], errors=screened.errors.take(rows))
    return [*groups, Group(warmer_first(two), rows)]


def warmer_first(batch: FitBatch) -> FitBatch:
    """The same fits with the warmer dust as the first, so that the order means something."""
    x = batch.x.copy()
    swap = (x[:, X3] > x[:, X2]) & (x[:, A3] > 0)
    if not swap.any():
        return batch
    x[np.ix_(swap, [X2, A2, X3, A3])] = x[np.ix_(swap, [X3, A3, X2, A2])]
    return finish(batch.problem, batch.kit, batch.errors, x)


def asks_for_two(problem: Problem, one: FitBatch, settings: Settings) -> np.ndarray:
    """Rows whose one temperature is refused while at least five bands carry an excess."""
    points = problem.points
    dof = np.maximum(points - len(DUST_AV.free), 1)
    refused = chi2_tail(one.chi2, dof) < settings.p_min
    left = np.where(problem.detected, problem.flux_jy - one.prediction.star, 0.0) / one.errors.sigma
    carrying = (left > EXCESS_PULL).sum(axis=1)
    return np.flatnonzero(refused & (carrying >= TWO_BANDS) & (points > len(TWO_DUST.free)))


def assess(
    candidates: Sequence[Candidate],
    problem: Problem,
    star_batch: FitBatch,
    star: Sequence[Evidence],
    settings: Settings,
) -> list[Evidence]:
    """Dust evidence for each candidate; order kept."""
    groups = fit_dust(problem, star_batch, settings)
    fits = ordered_fits(groups, len(problem))
    limits = largest_fraction(star_batch)
    screens = screens_of(groups[1], [row for row, found in enumerate(fits) if asks_for_screen(found[0][0])])
    return [
        one_evidence(candidate, fits[row], star[row], problem, row, limits[row], screens.get(row), settings)
        for row, candidate in enumerate(candidates)
    ]


def asks_for_screen(best: Fit) -> bool:
    """Whether dust all round would dim the star by what an A_V can contradict, and the best fit has no A_V."""
    fraction = best.params.get("dust_fractional_luminosity")
    return fraction is not None and "av" not in best.params and shell_dimming(fraction.value) >= LEAST_DIMMING_MAG


def screens_of(screened: Group, rows: Sequence[int]) -> dict[int, Param]:
    """Row -> A_V of its fit behind a screen, with its interval."""
    if not rows:
        return {}
    found = fits_of(screened.batch.take(np.array(rows)))
    return {row: one.params["av"] for row, one in zip(rows, found, strict=True)}


def one_evidence(
    candidate: Candidate,
    fits: list[tuple[Fit, int]],
    star: Evidence,
    problem: Problem,
    row: int,
    limits: FloatArray,
    screen: Param | None,
    settings: Settings,
) -> Evidence:
    """Put one candidate's evidence together.

    Remarks about the dust stand only beside a fit that is not refused and is better than the star alone by more than
    chance: where nothing asks for dust, its numbers mean nothing.
    """
    if star.best is None:
        return Evidence(KIND, VERSION, None, (), star.cautions[:1], {}, bands=star.bands)
    parallax = float(problem.parallax_mas[row])
    ordered = [with_radius(each, parallax) for each, _ in fits]
    best = ordered[0]
    told: dict[str, object] = gain_over_star(best, star.best)
    told["limit_temperature_k"] = list(LIMIT_TEMPERATURES_K)
    told["limit_fractional_luminosity"] = [float(f"{limit:.4g}") for limit in limits]
    cautions = common_remarks(best, star.adequate, settings)
    is_better = float(chi2_tail(max(star.best.chi2 - best.chi2, 0.0), DUST_PARAMETERS)) < settings.p_min
    if is_better and stands(*fits[0], settings) is not False:
        av = best.params.get("av", screen)
        cautions += dust_cautions(candidate, best, parallax, told, av, float(problem.av_max[row]))
    if "dust_temperature" not in best.params or (star.adequate and not is_better):
        cautions.append(limit_sentence(limits))
    answer = any_stands([stands(each, points, settings) for each, points in fits])
    return Evidence(KIND, VERSION, answer, tuple(ordered), tuple(cautions), told, bands=star.bands)


def with_radius(fit_: Fit, parallax_mas: float) -> Fit:
    """The fit with the dust's radius added, where the parallax gives the star's luminosity."""
    temperature = fit_.params.get("dust_temperature")
    luminosity = luminosity_sun(fit_.params["teff"].value, fit_.params["theta"].value, parallax_mas)
    if temperature is None or not luminosity > 0:
        return fit_
    return replace(fit_, params={**fit_.params, "dust_radius": dust_radius(temperature, luminosity)})


def dust_cautions(
    candidate: Candidate,
    best: Fit,
    parallax_mas: float,
    told: Mapping[str, object],
    av: Param | None,
    av_ceiling: float,
) -> list[str]:
    """Physical remarks; none of them refuses a fit.

    Args:
        av: A_V of the best fit, or of the one behind a screen where the best has none.
        av_ceiling: mag, the most extinction that the line of sight allows.
    """
    found, params = [], best.params
    temperature, fraction = params.get("dust_temperature"), params.get("dust_fractional_luminosity")
    if temperature is None or fraction is None:
        return found
    if temperature.value > SUBLIMATION_K:
        found.append(f"Dust at {temperature.value:.0f} K: silicates are gone above about {SUBLIMATION_K:.0f} K.")
    if fraction.value > NO_DISC_F:
        found.append(f"f = {fraction.value:.2f}: more than a disc can take of the star's light.")
    elif fraction.value > EXTREME_F:
        found.append(f"f = {fraction.value:.2f}: extreme for a disc.")
    carried = told.get("carried_by") or []
    if len(carried) == 1:
        found.append(f"Only {carried[0]} carries the excess: one band fixes no temperature.")
    found += shell_remark(fraction, av, av_ceiling)
    found += age_remark(candidate, best, parallax_mas)
    return found


def shell_remark(fraction: Param, av: Param | None, av_ceiling: float) -> list[str]:
    """Dust all round the star would dim it by 2.5 log10(1 + f); a conflict only beyond 3 sigma of A_V.

    Where no A_V was fitted, only more than the line of sight allows is a conflict; at its ceiling A_V contradicts none.
    """
    dimming = float(shell_dimming(fraction.value))
    if dimming < LEAST_DIMMING_MAG:
        return []
    if av is None or not np.isfinite(av.high):
        upper, what = av_ceiling, f"and the line of sight allows {av_ceiling:.2f}"
    elif av.limit and not av.high > av.value:
        return []
    else:
        sigma = (av.high - av.value) / (ONE_SIDED_95**0.5 if av.limit else 1.0)
        upper = av.value + 3 * max(sigma, LEAST_AV_SIGMA)
        what = f"and A_V {av.value:.2f} allows {upper:.2f}"
    return [] if dimming <= upper else [f"A shell all round would dim the star by {dimming:.2f} mag, {what}."]


def age_remark(candidate: Candidate, best: Fit, parallax_mas: float) -> list[str]:
    """The dust against what a colliding belt of this age can keep up (Wyatt et al. 2007)."""
    age, radius = fact(candidate, "age_myr"), best.params.get("dust_radius")
    if radius is None or not age > 0:
        return []
    luminosity = luminosity_sun(best.params["teff"].value, best.params["theta"].value, parallax_mas)
    mass = luminosity ** (1 / 3.5)  # main sequence; common practice, no single source
    ceiling = float(steady_state_ceiling(radius.value, age, mass, luminosity))
    ratio = best.params["dust_fractional_luminosity"].value / ceiling
    if ratio <= TRANSIENT:
        return []
    return [f"f is {ratio:.0f} times what a belt of {age:g} Myr keeps up: transient dust, which is dust all the same."]


def largest_fraction(star: FitBatch) -> FloatArray:
    """Largest fractional luminosity (95 %) that dust at each of LIMIT_TEMPERATURES_K may have, (M, 9).

    Star temperature as fitted alone, its scale free; errors of the star-only fit.
    """
    kit = kit_for(DUST, star.problem.templates)
    out = np.full((len(star.problem), len(LIMIT_TEMPERATURES_K)), np.nan)
    weight = np.where(star.problem.detected, star.errors.sigma**-2.0, 0.0)
    left = star.problem.flux_jy - star.prediction.flux
    ss = np.sum(weight * star.prediction.flux**2, axis=1)
    for column, kelvin in enumerate(LIMIT_TEMPERATURES_K):
        x = star.x.copy()
        x[:, X2], x[:, A2] = np.log(kelvin), 1.0
        unit = predict(kit, x).flux - star.prediction.flux
        share = np.sum(weight * unit * star.prediction.flux, axis=1) / np.maximum(ss, 1e-300)
        free = unit - share[:, None] * star.prediction.flux
        size = np.sum(weight * free**2, axis=1)
        best = np.sum(weight * free * left, axis=1) / np.maximum(size, 1e-300)
        sigma = np.maximum(size, 1e-300) ** -0.5
        rise = np.where(best > 0, 0.0, (best / sigma) ** 2)
        out[:, column] = best + sigma * np.sqrt(ONE_SIDED_95 + rise)
    return out


def limit_sentence(limits: FloatArray) -> str:
    """Where dust could still hide, with numbers."""
    cold, warm = (limits[LIMIT_TEMPERATURES_K.index(kelvin)] for kelvin in (80.0, 300.0))
    return f"No dust needed; 95 % limits on f: {warm:.1g} at 300 K, {cold:.1g} at 80 K (colder hides more)."


