"""Text on its way to a terminal."""

from __future__ import annotations

import re

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rich.cells import cell_len

from tui.desk import text
from tui.model import CHECKS, RULINGS, STATES

# Unicode 16.0, PropList.txt: Bidi_Control; and the C0 and C1 sets of ISO/IEC 6429.
BIDI = [0x061C, 0x200E, 0x200F, *range(0x202A, 0x202F), *range(0x2066, 0x206A)]
CONTROLS = [*range(0x20), *range(0x7F, 0xA0), *BIDI, 0x2028, 0x2029, 0xFEFF]


@pytest.mark.parametrize("code", CONTROLS, ids=hex)
def test_every_control_becomes_the_replacement_character(code):
    assert text.safe(f"a{chr(code)}b") == "a\ufffdb"


@given(st.text(alphabet=st.characters()))
def test_safe_text_can_be_written_and_holds_no_control(given_text):
    made = text.safe(given_text)
    made.encode("utf-8")
    assert not any(ord(character) in CONTROLS for character in made)


@given(st.text(max_size=60), st.integers(0, 40), st.sampled_from(["end", "middle"]), st.sampled_from(["left", "right"]))
def test_fit_takes_exactly_the_cells_asked_for(given_text, width, cut, align):
    assert cell_len(text.fit(text.safe(given_text), width, cut=cut, align=align)) == width


@given(st.text(max_size=200), st.integers(1, 30))
def test_wrapped_lines_are_no_wider_than_asked_and_lose_no_letter(given_text, width):
    lines = text.wrap(text.safe(given_text), width)
    assert all(cell_len(line) <= max(width, 2) for line in lines)
    assert re.sub(" ", "", "".join(lines)) == re.sub(" ", "", text.safe(given_text))


def test_every_state_ruling_and_check_has_a_sign_a_word_and_a_key_of_its_own():
    words = [text.state_text(state) for state in {*STATES, "todo", "unclear"}]
    assert len(set(words)) == len(words) and all(len(word) <= 7 for word in words)
    assert len({word[0] for word in words}) == len(words)
    assert set(text.RULING_WORDS) == set(RULINGS)
    assert tuple(text.CHECK_KEYS.values()) == CHECKS


def test_a_note_keeps_its_line_ends_and_nothing_else():
    assert text.safe_lines("a\r\nb\x1b[2J\rc\nd") == ["a", "b\ufffd[2J", "c", "d"]


@pytest.mark.parametrize(
    ("p", "said"),
    [(1.0, "100 %"), (0.6, "60 %"), (0.37, "37 %"), (0.01, "once in 100"), (1e-7, "once in 10,000,000"),
     (3.1e-9, "once in 320,000,000"), (1e-12, "once in 1e12"), (3e-83, "once in 3e82"), (9.9e-300, "once in 1e299"),
     (1e-310, "practically never"), (5e-324, "practically never"), (0, "practically never")],
)  # fmt: skip
def test_chance_in_words(p, said):
    assert text.once_in(p) == said


@pytest.mark.parametrize(
    ("value", "digits", "said"),
    [(5612.4, 4, "5612"), (0.0, 3, "0"), (-0.00123, 3, "-0.00123"), (1e-9, 2, "1.0e-9"), (999.96, 4, "1000"),
     (None, 3, "--"), (float("inf"), 3, "inf")],
)  # fmt: skip
def test_numbers_are_plain_where_they_can_be_read(value, digits, said):
    assert text.number(value, digits) == said


def test_signs_are_always_shown_and_stay_short():
    assert [text.signed(value) for value in (8.23, -0.04, 12345.6, float("nan"))] == ["+8.2", "-0.0", "+12346", "--"]
