"""Dots in cells."""

from __future__ import annotations

import numpy as np
import pytest

from tui.desk.widgets.plot_canvas import Canvas, dash_sample
from tui.desk.widgets.rows import row_text


def test_each_braille_dot_has_its_unicode_bit():
    # Unicode 15, block Braille Patterns: dots 1 2 3 7 down the left, 4 5 6 8 down the right; U+2800 + the sum of bits.
    bits = [[0x01, 0x08], [0x02, 0x10], [0x04, 0x20], [0x40, 0x80]]
    for line in range(4):
        for column in range(2):
            canvas = Canvas(1, 1)
            canvas.horizontal(line, column, column, "total")
            assert row_text(canvas.rows()[0]) == chr(0x2800 + bits[line][column])


def test_stroke_joins_neighbours_without_a_gap():
    canvas = Canvas(4, 4)
    canvas.stroke(np.array([0.0, 2, 9, 15, 15, 3, 2, 1]), "total", 0, 4)
    drawn = np.argwhere(canvas.dots > 0)
    for column in range(7):
        here, there = (set(drawn[drawn[:, 1] == c][:, 0]) for c in (column, column + 1))
        assert min(abs(a - b) for a in here for b in there) <= 1


def test_stroke_stays_inside_its_rows_and_breaks_at_nan():
    canvas = Canvas(4, 4)
    canvas.stroke(np.array([-50.0, -50, np.nan, np.nan, 5, 5, 90, 90]), "total", 1, 3)
    assert not canvas.dots[:4].any() and not canvas.dots[12:].any()
    assert not canvas.dots[:, 2:4].any()


def test_heavier_style_gives_the_cell_its_style():
    canvas = Canvas(1, 1)
    canvas.horizontal(0, 0, 1, "component-a")
    canvas.horizontal(3, 0, 1, "total")
    assert canvas.rows()[0][0].style == "total"


def test_text_lies_over_dots_and_never_outside():
    canvas = Canvas(5, 1)
    canvas.horizontal(1, 0, 9, "total")
    canvas.put(0, -1, "abc", "label")
    canvas.put(0, 4, "xyz", "label")
    text = row_text(canvas.rows()[0])
    assert text[:2] == "bc" and text[4] == "x" and len(text) == 5


@pytest.mark.parametrize("character", ["日", "\u0301", "\x1b", "👩"])
def test_characters_that_do_not_take_one_column_become_question_marks(character):
    canvas = Canvas(3, 1)
    canvas.put(0, 1, character, "label")
    assert row_text(canvas.rows()[0]) == " ? "


def test_plain_marks_are_ascii():
    canvas = Canvas(6, 3, unicode=False)
    canvas.stroke(np.linspace(0, 11, 12), "component-b", 0, 3)
    text = "".join(row_text(line) for line in canvas.rows())
    assert text.isascii() and "b" in text


def test_dash_samples_differ():
    assert len({dash_sample(dash) for dash in ((1, 0), (2, 2), (5, 2), (1, 2), (3, 3))}) == 5
