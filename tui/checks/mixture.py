"""Could any collection of natural thermal sources, each behind its own screen, make these fluxes?"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from functools import lru_cache

import numpy as np

from tui.model import Candidate, Evidence, FloatArray, Settings, Spectrum
from tui.physics.cone import Bound, p_bound, whiten
from tui.physics.cone_errors import ErrorModel, consistent_bound, widened, widened
from tui.physics.generators import Generators, build_generators
from tui.physics.photometry import is_narrow, quadrature
from tui.physics.problem import Problem, build_problem
from tui.physics.spectral import is_point, stretches
from tui.physics.spectral import is_point
from tui.physics.templates import Templates

KIND = "mixture"
VERSION = 1  # raise it whenever the same candidate could get other numbers
ENOUGH = 0.1  # a mixture with p of at least this (or p_min, if larger) is not improved further
CHUNK = 512  # candidates solved together
NODES = 120  # quadrature nodes a band; 240 give the same to 2e-5
TOLD = 0.25  # bands whose weight is at least this share of the largest are named in the sentence
STRETCHES = 2  # of a spectrum that are named
PART_SHARE = 0.005  # smallest share of the light of a mixture's part that is listed
INSIDE = frozenset(
    {
        "star", "star + A_V", "star + A_V, R_V", "star + dust", "star + dust, A_V", "star + two dusts, A_V",
        "bound pair", "free pair", "star + compact",
    }
)  # fmt: skip  # models made of the cone's own sources: their chi-square is never below the best mixture's
BROAD = ("dwarfs", "planck")  # sources that do not know a star's lines
NO_SPECTRUM = Spectrum(np.empty(0), np.empty(0), np.empty(0))  # marks that there was one
SPECTRUM_CAUTION = (
    "The spectrum is not in the mixture bound: without photosphere spectra at its resolution "
    "an ordinary star's own lines would be refused."
)


def assess(
    candidates: Sequence[Candidate],
    templates: Templates,
    settings: Settings,
    known_chi2: Sequence[float] | None = None,
) -> list[Evidence]:
    """Bound the least chi-square of any natural mixture; order kept.

    `adequate`: True, no mixture is refused (p >= p_min); False, every mixture is; None, fewer than two bands.

    Args:
        known_chi2: per candidate the least chi-square of models that lie in the cone (see `known_from`), NaN where
            there is none; where that alone cannot be refused, nothing is solved and chi2 is "at most".
    Raises:
        TemplateError: `templates` lacks a band that some candidate has.
    """
    if templates.photosphere in BROAD:
        candidates = [_broad(candidate) for candidate in candidates]
    nothing = np.full(len(candidates), np.nan)
    problem = build_problem(
        candidates, templates, parallaxes=(nothing, nothing), av_max=nothing, common=settings.common
    )
    cautions = [(SPECTRUM_CAUTION,) if one.spectrum is not None else () for one in candidates]
    return assess_problem(problem, templates, settings, known_chi2, cautions)


def _broad(candidate: Candidate) -> Candidate:
    """The candidate without the points of its spectrum."""
    kept = tuple(one for one in candidate.measurements if not is_point(one.band))
    if len(kept) == len(candidate.measurements):
        return candidate
    return replace(candidate, measurements=kept, spectrum=NO_SPECTRUM)


def known_from(evidence: Mapping[str, Evidence]) -> float:
    """Least chi-square among a candidate's fits whose models lie in the cone; NaN where there is none."""
    found = [fit.chi2 for one in evidence.values() for fit in one.fits if fit.model in INSIDE and np.isfinite(fit.chi2)]
    return min(found, default=np.nan)


def assess_problem(
    problem: Problem,
    templates: Templates,
    settings: Settings,
    known_chi2: Sequence[float] | None = None,
    cautions: Sequence[tuple[str, ...]] | None = None,
) -> list[Evidence]:
    """`assess` on arrays that are there already; `templates` are the ones that `problem` was built from."""
    errors = error_model(problem)
    known = np.full(len(problem), np.nan) if known_chi2 is None else np.asarray(known_chi2, dtype=np.float64)
    points = np.where(problem.detected.any(axis=1), problem.points, 0)  # limits alone bound nothing
    white = whiten(errors.first())
    p_known = p_bound(np.nan_to_num(known, nan=np.inf), points, np.sum(white.target**2, axis=1))
    skipped = np.isfinite(known) & (p_known >= settings.p_min)
    notes = cautions or [()] * len(problem)
    out: list[Evidence | None] = [None] * len(problem)
    for row in np.flatnonzero(skipped | (points < 2)):
        out[row] = _unsolved(problem, row, settings, float(known[row]), float(p_known[row]), notes[row])
    todo = np.flatnonzero(~skipped & (points >= 2))
    used = problem.detected | problem.limited
    todo = todo[np.lexsort(used[todo].T)] if len(todo) else todo
    enough = max(settings.p_min, ENOUGH)
    for first in range(0, len(todo), CHUNK):
        rows = todo[first : first + CHUNK]
        columns = np.flatnonzero(used[rows].any(axis=0))
        place = {name: index for index, name in enumerate(templates.names)}
        generators = _through(templates, tuple(place[problem.templates.names[column]] for column in columns))
        bound = consistent_bound(generators, _narrow(errors, rows, columns), settings.p_min, enough)
        for turn, row in enumerate(rows):
            out[row] = _solved(problem, row, columns, bound, turn, generators, settings, notes[row])
    return [one for one in out if one is not None]


@lru_cache(maxsize=2)
def generators_for(templates: Templates) -> Generators:
    """All columns through the bands of `templates`; about a second, kept for the last two templates."""
    rules = [quadrature(band, None if is_narrow(band) else NODES) for band in templates.bands]
    star = templates.star
    teff_k = np.exp(star.low + star.step * np.arange(star.ln_flux.shape[0]))
    return build_generators(rules, teff_k, star.ln_flux, templates.law)


@lru_cache(maxsize=2)
def _through(templates: Templates, columns: tuple[int, ...]) -> Generators:
    return generators_for(templates).through(columns)


def error_model(problem: Problem) -> ErrorModel:
    """What the covariance is made of, in the bands of `problem`."""
    templates = problem.templates
    return ErrorModel(
        flux=problem.flux_jy,
        error=problem.error_jy,
        detected=problem.detected,
        limited=problem.limited,
        floor=templates.floor,
        spread=widened(np.nan_to_num(templates.spread), templates.star.step),
        ln_t=(templates.star.low, templates.star.step),
        common=problem.common,
    )


def _narrow(errors: ErrorModel, rows: np.ndarray, columns: np.ndarray) -> ErrorModel:
    """Some candidates in some bands."""
    cells = (getattr(errors, name)[np.ix_(rows, columns)] for name in ("flux", "error", "detected", "limited"))
    return ErrorModel(*cells, errors.floor[columns], errors.spread[:, columns], errors.ln_t, errors.common[:, columns])


def family(photosphere: str) -> str:
    """What the mixtures are made of, in words."""
    stars = {"dwarfs": "dwarf photospheres and ", "planck": ""}.get(photosphere, "the grid's photospheres and ")
    return f"{stars}(modified) black bodies"


def _names(problem: Problem, row: int) -> tuple[str, ...]:
    used = problem.detected[row] | problem.limited[row]
    return tuple(name for name, there in zip(problem.templates.names, used, strict=True) if there)


def _unsolved(
    problem: Problem, row: int, settings: Settings, known: float, p: float, cautions: tuple[str, ...]
) -> Evidence:
    """Too few bands, or natural already by a fit."""
    names = _names(problem, row)
    facts = {"points": len(names), "family": family(problem.templates.photosphere), "witness": {}}
    if len(names) < 2:
        facts |= {"at_most": False, "sentence": f"Bands measured: {len(names)}. A mixture needs two to be tested."}
        return Evidence(KIND, VERSION, None, cautions=cautions, facts=facts, bands=names)
    facts |= {"chi2": known, "p": p, "at_most": True}
    facts["sentence"] = _natural_sentence(facts)
    return Evidence(KIND, VERSION, True, cautions=cautions, facts=facts, bands=names)


def _natural_sentence(facts: Mapping[str, object]) -> str:
    how = "at most" if facts["at_most"] else "at least"
    return (
        f"A mixture of {facts['family']} is not refused: the nearest has chi-square {how} {facts['chi2']:.1f} "
        f"in {facts['points']} bands."
    )


def _solved(
    problem: Problem,
    row: int,
    columns: np.ndarray,
    bound: Bound,
    turn: int,
    generators: Generators,
    settings: Settings,
    cautions: tuple[str, ...],
) -> Evidence:
    """Evidence of one candidate of a chunk."""
    names = [problem.templates.names[column] for column in columns]
    p = float(bound.p[turn])
    refused = p < settings.p_min
    facts = {
        "chi2": float(bound.chi2[turn]),
        "points": int(bound.points[turn]),
        "p": p,
        "at_most": bool(bound.at_most[turn]),
        "family": family(problem.templates.photosphere),
        "witness": witness(names, bound.weights[turn], bound.covariance[turn]),
        "chi2_found": float(bound.feasible[turn]),
        "parts": parts(generators, bound, turn),
    }
    limited = {name for name, column in zip(names, columns, strict=True) if problem.limited[row, column]}
    facts["sentence"] = refusal_sentence(facts, limited) if refused else _natural_sentence(facts)
    if refused and limited:
        cautions = (*cautions, "Upper limits count as bands met or missed, so the bound's p is itself a bound.")
    return Evidence(KIND, VERSION, not refused, cautions=cautions, facts=facts, bands=_names(problem, row))


def witness(names: Sequence[str], weights: FloatArray, covariance: FloatArray) -> dict[str, float]:
    """Band -> weight u, the proof in numbers.

    The sum of u F/sigma over the bands is the root of the certified chi-square, and for every natural source the
    sum of u g/sigma is not positive; sigma is the band's total error. Empty where nothing was proved.
    """
    length = float(np.sqrt(weights @ covariance @ weights))
    if length <= 0:
        return {}
    sigma = np.sqrt(np.diagonal(covariance))
    return {name: float(u) for name, u in zip(names, weights * sigma / length, strict=True) if u != 0.0}


def refusal_sentence(facts: Mapping[str, object], limited: set[str]) -> str:
    """The witness in one sentence."""
    weights = facts["witness"]
    least = TOLD * max((abs(u) for u in weights.values()), default=0.0)
    among = [name for name in weights if is_point(name)]
    bright = _listed(_gathered([name for name, u in weights.items() if u >= least], among), set())
    faint = _listed(_gathered([name for name, u in weights.items() if u <= -least], among), limited)
    verb = "is" if " and " not in bright else "are"
    return (
        f"{bright} {verb} too bright against {faint}: no mixture of {facts['family']} comes nearer than "
        f"chi-square {facts['chi2']:.1f} in {facts['points']} bands (p at most {facts['p']:.2g})."
    )


def _gathered(names: Sequence[str], among: list[str]) -> list[str]:
    """Band names, those of points of a spectrum as the longest stretches that they make."""
    plain = [name for name in names if not is_point(name)]
    return plain + stretches([name for name in names if is_point(name)], among)[:STRETCHES]


def _listed(names: Sequence[str], limited: set[str]) -> str:
    """`A`, `A and B`, `A, B and C`; limits are called so."""
    told = [f"the limit in {name}" if name in limited else name for name in names] or ["the rest"]
    return told[0] if len(told) == 1 else f"{', '.join(told[:-1])} and {told[-1]}"


def parts(generators: Generators, bound: Bound, turn: int) -> list[dict[str, object]]:
    """The best mixture found, largest part first: what each source is and its share of the light.

    The share is of the flux summed over the bands in units of each band's error.
    """
    weight = 1.0 / np.sqrt(np.diagonal(bound.covariance[turn]))
    used = np.flatnonzero((bound.index[turn] >= 0) & (bound.scale[turn] > 0))
    light = (generators.column(bound.index[turn, used]) @ weight) * bound.scale[turn, used]
    order = np.argsort(-light)
    total = max(float(light.sum()), 1e-300)
    found = [(float(light[place]) / total, int(bound.index[turn, used[place]])) for place in order]
    return [{**generators.describe(index), "share": share} for share, index in found if share >= PART_SHARE]
