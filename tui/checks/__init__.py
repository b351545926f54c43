"""The five checks in the order in which they are walked, and what stands beside them: mixture bound and dips."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from tui.checks import blend, dust, extinction, instrument, mixture, star
from tui.checks.by_hand import Curve, curve, probe
from tui.checks.prepare import prepare
from tui.checks.record import fits_of
from tui.checks.star import Oddness, oddness
from tui.checks.tables import Tables
from tui.model import KINDS, Candidate, Evidence, Settings
from tui.physics.composite import STAR
from tui.physics.fitting import fit
from tui.physics.templates import Templates

VERSIONS = {module.KIND: module.VERSION for module in (star, instrument, extinction, blend, dust, mixture)}

__all__ = ["VERSIONS", "Curve", "Oddness", "assess", "assess_all", "curve", "oddness", "probe"]


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
    problem = prepare(candidates, templates, settings)
    alone = fit(problem, STAR)
    found = {"star": star.assess(candidates, alone, settings)}
    if "instrument" in wanted:

        def record(batch):
            return fits_of(batch, settings)

        found["instrument"] = instrument.assess(candidates, alone, found["star"], record, tables, settings)
    for module in (extinction, blend, dust):
        if module.KIND in wanted:
            found[module.KIND] = module.assess(candidates, problem, alone, found["star"], settings)
    if "mixture" in wanted:
        known = [mixture.known_from({kind: rows[row] for kind, rows in found.items()}) for row in range(len(candidates))]
        found["mixture"] = mixture.assess(candidates, templates, settings, known)
    return [{kind: found[kind][row] for kind in wanted if kind in found} for row in range(len(candidates))]
