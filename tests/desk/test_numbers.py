"""Numbers with units and intervals, aligned on their decimal points."""

from __future__ import annotations

import math
import re
from dataclasses import replace

import pytest

from tui.desk.widgets.numbers import (
    Beside,
    chance_rows,
    formal_row,
    param_rows,
    squeezed,
    statistic_rows,
    value_and_error,
)
from tui.desk.widgets.rows import row_text, row_width
from tui.model import Fit, Param

NAN = math.nan


@pytest.mark.parametrize(
    ("param", "text"),
    [
        (Param(5612.3, 5570.0, 5655.0), "5612 +-43"),
        (Param(310.0, 262.0, 388.0), "310 +78 -48"),
        (Param(0.0212, 0.0209, 0.0215), "0.0212 +-0.0003"),
        (Param(1.41, 1.298, 1.55), "1.41 +0.14 -0.11"),
        (Param(0.0, 0.0, 0.12, limit=True), "<0.12 (95 %)"),
        (Param(4.9, 4.2, 4.9, limit=True), ">4.2 (95 %)"),
        (Param(0.65, 0.0, 0.65, limit=True), "any up to 0.65"),
        (Param(33300.0, 30723.4, 33300.0, limit=True), ">30700 (95 %)"),
        (Param(24044.0, 24044.0, 24044.0, limit=True), "24044 at its bound"),
        (Param(2e-5, 1e-5, 3e-5), "0.000020 +-0.000010"),
        (Param(5000.0, NAN, NAN), "5000"),
        (Param(NAN, NAN, NAN), "--"),
        (Param(1.0, -math.inf, 2.0), "1.0 +1.0 -?"),
    ],
)
def test_value_is_written_as_far_as_its_error_reaches(param, text):
    assert "".join(value_and_error(param)) == text


@pytest.mark.parametrize("width", [28, 40, 74])
def test_limit_at_the_upper_bound_of_a_fit_reads_as_a_lower_limit_in_plain_words(width):
    """A value at its upper bound is bounded from below alone, and not even so where the whole range fits as well."""
    params = {
        "av": Param(4.9, 4.2, 4.9, "mag", limit=True),
        "dust_temperature": Param(2000.0, 20.0, 2000.0, "K", limit=True),
        "teff": Param(5772.0, 5700.0, 5850.0, "K"),
    }
    said = [" ".join(row_text(line).split()) for line in param_rows(width, params)]
    assert re.search(r">4\.2( mag)? \(95 %\)", said[0])
    assert re.search(r"any (up )?to 2000", said[1])
    assert not any("> 0" in line or ">0" in line or ">20" in line for line in said)


@pytest.mark.parametrize("width", [28, 40, 74])
def test_decimal_points_stand_under_one_another(width):
    params = {
        "teff": Param(5612.3, 5570.0, 5655.0, "K"),
        "dust_fractional_luminosity": Param(1.2e-3, 0.9e-3, 1.6e-3),
        "flux_ratio": Param(0.021, 0.017, 0.026),
        "dust_radius": Param(12.3, 11.1, 14.0, "au"),
    }
    rows = [row_text(line) for line in param_rows(width, params)]
    assert all(len(line) <= width for line in rows)
    starts = {
        line.index(value) + len(value.split(".")[0])
        for line, value in zip(rows, ("5612", "0.12", "0.021", "12.3"), strict=True)
    }
    assert len(starts) == 1


def test_unknown_parameter_keeps_its_name_and_unit_made_safe():
    text = row_text(param_rows(40, {"odd_[/]\x1b": Param(2.0, 1.0, 3.0, "pc\x07")})[0])
    assert "odd [/]\ufffd" in text and "pc\ufffd" in text


def test_held_number_shows_that_it_is_held_and_chosen():
    rows = param_rows(
        40, {"teff": Param(5000.0, 4900.0, 5100.0, "K"), "av": Param(0.5, 0.4, 0.6, "mag")}, ("teff",), "teff"
    )
    assert "held" in row_text(rows[0]) and row_text(rows[0]).startswith(">")
    assert "held" not in row_text(rows[1])


@pytest.mark.parametrize(
    ("p", "words"),
    [(8e-24, "once in 1e23"), (0.002, "once in 500"), (0.9, "90 %"), (0.0, "practically never")],
)
def test_chance_is_told_in_words_at_any_width(p, words):
    for width in (28, 70):
        (line,) = chance_rows(width, Fit("m", 1.0, 1, p, 1.0, 1.0))
        assert words in row_text(line) and row_width(line) <= width


def test_statistics_stand_beside_the_star_alone_without_running_over():
    fit = Fit("m", 121.4, 6, 8e-24, 1.0, 130.6)
    huge = Fit("m", 1.23456e9, 10, 0.0, 1.0, -1.2e7)
    for width in (28, 60):
        rows = statistic_rows(width, fit, Beside("star alone", huge))
        text = "\n".join(row_text(line) for line in rows)
        assert all(row_width(line) <= width for line in rows)
        assert all(word in text for word in ("chi2", "121.4", "dof", "8e-24", "BIC", "130.6", "star alone", "<1e-300"))


@pytest.mark.parametrize("room", [7, 8, 10, 12, 20])
def test_sides_of_an_interval_that_differ_are_both_told_in_any_room(room):
    said = squeezed(" +2.900 -0.011", room).strip()
    assert said.startswith(("+2.9", "+3"))
    assert re.search(r"-0?\.01", said), said


def test_intervals_of_a_refused_fit_are_called_formal():
    fit = Fit("m", 121.4, 6, 8e-24, 1.0, 130.6, {"teff": Param(5612.3, 5570.0, 5655.0, "K")})
    assert "formal" in row_text(formal_row(fit, 0.01)) and row_width(formal_row(fit, 0.01)) <= 28
    assert formal_row(replace(fit, p=0.3), 0.01) == []
