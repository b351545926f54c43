"""The five checks in the order in which they are walked, and what stands beside them: mixture bound and dips."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace
from typing import Any

from tui.checks import blend, dips, dust, extinction, instrument, mixture, star
from tui.checks.by_hand import Curve, curve, probe
from tui.checks.cautions import natural_cautions
from tui.checks.prepare import prepare
from tui.checks.record import fits_of
from tui.checks.spectra import as_measured, asks_for_more, bound_templates, own_settings, with_spectrum
from tui.checks.star import Oddness, oddness
from tui.checks.surroundings import surroundings
from tui.checks.tables import Tables
from tui.model import KINDS, Band, Candidate, Evidence, Settings
from tui.physics.composite import STAR
from tui.physics.fitting import FitBatch, fit
from tui.physics.templates import Templates

VERSIONS = {module.KIND: module.VERSION for module in (star, instrument, extinction, blend, dust, mixture, dips)}

__all__ = ["VERSIONS", "Curve", "Oddness", "assess", "assess_all", "curve", "oddness", "probe"]

Found = dict[str, list[Evidence]]  # kind -> one piece a candidate


def assess(
    kind: str, candidates: Sequence[Candidate], templates: Templates, settings: Settings, tables: Tables
) -> list[Evidence]:
    """Evidence of one kind for each candidate; order kept.

    Raises:
        TemplateError: `templates` lacks a band that some candidate has.
    """
    return [found[kind] for found in assess_all(candidates, templates, settings, (kind,), tables)]


def assess_all(
    candidates: Sequence[Candidate],
    templates: Templates,
    settings: Settings,
    kinds: Iterable[str],
    tables: Tables,
) -> list[dict[str, Evidence]]:
    """Evidence of several kinds for each candidate, what they share computed once; order kept.

    Raises:
        TemplateError: `templates` lacks a band that some candidate has.
    """
    wanted = [kind for kind in KINDS if kind in set(kinds) and kind in VERSIONS]
    if not candidates:
        return []
    loaded, candidates = candidates, [as_measured(one, templates) for one in candidates]
    settings = own_settings(settings, templates)
    bands = {band.name: band for band in templates.bands}
    problem = prepare(candidates, templates, settings)
    alone = fit(problem, STAR)
    found: Found = {"dips": dips.assess(candidates, bands, settings)}
    plain = star.assess(candidates, alone, settings)
    plain = [with_spectrum(*row, templates, settings) for row in zip(plain, loaded, candidates, strict=True)]
    found["star"] = [with_dips("star", *pair) for pair in zip(plain, found["dips"], strict=True)]
    if "instrument" in wanted:
        found["instrument"] = instrument.assess(candidates, alone, found["star"], fits_of, tables, settings)
    for module in (extinction, blend, dust):
        if module.KIND in wanted:
            plain = module.assess(candidates, problem, alone, found["star"], settings)
            plain = [asks_for_more(*pair, templates) for pair in zip(plain, found["star"], strict=True)]
            found[module.KIND] = [
                with_dips(module.KIND, *pair) for pair in zip(plain, found["dips"], strict=True)
            ]
    add_context(candidates, alone, found, bands, tables, settings)
    if "mixture" in wanted:
        known = [mixture.known_from({kind: rows[row] for kind, rows in found.items()}) for row in range(len(candidates))]
        found["mixture"] = mixture.assess(candidates, bound_templates(candidates, templates), settings, known)
    return [{kind: found[kind][row] for kind in wanted if kind in found} for row in range(len(candidates))]


def with_dips(kind: str, evidence: Evidence, seen: Evidence) -> Evidence:
    """A check's evidence once its candidate's standing dips are asked for too."""
    if not seen.facts.get("stands"):
        return evidence
    remark = "A dip stands: it has to be explained too (see dips)."
    return replace(
        evidence,
        adequate=dips.with_dips(kind, evidence.adequate, seen),
        facts={**evidence.facts, "dip_stands": True},
        cautions=(*evidence.cautions, remark),
    )


def add_context(
    candidates: Sequence[Candidate],
    alone: FitBatch,
    found: Found,
    bands: Mapping[str, Band],
    tables: Tables,
    settings: Settings,
) -> None:
    """What lies around a candidate, for blend; what its class tells, for dust. Neither touches `adequate`."""
    if "blend" in found:
        anomalies = instrument.star_anomalies(alone)
        for row, candidate in enumerate(candidates):
            first = found["star"][row].best
            if first is None:
                continue
            around = surroundings(candidate, anomalies[row], first.pulls, bands, tables, settings)
            found["blend"][row] = told(found["blend"][row], around.cautions, around.facts)
    if "dust" in found:
        for row, candidate in enumerate(candidates):
            found["dust"][row] = told(found["dust"][row], natural_cautions(candidate.facts, tables.classes), {})


def told(evidence: Evidence, cautions: Sequence[str], facts: Mapping[str, Any]) -> Evidence:
    """Evidence with further cautions and facts."""
    if not cautions and not facts:
        return evidence
    return replace(evidence, cautions=(*evidence.cautions, *cautions), facts={**evidence.facts, **facts})
