"""The truth file of the controls."""

from __future__ import annotations

import pytest

from tui.errors import TableError
from tui.workflow.controls import read_truth


def test_names_and_natures_are_read_the_word_none_too(tmp_path):
    path = tmp_path / "truth.csv"
    path.write_text("name,nature\nSM-1,dust\n SM-2 ,none\nSM-1,dust\n")
    assert read_truth(str(path)) == {"SM-1": "dust", "SM-2": "none"}


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("name,kind\nA,dust\n", "nature"),
        ("name,nature\nA,dusty\n", "row 1"),
        ("name,nature\nA,dust\nA,star\n", "two natures"),
        ("name,nature\n,dust\n", "row 1"),
    ],
)
def test_a_wrong_truth_file_is_refused_with_the_place(tmp_path, text, words):
    path = tmp_path / "truth.csv"
    path.write_text(text)
    with pytest.raises(TableError, match=words):
        read_truth(str(path))
