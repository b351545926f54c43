"""Agreement of a made-up team, against counting by hand and against rates that were put in."""

from __future__ import annotations

import numpy as np
import pytest

from tui.consensus.agreed import RESPONSES, known_class, team_agreement
from tui.consensus.dawid_skene import DEPENDENCE_CAUTION
from tui.model import CHECKS, Ruling

TEAM = ("a", "b", "c")


def row(candidate: str, check: str, who: str, ruling: str) -> Ruling:
    return Ruling(candidate, check, who, ruling, evidence_digest="lean-" + check)


def made_up(candidates: int, seed: int = 1, hit: float = 0.9) -> tuple[list[Ruling], dict[tuple[str, str], str]]:
    """Rulings of three who answer right with probability `hit`, else `unclear` or wrong alike; and what is right."""
    dice = np.random.default_rng(seed)
    right, rulings = {}, []
    for number in range(candidates):
        for check in ("dust", "blend"):
            truth = "explains" if dice.random() < 0.4 else "short"
            right[f"S{number}", check] = truth
            for who in TEAM:
                others = [word for word in RESPONSES if word != truth]
                word = truth if dice.random() < hit else others[dice.integers(2)]
                rulings.append(row(f"S{number}", check, who, word))
    return rulings, right


def test_counted_by_hand():
    rulings = [
        row("S1", "dust", "a", "explains"), row("S1", "dust", "b", "explains"), row("S1", "dust", "c", "short"),
        row("S2", "dust", "a", "short"), row("S2", "dust", "b", "short"),
        row("S3", "blend", "a", "short"),
    ]  # fmt: skip
    found = team_agreement(rulings, {"lean-dust": True, "lean-blend": None}, TEAM, np.random.default_rng(1))
    assert (found.overall.rulings, found.overall.rated, found.overall.pairs) == (6, 2, 4)
    assert found.overall.raw == 0.5 and found.checks["blend"].raw is None and found.checks["star"].alpha is None
    # o = 2 pairs unlike x 2 / (3 - 1) = 2; n = 5, 2 x explains, 3 x short: alpha = 1 - 4 x 2 / (25 - 13)
    assert found.overall.alpha == pytest.approx(1 - 8 / 12)
    assert found.overall.fleiss is None  # three and two rulings
    assert [(pair.one, pair.two, pair.rated, pair.raw) for pair in found.pairs] == [
        ("a", "b", 2, 1.0), ("a", "c", 1, 0.0), ("b", "c", 1, 0.0),
    ]  # fmt: skip
    assert (found.lean.events, found.lean.trials) == (2, 5) and found.lean_by_check["blend"].value is None
    assert found.weakest == "dust" and "three reviewers" in found.error_rates_note


def test_nothing_ruled():
    found = team_agreement([], {}, TEAM, np.random.default_rng(1))
    assert found.overall.raw is None and found.pairs == () and found.lean.value is None and found.weakest == ""
    assert set(found.checks) == set(CHECKS)


def test_error_rates_hold_what_was_put_in():
    rulings, _ = made_up(400)
    found = team_agreement(rulings, {}, TEAM, np.random.default_rng(1))
    assert found.error_rates_note == DEPENDENCE_CAUTION and [one.reviewer_id for one in found.error_rates] == list(TEAM)
    inside = [one.rates[truth][truth][1] <= 0.9 <= one.rates[truth][truth][2] for one in found.error_rates
              for truth in ("explains", "short")]  # fmt: skip
    assert sum(inside) >= 5
    low, high = found.overall.interval
    assert low < found.overall.alpha < high and found.overall.fleiss == pytest.approx(found.overall.alpha, abs=0.01)


def test_checks_of_one_star_are_drawn_together():
    """The same rulings on five checks of each star tell no more than on one: the interval must not shrink."""
    one = [row(f"S{n}", "dust", who, "short" if n % 3 else word) for n in range(60)
           for who, word in zip(TEAM[:2], ("explains", "explains" if n % 2 else "short"), strict=True)]  # fmt: skip
    five = [Ruling(each.candidate, check, each.reviewer_id, each.ruling) for each in one for check in CHECKS]
    narrow, wide = (team_agreement(rows, {}, TEAM, np.random.default_rng(2)).overall.interval for rows in (five, one))
    assert narrow[1] - narrow[0] == pytest.approx(wide[1] - wide[0], rel=0.15)


def test_what_a_control_tells():
    assert known_class("dust", "dust") == 0 and known_class("none", "dust") == 1
    assert known_class("dust", "blend") == known_class("", "blend") == -1
