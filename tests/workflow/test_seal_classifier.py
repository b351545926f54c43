"""The seal against a classifier: from all that a reviewer who is not done can reach, nobody learns what others ruled.

240 controls with one and the same evidence, their natures drawn by lot; three others walk a random part of
them and err as often whatever the nature, so that the one thing let out by design, that a candidate needs
nobody, tells nothing of it either. What is left to learn from is what the seal should cover. One draw may
stray by luck, as one interval in twenty should: over 18 draws the areas averaged 0.490 (nature; standard error
0.012) and 0.506 (others' rulings; 0.015).
"""

from __future__ import annotations

from contextlib import closing
from dataclasses import dataclass

import numpy as np
import pytest

from tests.workflow.classifier import tried
from tests.workflow.reachable import reachable
from tui.model import CHECKS, Candidate, Evidence, Fit, Measurement, Reviewer, Ruling
from tui.store import reviewers as joining
from tui.store.candidates import save_candidates
from tui.store.connect import open_queue
from tui.store.evidence import save_evidence
from tui.store.records import LoadRecord
from tui.store.rulings import append_ruling
from tui.store.team import team_standing
from tui.workflow.session import Session

NATURAL = CHECKS[1:]
CONTROLS = 240
OTHERS = ("plover", "curlew", "egret")
WALKS, GLANCES, ERRS = 0.6, 0.2, 0.15
UTC = "2026-03-01T00:00:00.000000Z"


@dataclass(frozen=True)
class Known:
    """A queue of controls and what its keeper knows; arrays by control."""

    path: str
    names: list[str]
    natures: list[str]  # a check, or none
    first_explains: np.ndarray  # how the first walk by another ended: 1 explains, 0 all short, -1 nobody walked it


def ruled_as(nature: str, rng: np.random.Generator) -> str:
    """What a reviewer ends with: mostly the nature; in error an explanation for none, none for an explanation."""
    if rng.random() >= ERRS:
        return nature
    return "none" if nature != "none" else str(rng.choice(NATURAL))


def walk(connection, by: Reviewer, name: str, ends: str) -> None:
    """Rule in order up to the check that explains, or all short."""
    for check in CHECKS:
        word = "explains" if check == ends else "short"
        append_ruling(connection, Ruling(name, check, by.id, word, f"the note of {ends}", utc=UTC))
        if word == "explains":
            return


def others_rule(connection, team: list[Reviewer], name: str, nature: str, rng: np.random.Generator) -> int:
    """Each other reviewer walks the control, glances at it or leaves it; how the first walk ended."""
    first = -1
    for other in rng.permutation(len(team)):
        chance = rng.random()
        if chance < WALKS:
            ends = ruled_as(nature, rng)
            walk(connection, team[other], name, ends)
            first = int(ends != "none") if first < 0 else first
        elif chance < WALKS + GLANCES:
            append_ruling(connection, Ruling(name, "star", team[other].id, "short", utc=UTC))
    return first


def own_begin(connection, heron: Reviewer, name: str, rng: np.random.Generator) -> None:
    """The reader has begun on half of them, without ending a walk."""
    if rng.random() < 0.5:
        append_ruling(connection, Ruling(name, "star", heron.id, "short", utc=UTC))
        for check in rng.permutation(NATURAL)[: rng.integers(0, 4)]:
            append_ruling(connection, Ruling(name, str(check), heron.id, "unclear", utc=UTC))


def same_evidence() -> list[Evidence]:
    """One and the same for every control."""
    fit = Fit("star", 70.0, 2, 1e-16, 74.0, 75.0, {}, {"J": 0.5, "W3": 8.0})
    return [Evidence(check, 1, False, (fit,), (), {}, f"{check}-1", ("J", "W3")) for check in CHECKS]


@pytest.fixture(scope="module")
def known(tmp_path_factory) -> Known:
    """The queue, with three others' rulings and the reader's beginnings."""
    return drawn(str(tmp_path_factory.mktemp("controls") / "q.db"), np.random.default_rng(20260301))


def drawn(path: str, rng: np.random.Generator) -> Known:
    """Make such a queue at `path`."""
    names = [f"SM-{number:04d}" for number in rng.permutation(10_000)[:CONTROLS]]
    natures = [str(rng.choice(NATURAL)) if rng.random() < 0.5 else "none" for _ in names]
    with pytest.MonkeyPatch.context() as patch, closing(open_queue(path, create=True)) as connection:
        patch.setattr(joining.secrets, "token_hex", lambda size: rng.bytes(size).hex())
        measured = (Measurement("J", 1.0, 0.02, source="t"), Measurement("W3", 1.0, 0.02, source="t"))
        save_candidates(connection, [LoadRecord(Candidate(name, measured), "t") for name in names], UTC)
        save_evidence(connection, [(name, one) for name in names for one in same_evidence()])
        heron, *team = [joining.add_reviewer(connection, handle, UTC) for handle in ("heron", *OTHERS)]
        first = []
        for name, nature in zip(names, natures, strict=True):
            first.append(others_rule(connection, team, name, nature, rng))
            own_begin(connection, heron, name, rng)
    return Known(path, names, natures, np.array(first))


@pytest.fixture(scope="module")
def reached(known) -> np.ndarray:
    """All that heron, who is done with none of them, can reach."""
    with Session.open(known.path, "heron") as own, Session.open(known.path) as nobody:
        assert not any(row.seal_open for row in own.rows(own.order()))
        return reachable(own, nobody, known.names)


def test_what_is_reachable_does_not_tell_the_nature(known, reached):
    labels = np.array([int(nature != "none") for nature in known.natures])
    _, low, high = tried(reached, labels)
    assert low < 0.5 < high and high - low < 0.25


@pytest.mark.parametrize("check", NATURAL)
def test_nor_which_check_it_is(known, reached, check):
    _, low, high = tried(reached, np.array([int(nature == check) for nature in known.natures]), len(NATURAL))
    assert low < 0.5 < high


def test_nor_what_others_ruled(known, reached):
    walked = known.first_explains >= 0
    assert walked.sum() >= 200
    _, low, high = tried(reached[walked], known.first_explains[walked])
    assert low < 0.5 < high


def test_the_same_classifier_finds_what_the_team_sees(known, reached):
    with closing(open_queue(known.path, write=False)) as connection:
        team = {row.name: [count.explains for count in row.counts.values()] for row in team_standing(connection)}
    table = np.column_stack([reached, [team[name] for name in known.names]])
    labels = np.array([int(nature != "none") for nature in known.natures])
    assert tried(table, labels)[1] > 0.5  # the whole interval lies above chance, as it must where there is something to find


def test_and_a_leak_of_a_third_of_the_outcomes(known, reached):
    labels = np.array([int(nature != "none") for nature in known.natures])
    let_out = np.where(np.random.default_rng(2).random(len(labels)) < 1 / 3, labels, 0.5)
    assert tried(np.column_stack([reached, let_out]), labels)[1] > 0.5
