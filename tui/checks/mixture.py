"""Could any collection of natural thermal sources, each behind its own screen, make these fluxes?"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property, lru_cache

import numpy as np

from tui.checks.mixture_words import (
    LIMITS_CAUTION,
    SPECTRUM_CAUTION,
    dark_caution,
    family,
    natural_sentence,
    refusal_sentence,
)
from tui.model import Candidate, Evidence, FloatArray, Settings, Spectrum
from tui.physics.cone import Bound, p_bound, whiten
from tui.physics.cone_errors import ErrorModel, consistent_bound, widened
from tui.physics.generators import Generators
from tui.physics.natural_sources import generators_of
from tui.physics.problem import Problem, build_problem
from tui.physics.spectral import is_point
from tui.physics.templates import Templates

KIND = "mixture"
VERSION = 2  # raise it whenever the same candidate could get other numbers
ENOUGH = 0.1  # a mixture with p of at least this (or p_min, if larger) is not improved further
CHUNK = 512  # candidates solved together
PART_SHARE = 0.005  # smallest share of the light of a mixture's part that is listed
INSIDE = "star"  # the kind of evidence whose fit is always there, and whose model is one of the cone's own sources
BROAD = ("dwarfs", "planck")  # sources that do not know a star's lines
NO_SPECTRUM = Spectrum(np.empty(0), np.empty(0), np.empty(0))  # marks that there was one


def assess(
    candidates: Sequence[Candidate],
    templates: Templates,
    settings: Settings,
    known_chi2: Sequence[float] | None = None,
) -> list[Evidence]:
    """Bound the least chi-square of any natural mixture; order kept.

    `adequate`: True, no mixture is refused (p >= p_min); False, every mixture is; None, fewer than two bands.

    Args:
        known_chi2: per candidate the chi-square of a model that lies in the cone (see `known_from`), NaN where there
            is none; where that alone cannot be refused, nothing is solved and chi2 is "at most".
    Raises:
        TemplateError: `templates` lacks a band that some candidate has.
    """
    candidates = broadened(candidates, templates)
    cautions = [(SPECTRUM_CAUTION,) if one.spectrum is not None else () for one in candidates]
    return assess_problem(problem_of(candidates, templates, settings), templates, settings, known_chi2, cautions)


def problem_of(candidates: Sequence[Candidate], templates: Templates, settings: Settings) -> Problem:
    """The fluxes that are bounded; nothing else of a candidate matters."""
    nothing = np.full(len(candidates), np.nan)
    return build_problem(candidates, templates, parallaxes=(nothing, nothing), av_max=nothing, common=settings.common)


def broadened(candidates: Sequence[Candidate], templates: Templates) -> list[Candidate]:
    """The candidates, without the points of their spectra where the photospheres have no lines."""
    return [_broad(one) for one in candidates] if templates.photosphere in BROAD else list(candidates)


def _broad(candidate: Candidate) -> Candidate:
    """The candidate without the points of its spectrum."""
    kept = tuple(one for one in candidate.measurements if not is_point(one.band))
    if len(kept) == len(candidate.measurements):
        return candidate
    return replace(candidate, measurements=kept, spectrum=NO_SPECTRUM)


def known_from(evidence: Mapping[str, Evidence]) -> float:
    """Chi-square of the star alone, which lies in the cone; NaN where it was not fitted.

    Fits of other checks lie in the cone too, but are not always made, and what is found of a candidate must not
    depend on what else was asked.
    """
    best = evidence[INSIDE].best if INSIDE in evidence else None
    return float(best.chi2) if best is not None and np.isfinite(best.chi2) else np.nan


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
    added = templates.cone.added if templates.cone else ()
    out: list[Evidence | None] = [None] * len(problem)
    for row in np.flatnonzero(skipped | (points < 2)):
        out[row] = _unsolved(problem, row, added, float(known[row]), float(p_known[row]), notes[row])
    todo = np.flatnonzero(~skipped & (points >= 2))
    used = problem.detected | problem.limited
    todo = todo[np.lexsort(used[todo].T)] if len(todo) else todo
    enough = max(settings.p_min, ENOUGH)
    names = problem.templates.names
    for first in range(0, len(todo), CHUNK):
        rows = todo[first : first + CHUNK]
        columns = np.flatnonzero(used[rows].any(axis=0))
        generators = generators_for(templates, tuple(names[column] for column in columns))
        bound = consistent_bound(generators, _narrow(errors, rows, columns), settings.p_min, enough)
        solved = _Solved(problem, rows, columns, bound, generators, settings.p_min)
        for turn, row in enumerate(rows):
            out[row] = solved.evidence(turn, notes[row])
    return [one for one in out if one is not None]


@lru_cache(maxsize=2)
def generators_for(templates: Templates, names: tuple[str, ...]) -> Generators:
    """The columns in some bands of `templates`: where it tells where they are kept, from there, else built."""
    if templates.cone is not None:
        return templates.cone(templates, names)
    place = {name: index for index, name in enumerate(templates.names)}
    return _built(templates).through([place[name] for name in names])


@lru_cache(maxsize=2)
def _built(templates: Templates) -> Generators:
    return generators_of(templates)


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


def _unsolved(
    problem: Problem, row: int, added: tuple[str, ...], known: float, p: float, cautions: tuple[str, ...]
) -> Evidence:
    """Too few bands, or natural already by a fit."""
    used = problem.detected[row] | problem.limited[row]
    names = tuple(name for name, there in zip(problem.templates.names, used, strict=True) if there)
    facts = {"points": len(names), "family": family(problem.templates.photosphere, added), "witness": {}}
    facts |= {"templates": list(added)} if added else {}
    if len(names) < 2:
        facts |= {"at_most": False, "sentence": f"Bands measured: {len(names)}. A mixture needs two to be tested."}
        return Evidence(KIND, VERSION, None, cautions=cautions, facts=facts, bands=names)
    facts |= {"chi2": known, "p": p, "at_most": True}
    facts["sentence"] = natural_sentence(facts)
    return Evidence(KIND, VERSION, True, cautions=cautions, facts=facts, bands=names)


@dataclass(frozen=True, eq=False)
class _Solved:
    """A chunk of candidates and what was found of them."""

    problem: Problem
    rows: np.ndarray  # of the problem
    columns: np.ndarray  # of the problem: the bands that any of them has
    bound: Bound
    generators: Generators
    p_min: float

    @cached_property
    def names(self) -> list[str]:
        """The bands solved in."""
        all_names = self.problem.templates.names
        return [all_names[column] for column in self.columns]

    @cached_property
    def family(self) -> str:
        """What the mixtures were made of."""
        return family(self.problem.templates.photosphere, self.generators.added)

    @cached_property
    def light(self) -> FloatArray:
        """Light of each part of each mixture, in units of the bands' errors; shape (K, m), zero where there is none."""
        weight = 1.0 / np.sqrt(np.einsum("kbb->kb", self.bound.covariance))
        used = (self.bound.index >= 0) & (self.bound.scale > 0)
        columns = self.generators.column(np.maximum(self.bound.index, 0))
        return np.where(used, np.einsum("kmb,kb->km", columns, weight) * self.bound.scale, 0.0)

    def evidence(self, turn: int, cautions: tuple[str, ...]) -> Evidence:
        """Evidence of one of them."""
        bound, row = self.bound, self.rows[turn]
        p = float(bound.p[turn])
        refused = p < self.p_min
        facts = {
            "chi2": float(bound.chi2[turn]),
            "points": int(bound.points[turn]),
            "p": p,
            "at_most": bool(bound.at_most[turn]),
            "family": self.family,
            "witness": witness(self.names, bound.weights[turn], bound.covariance[turn]),
            "chi2_found": float(bound.feasible[turn]),
            "parts": self.parts(turn),
        }
        facts |= {"templates": list(self.generators.added)} if self.generators.added else {}
        limits, detected = (cells[row, self.columns] for cells in (self.problem.limited, self.problem.detected))
        limited = {self.names[place] for place in np.flatnonzero(limits)}
        facts["sentence"] = refusal_sentence(facts, limited) if refused else natural_sentence(facts)
        bands = tuple(self.names[place] for place in np.flatnonzero(limits | detected))
        if refused:
            cautions = (*cautions, *((LIMITS_CAUTION,) if limited else ()), *self.dark(bands))
        return Evidence(KIND, VERSION, not refused, cautions=cautions, facts=facts, bands=bands)

    def parts(self, turn: int) -> list[dict[str, object]]:
        """The best mixture found, largest part first: what each source is and its share of the light.

        The share is of the flux summed over the bands in units of each band's error.
        """
        share = self.light[turn] / max(float(self.light[turn].sum()), 1e-300)
        order = [place for place in np.argsort(-share, kind="stable") if share[place] >= PART_SHARE]
        index = self.bound.index[turn]
        return [{**self.generators.describe(int(index[place])), "share": float(share[place])} for place in order]

    def dark(self, bands: tuple[str, ...]) -> tuple[str, ...]:
        """The caution that some templates of the user are dark in some bands, where they are."""
        dark = self.generators.dark(self.names).items()
        met = {name: [band for band in bands if band in missed] for name, missed in dark}
        met = {name: missed for name, missed in met.items() if missed}
        return (dark_caution(met),) if met else ()


def witness(names: Sequence[str], weights: FloatArray, covariance: FloatArray) -> dict[str, float]:
    """Band -> weight u, the proof in numbers.

    The sum of u F/sigma over the bands is the root of the certified chi-square, and for every natural source the
    sum of u g/sigma is not positive; sigma is the band's total error. Empty where nothing was proved.
    """
    length = float(np.sqrt(weights @ covariance @ weights)) if weights.any() else 0.0
    if length <= 0:
        return {}
    sigma = np.sqrt(np.diagonal(covariance))
    return {name: float(u) for name, u in zip(names, weights * sigma / length, strict=True) if u != 0.0}
