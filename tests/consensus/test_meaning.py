"""What survivors mean, in numbers and words."""

from __future__ import annotations

import pytest

from tui.consensus.meaning import CAUTION, meaning


def test_an_empty_list_gives_the_limit_of_no_event():
    found = meaning(300, survivors=0, pending=0, waiting=0)
    assert found.limit == pytest.approx(1 - 0.05 ** (1 / 300), rel=1e-9)
    assert "0.00994" in found.sentences[0] and "one-sided" in found.sentences[0] and found.sentences[-1] == CAUTION


def test_a_null_is_spoken_of_only_where_there_is_one():
    said = {count: " ".join(meaning(300, count, 1, 0).sentences) for count in (0, 2)}
    assert "null" in said[0] and "null" not in said[2]


def test_pending_candidates_count_as_possible_survivors():
    assert meaning(300, 1, 4, 4).limit == meaning(300, 5, 0, 0).limit > meaning(300, 0, 0, 0).limit
    assert any("4 candidates still need reviewers" in said for said in meaning(300, 1, 4, 4).sentences)


@pytest.mark.parametrize("n_searched", [None, 3])
def test_no_limit_without_a_usable_number_searched(n_searched):
    found = meaning(n_searched, 2, 2, 0)
    assert found.limit is None and "n_searched" in found.sentences[0]


def test_nothing_excluded():
    assert "set no limit" in meaning(5, 5, 0, 0).sentences[0]
