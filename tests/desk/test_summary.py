"""One candidate in a few sentences."""

from __future__ import annotations

from dataclasses import replace

import pytest

from tui.desk.summary import begun_sentence, looking_sentence, standing_sentence

DONE = 2  # the number of a candidate that the reader of the fake queue is done with; its blend is split


@pytest.fixture
def stands(fake_session):
    """The row and the view of a candidate whose seal is open, with other values in them."""

    def make(row_values, view_values):
        name = fake_session.names[DONE]
        return replace(fake_session.row(DONE), **row_values), replace(fake_session.view(name), **view_values)

    return make


def test_an_explanation_on_which_reviewers_part_is_told_in_words(stands):
    row, view = stands({"outcome": "explained", "needs_me": False}, {"cause": "parted"})
    assert standing_sentence(row, view).endswith("The team's outcome: explained, though by different checks.")
    row, view = stands({"outcome": "explained", "needs_me": False}, {"cause": "dust"})
    assert standing_sentence(row, view).endswith("The team's outcome: explained by warm dust.")


def test_a_party_to_a_split_is_asked_once_more(stands):
    row, view = stands({"outcome": "pending", "done": True}, {"to_rule": ("blend",)})
    assert standing_sentence(row, view) == "Pending: blend split. It asks you once more."


def test_many_reasons_are_counted(stands):
    reason = "open:star;open:instrument;open:blend;split:dust"
    row, view = stands({"outcome": "pending", "needs_me": False}, {"pending_reason": reason})
    assert standing_sentence(row, view) == "Pending: 3 checks open, 1 split."


def test_who_is_no_longer_done_is_told_what_is_left(stands):
    row, view = stands({"outcome": "pending", "done": False}, {"to_rule": ("dust",)})
    assert standing_sentence(row, view) == "Pending: blend split. You have 1 check left: warm dust."


def test_others_on_it_and_notes_begun(stands):
    assert looking_sentence([]) == "" and looking_sentence(["heron", "plover"]) == "heron and plover are looking at it."
    _, view = stands({}, {"drafts": {"dust": "K is", "blend": "W1"}})
    assert begun_sentence(view) == "A note is begun on blend and warm dust." and begun_sentence(None) == ""
