"""Names, numbers, truth values and texts of single cells."""

from __future__ import annotations

import math
import unicodedata

import numpy as np
import pytest

from tui.readers.cells import MAG_SENTINELS, lost_digits, numbers, texts, truths
from tui.readers.names import clean_name, clean_names
from tui.readers.records import Column


def test_names_are_stripped_and_nfc():
    decomposed = "e\u0301toile 7"
    name, reason = clean_name(f"  {decomposed} ")
    assert (name, reason) == (unicodedata.normalize("NFC", decomposed), "")
    assert clean_name("HD 1")[0] != clean_name("hd 1")[0]


@pytest.mark.parametrize(
    "name", ["", "   ", "x" * 201, "a\x00b", "a\x1b[31mb", "a\nb", "a\x85b", "a\u2028b", "a\ufffdb"]
)
def test_names_that_are_refused(name):
    assert clean_name(name)[1]
    assert clean_names([name, "HD 1"])[1].keys() == {0}


def test_a_formula_is_a_name_like_any_other():
    assert clean_name('=HYPERLINK("http://x")') == ('=HYPERLINK("http://x")', "")


def test_numbers_of_text_cells():
    column = Column("J_mag", ["9.5", "", "nan", " 7 ", "null", "1_0", "9,5", "inf", "-99.99"])
    values, bad = numbers(column, MAG_SENTINELS)
    assert values[0] == 9.5 and values[3] == 7
    assert [index for index, value in enumerate(values) if math.isnan(value)] == [1, 2, 4, 5, 6, 7, 8]
    assert sorted(bad) == [5, 6, 7]


@pytest.mark.parametrize("sentinel", [-999, -9999, -99.99, 99, 99.99, -999.9])
def test_sentinels_of_magnitudes_are_missing_also_as_single_floats(sentinel):
    values, bad = numbers(Column("x", np.array([sentinel, 9.0], dtype=np.float32)), MAG_SENTINELS)
    assert math.isnan(values[0]) and values[1] == 9 and not bad


def test_masks_and_integers():
    column = Column("n", np.array([3, -9]), np.array([False, True]))
    values, bad = numbers(column)
    assert values[0] == 3 and math.isnan(values[1]) and not bad
    assert texts(column) == ["3", ""]
    assert texts(Column("f", np.array([2.0, 0.25, math.nan]))) == ["2", "0.25", ""]


def test_truth_values():
    values, bad = truths(Column("limit", ["True", "f", "1", "", "perhaps"]))
    assert values.tolist() == [True, False, True, False, False] and list(bad) == [4]
    masked = Column("limit", np.array([True, True]), np.array([False, True]))
    assert truths(masked)[0].tolist() == [True, False]


def test_long_integers_kept_as_decimals_are_noticed():
    assert lost_digits(Column("source_id", np.array([5.853498713190525e18])))
    assert lost_digits(Column("source_id", ["5.85E+18"]))
    assert not lost_digits(Column("source_id", ["5853498713190525696"]))


def test_a_zero_has_no_sign():
    """SQLite keeps no minus zero in a column of numbers: what was read must equal what is kept."""
    for column in (Column("pm", ["-0.0", "-0", "1"]), Column("pm", np.array([-0.0, -0.0, 1.0]))):
        values, bad = numbers(column)
        assert not bad and not np.signbit(values).any()
