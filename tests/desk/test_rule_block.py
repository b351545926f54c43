"""The ruling line: whatever else stands on it, the choices are whole at 80 columns, and what Enter will do is said."""

from __future__ import annotations

from itertools import product

import pytest

from tests.desk.made import FIXED_UTC
from tui.desk.widgets.rule_block import RuleFacts, rule_row
from tui.desk.widgets.rows import row_text, row_width
from tui.model import CHECK_TITLES, CHECKS, RULINGS, Ruling

RECORDED = ("Recorded: warm dust falls short", "Recorded: wdust <short")


def own(ruling: str) -> Ruling:
    return Ruling("SM-0001", "dust", "r-heron", ruling, utc=FIXED_UTC)


@pytest.mark.parametrize(
    ("ruling", "stale", "note", "others", "recorded", "done"),
    list(product((None, "explains", "short"), ("", "W3 moved"), ("", "a note"), (False, True), ((), RECORDED),
                 (False, True))),
)  # fmt: skip
def test_every_choice_is_whole_at_80_columns(ruling, stale, note, others, recorded, done):
    facts = RuleFacts(own=own(ruling) if ruling else None, stale=stale if ruling else "", note=note, recorded=recorded,
                      with_others=others, is_done=done)  # fmt: skip
    text = row_text(rule_row(80, facts))
    assert "e explains" in text and "f falls short" in text and "u unclear" in text and len(text) == 80
    assert ("r it stands" in text) == bool(ruling and (stale or note))
    if recorded and not (ruling and (stale or note)):
        assert "Recorded: " in text


@pytest.mark.parametrize("ruling", [one for one in RULINGS if one != "withdrawn"])
@pytest.mark.parametrize("width", [80, 120])
def test_a_choice_on_an_opened_star_says_before_enter_how_it_is_marked(ruling, width):
    text = row_text(rule_row(width, RuleFacts(chosen=ruling, with_others=True, note="because of W3 and W4")))
    assert "Enter records it" in text and "others in view" in text
    assert "others" not in row_text(rule_row(width, RuleFacts(chosen=ruling)))


def test_an_untestable_check_offers_unclear_alone():
    text = row_text(rule_row(80, RuleFacts(is_nodata=True)))
    assert "u unclear" in text and "e explains" not in text


def test_the_name_of_every_check_has_room_when_it_was_recorded():
    for check in CHECKS:
        line = rule_row(80, RuleFacts(recorded=(f"Recorded: {CHECK_TITLES[check]} falls short", "Recorded: <short")))
        assert "falls short" in row_text(line).partition("Recorded: ")[2] and "Recorded: " in row_text(line) and row_width(line) == 80
