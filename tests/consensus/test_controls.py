"""Hits, false explanations, and the program's lean."""

from __future__ import annotations

from tui.consensus.controls import control_rates, lean_followed
from tui.model import CHECKS, Ruling


def row(candidate: str, check: str, ruling: str, who: str = "heron", digest: str = "") -> Ruling:
    return Ruling(candidate, check, who, ruling, evidence_digest=digest)


def test_hits_and_false_explanations():
    truth = {"C1": "dust", "C2": "dust", "C3": "none"}
    first = [
        row("C1", "dust", "explains"), row("C1", "blend", "short"), row("C1", "star", "explains"),
        row("C2", "dust", "unclear"),
        *(row("C3", check, "short") for check in CHECKS),
        row("SM-0001", "dust", "explains"),
    ]  # fmt: skip
    rates = control_rates(first, truth)["heron"]
    assert (rates.hit.events, rates.hit.trials) == (1, 2)
    assert (rates.false.events, rates.false.trials) == (1, 7)
    assert rates.hit.low < 0.5 < rates.hit.high


def test_nobody_on_controls():
    assert control_rates([row("SM-0001", "dust", "explains")], {"C1": "dust"}) == {}


def test_no_ruling_on_a_nature_leaves_the_hit_rate_undefined():
    assert control_rates([row("C1", "star", "short")], {"C1": "none"})["heron"].hit.value is None


def test_lean_followed_counts_sure_rulings_on_testable_evidence():
    adequate = {"yes": True, "no": False, "untestable": None}
    rulings = [
        row("A", "dust", "explains", digest="yes"), row("B", "dust", "short", digest="yes"),
        row("C", "dust", "short", digest="no"), row("D", "dust", "unclear", digest="no"),
        row("E", "dust", "explains", digest="untestable"), row("F", "dust", "explains", digest="gone"),
    ]  # fmt: skip
    rate = lean_followed(rulings, adequate)
    assert (rate.events, rate.trials) == (2, 3)
