"""Practice stars: three candidates with their answers explained. They belong to no queue and count nowhere."""

from __future__ import annotations

import math
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import cache
from typing import Any

from tui.errors import StoreError
from tui.model import CHECKS, KINDS, Candidate, Evidence, Measurement, Settings

FILE = "practice.toml"


@dataclass(frozen=True, slots=True)
class Answer:
    """What a practised reviewer rules on one check of a practice star, and why."""

    ruling: str
    why: str


@dataclass(frozen=True, slots=True)
class PracticeStar:
    """One practice star."""

    candidate: Candidate
    title: str
    answers: Mapping[str, Answer]  # by check, all five
    told: str  # what it was, to be said at the end

    @property
    def name(self) -> str:
        """Its name: `practice-1` ..."""
        return self.candidate.name


@cache
def practice_stars() -> tuple[PracticeStar, ...]:
    """The packaged practice stars, in the order in which they are best walked.

    Raises:
        StoreError: the file is not there or damaged.
    """
    from tui.workflow.demo import sample_folder

    try:
        text = sample_folder().joinpath(FILE).read_text(encoding="utf-8")
        return tuple(_star(row) for row in tomllib.loads(text)["star"])
    except (OSError, KeyError, ValueError) as error:
        raise StoreError(f"The practice stars cannot be read ({error}); install Plainlight again.") from error


def practice_evidence(star: PracticeStar) -> dict[str, Evidence]:
    """Evidence on a practice star with default settings, all kinds; nothing is stored."""
    from tui.checks import assess_all
    from tui.workflow.basis import packaged_tables
    from tui.workflow.templates import templates_for

    settings = Settings()
    found = assess_all([star.candidate], templates_for(settings), settings, KINDS, packaged_tables())[0]
    return {kind: replace(made, digest=f"practice-{kind}") for kind, made in found.items()}


def _star(row: Mapping[str, Any]) -> PracticeStar:
    candidate = Candidate(row["name"], tuple(_measurement(one) for one in row["measurement"]), row["facts"])
    answers = {check: Answer(row["answers"][check]["ruling"], row["answers"][check]["why"]) for check in CHECKS}
    return PracticeStar(candidate, row["title"], answers, row["told"])


def _measurement(row: Mapping[str, Any]) -> Measurement:
    return Measurement(
        band=row["band"],
        flux_jy=float(row["flux_jy"]),
        error_jy=float(row.get("error_jy", math.nan)),
        limit=row.get("limit", False),
        nsigma=float(row.get("nsigma", 2.0)),
        source=row["source"],
        flags=row.get("flags", {}),
        value=float(row["flux_jy"]),
        value_error=float(row.get("error_jy", math.nan)),
    )
