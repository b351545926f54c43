"""The lines on top of a candidate: what gives way where there is no room, and what never does."""

from __future__ import annotations

import dataclasses

import pytest

from tests.desk.fake_session import FakeSession
from tui.desk.widgets.check_line import standings_of, title_row
from tui.desk.widgets.rows import row_text, row_width

MANY = "open:star;open:instrument;open:extinction;open:blend;open:dust"
RIGHT = ("saltmarsh.db  you: heron  saved 14:02 UTC", "you: heron  saved 14:02 UTC", "you: heron")


def view(name="SM-0001", **changes):
    return dataclasses.replace(FakeSession(["SM-0001", "SM-0002", "SM-0003", "SM-0004"]).view(name), **changes)


@pytest.mark.parametrize("width", [80, 100, 120])
def test_name_and_handle_stay_whole_whatever_a_star_is_pending_for(width):
    pending = view(seal_open=True, outcome="pending", pending_reason=MANY)
    for odd in ("odd by MIPS24 +20.8", "odd by PS1_y +1234.5 and a dip"):
        line = title_row(width, "SM-0042", odd, pending, RIGHT)
        text = row_text(line)
        assert row_width(line) == width and "SM-0042" in text and "you: heron" in text and odd in text
        assert "pending" in text


def test_why_it_is_pending_is_counted_where_there_is_no_room_to_name_it():
    pending = view(seal_open=True, outcome="pending", pending_reason=MANY)
    text = row_text(title_row(80, "SM-0042", "odd by MIPS24 +20.8", pending, RIGHT))
    assert "pending: 5 checks open" in text
    assert "warm dust open" in row_text(title_row(160, "SM-0042", "odd by MIPS24 +20.8", pending, RIGHT))


def test_a_name_as_long_as_the_line_leaves_the_handle_in_place():
    line = title_row(80, "x" * 200, "odd by W3 +8.2", view(), RIGHT)
    assert row_width(line) == 80 and "you: heron" in row_text(line) and "xx..xx" in row_text(line)


def test_only_checks_that_must_be_ruled_are_counted():
    session = FakeSession(["SM-0001", "SM-0002", "SM-0003", "SM-0004"])
    assert standings_of(session.view("SM-0004"))[0] == ".sealed, 0 of 4 ruled"
    session.rule("SM-0004", "extinction", "unclear")  # which no data test there
    assert standings_of(session.view("SM-0004"))[0] == ".sealed, 0 of 4 ruled"
    session.rule("SM-0004", "star", "short")
    assert standings_of(session.view("SM-0004"))[0] == ".sealed, 1 of 4 ruled"
