"""The question, the advice and where the next step of a walk leads: words made from the data."""

from __future__ import annotations

import pytest

from tui.desk.screens.candidate_layout import shares
from tui.desk.screens.questions import caution_line, look_at, question
from tui.desk.screens.walk import first_check, next_to_rule, nudge_step, refusal, step_check
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
