"""Blend's context in one piece: neighbours, chance alignment, matches, centroids, signs of a second star."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from tui.checks.centroid import centroid_shifts, shift_sentences
from tui.checks.chance import LEAST_EXCESS_SIGMA, chance_of, chance_sentences
from tui.checks.match import catalogue_matches, match_sentences, nearest_source, worst_match
from tui.checks.multiplicity import multiplicity
from tui.checks.neighbours import Leak, neighbour_leaks, neighbour_sentences
from tui.checks.remarks import joined
from tui.checks.tables import Tables
from tui.model import Band, Candidate, Settings


@dataclass(frozen=True, slots=True, eq=False)
class Surroundings:
    """Facts and cautions for the blend evidence; no part of `adequate`."""

    facts: Mapping[str, Any]
    cautions: tuple[str, ...]


def surroundings(
    candidate: Candidate,
    anomaly_jy: Mapping[str, float],
    pulls: Mapping[str, float],
    bands: Mapping[str, Band],
    tables: Tables,
    settings: Settings,
) -> Surroundings:
    """What lies around a candidate and what that means for its excess.

    Args:
        anomaly_jy: band -> measured minus star-only model, Jy (`instrument.star_anomalies`).
        pulls: band -> star-only pull.
    """
    leaks = neighbour_leaks(candidate, bands, anomaly_jy)
    chance = chance_of(candidate, anomaly_jy, pulls, bands, tables.galaxies)
    matches = catalogue_matches(candidate)
    multiple, multiple_said = multiplicity(candidate, settings)
    nearest = nearest_source(candidate, matches)
    shifts = centroid_shifts(candidate, matches, anomaly_jy, pulls, bands)
    facts: dict[str, Any] = {
        "neighbours": len(candidate.neighbours),
        "neighbours_in_beam": max((leak.n_in_beam for leak in leaks), default=0),
        "neighbour_leaks": [leak.as_dict() for leak in leaks if leak.leak_jy > 0],
        "matches": [match.as_dict() for match in matches],
        **worst_match(matches),
        "centroid_shifts": [shift.as_dict() for shift in shifts],
        **multiple,
    }
    if math.isfinite(nearest):
        facts["nearest_source"] = nearest
    if chance is not None:
        facts.update(chance.as_facts())
    said = (
        *neighbour_sentences(leaks),
        *beam_sentences(nearest, pulls, bands, leaks),
        *chance_sentences(chance, settings.n_searched),
        *match_sentences(matches),
        *shift_sentences(shifts),
        *multiple_said,
    )
    return Surroundings(facts, said)


def beam_sentences(
    nearest_arcsec: float, pulls: Mapping[str, float], bands: Mapping[str, Band], leaks: Sequence[Leak]
) -> tuple[str, ...]:
    """A source inside the beam of bands that are too bright, whose flux there is not known."""
    told = {leak.band for leak in leaks if leak.leak_jy > 0}
    inside = [
        name
        for name, pull in pulls.items()
        if pull >= LEAST_EXCESS_SIGMA and name in bands and name not in told
        and bands[name].beam_fwhm_arcsec > nearest_arcsec
    ]  # fmt: skip
    if not inside:
        return ()
    return (f"Another source lies {nearest_arcsec:.1f} arcsec away, inside the beam of {joined(inside)}.",)
