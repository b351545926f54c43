"""Where a candidate stands in a list, and which ids a search adds."""

from __future__ import annotations

from array import array

import pytest

from tui.desk.queue_order import BEGINNING, line_of, without


@pytest.mark.parametrize("count", [3, BEGINNING, BEGINNING + 1, 5000])
def test_line_of_a_candidate(count):
    ids = array("q", range(10 * count, 0, -10))
    assert [line_of(ids, wanted, 7) for wanted in (10 * count, 10, 20)] == [0, count - 1, count - 2]
    assert line_of(ids, 15, 7) == 7 and line_of(ids, None, 7) == 7


def test_no_line_in_an_empty_list():
    assert line_of(array("q"), 1, 0) == 0


def test_without_keeps_the_order_of_what_is_left():
    assert without(array("q", [9, 3, 7, 1]), array("q", [7, 9])) == array("q", [3, 1])
    assert without(array("q"), array("q")) == array("q")
