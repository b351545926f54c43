"""The question, the advice and where the next step of a walk leads: words made from the data."""

from __future__ import annotations

from dataclasses import replace

import pytest

from tui.desk.screens.candidate_layout import shares
from tui.desk.screens.questions import caution_line, look_at, oddness_words, question
from tui.desk.screens.walk import first_check, next_to_rule, nudge_step, refusal, step_check
from tui.desk.widgets.numbers import adequate_word
from tui.model import CHECKS, Evidence, Fit, Param
from tui.workflow.records import CandidateView


def evidence_of(check: str = "star", cautions: tuple[str, ...] = (), **pulls: float) -> dict[str, Evidence]:
    fits = (Fit("star", 1.0, 3, 0.5, 1.0, 1.0, pulls=pulls),) if pulls else ()
    return {kind: Evidence(kind, 1, None, fits, cautions) for kind in {"star", check}}


@pytest.mark.parametrize(
    ("check", "pulls", "asked"),
    [
        ("dust", {"J": 0.2, "W3": 8.2, "W4": 6.9}, "Can warm dust near the star make W3 and W4 this bright?"),
        ("blend", {"SDSS_u": -5.0, "J": 1.0}, "Can a second source in the beam make u this faint?"),
        (
            "extinction",
            {"Gaia_BP": -4.0, "W4": 4.5},
            "Can extinction on the way to us leave W4 and BP this bright or faint?",
        ),
        ("instrument", {"W3": 9.0}, "Could W3 be badly measured rather than truly bright?"),
        ("star", {"W3": 9.0, "W4": 4.0}, "Is it a plain star after all? W3 and W4 are brighter."),
        ("star", {"J": 0.3, "H": -1.2}, "Is it a plain star? The best one meets every band within 1.2 sigma."),
        ("dust", {"J": 0.3}, "No band leaves the star alone by 3 sigma. Is there warm dust at all?"),
        ("blend", {}, "Nothing could be fitted to the star alone. Does a second source explain it?"),
    ],
)
def test_question_names_where_the_data_leave_the_star_alone(check, pulls, asked):
    assert question(check, evidence_of(check, **pulls)) == asked


@pytest.mark.parametrize("check", CHECKS)
@pytest.mark.parametrize("count", [0, 1, 2, 3, 4, 5, 20])
def test_question_fits_one_line_of_eighty_columns(check, count):
    pulls = {f"AKARI_LONG{n:02d}": 5.0 + n for n in range(count)} or {"J": 0.0}
    assert len(question(check, evidence_of(check, **pulls), room=78)) <= 78


@pytest.mark.parametrize("check", CHECKS)
def test_shortest_advice_fits_one_row(check):
    for pulls in ({"MIPS160": -12345.6, "PACS100": 9.0}, {"J": 0.0}, {}):
        assert len(look_at(check, evidence_of(check, **pulls)[check].best)[-1]) <= 69


def test_advice_names_what_the_fit_leaves_over():
    assert look_at("blend", evidence_of("blend", W3=8.2, J=0.1)["blend"].best)[0].startswith("W3 +8.2 sigma left over.")
    assert "nothing could be fitted" in look_at("blend", None)[0]


def test_first_caution_and_the_count_of_others():
    assert caution_line("dust", evidence_of("dust", ("hot", "young", "far"), J=0.0)) == "hot (+2 more: v)"
    assert caution_line("dust", {}) == ""


def test_the_weightiest_caution_stands_first():
    said = ("As bright as one dwarf: +0.01 +- 0.28 mag.", "Beam 12 arcsec.", "A dip stands: explain it too.")
    assert caution_line("blend", evidence_of("blend", said, J=0.0)).startswith("A dip stands")
    assert caution_line("blend", evidence_of("blend", said[:2], J=0.0)).startswith("Beam")


def with_facts(check: str, **facts: bool) -> dict[str, Evidence]:
    plain = evidence_of(check, J=0.3, H=1.3)
    return {kind: replace(one, facts=facts, adequate=False) for kind, one in plain.items()}


def test_a_star_that_dips_is_not_asked_for_as_a_plain_one():
    found = with_facts("star", dip_stands=True)
    assert question("star", found) == "Its bands agree with a plain star, but it dips (page 5)."
    assert oddness_words(found["star"]) == "odd by a dip"
    assert adequate_word(found["star"], 0, 0.01) == "no: a dip stands"
    assert question("dust", with_facts("dust", dip_stands=True)).endswith("it dips (page 5). Can dust do that?")


def test_a_star_whose_own_spectrum_misfits_says_so_everywhere():
    found = with_facts("star", spectrum_misfits=True)
    assert question("star", found) == "Its bands agree with a plain star, but its own spectrum does not."
    assert oddness_words(found["star"]) == "odd by its spectrum"
    assert adequate_word(found["star"], 0, 0.01) == "no: its spectrum misfits"


@pytest.mark.parametrize("facts", [{"dip_stands": True}, {"dip_stands": True, "spectrum_misfits": True}])
@pytest.mark.parametrize("check", CHECKS)
def test_those_questions_are_no_longer_than_two_rows(check, facts):
    assert len(question(check, with_facts(check, **facts))) <= 2 * 78


def test_a_plain_star_is_odd_by_nothing():
    assert oddness_words(evidence_of("star", Ks=0.9)["star"]) == "farthest Ks +0.9 sigma"
    assert oddness_words(evidence_of("star", Ks=0.9, W3=8.2)["star"]) == "odd by W3 +8.2"


def test_adequate_by_another_fit_than_the_one_on_view_names_it():
    fits = tuple(Fit(name, 1.0, 3, p, 1.0, 1.0) for name, p in (("bound pair", 0.4), ("free pair", 1e-5)))
    found = Evidence("blend", 1, True, fits)
    assert adequate_word(found, 0, 0.01) == "yes" and adequate_word(found, 1, 0.01) == "yes (by fit 1)"


def view_of(to_rule: tuple[str, ...], states: dict[str, str] | None = None) -> CandidateView:
    return CandidateView("SM-1", states or {}, {}, "sealed", "", False, False, True, {}, [], {}, to_rule=to_rule)


def test_walk_opens_where_it_was_left_else_at_the_first_to_rule():
    assert first_check(view_of(("blend", "dust"))) == "blend"
    assert first_check(view_of(("blend", "dust")), "dust") == "dust"
    assert first_check(view_of(())) == "star"
    assert first_check(view_of(("dust",)), "nonsense") == "dust"


def test_walk_goes_on_in_order_and_round_once():
    assert next_to_rule(view_of(("star", "blend")), "instrument") == "blend"
    assert next_to_rule(view_of(("star",)), "dust") == "star"
    assert next_to_rule(view_of(("dust",)), "dust") is None
    assert [step_check(check, 1) for check in CHECKS] == [*CHECKS[1:], CHECKS[0]]


def test_refusals_are_sentences():
    assert refusal(view_of((), {"dust": "nodata"}), "dust", "explains").endswith("nothing need be.")
    assert refusal(view_of((), {"dust": "nodata"}), "dust", "unclear") == ""
    assert refusal(view_of(()), "dust", "withdrawn") == "There is no ruling of yours to withdraw on this check."


def test_nudges_are_half_a_sigma_and_never_nothing():
    assert nudge_step(Param(300.0, 280.0, 320.0), 300.0) == pytest.approx(10.0)
    assert nudge_step(Param(300.0, float("nan"), float("nan")), 300.0) == pytest.approx(6.0)
    assert nudge_step(Param(0.0, 0.0, 0.2, limit=True), 0.0) > 0
    assert nudge_step(None, 5.0) > 0


@pytest.mark.parametrize(("width", "height"), [(80, 24), (100, 30), (120, 40), (200, 60), (300, 90)])
def test_plot_keeps_the_most_of_any_terminal(width, height):
    share = shares(width, height)
    assert width - share.side >= 51
    assert height - share.head - share.foot >= 16
    assert shares(width, height, plot_only=True).side == 0
