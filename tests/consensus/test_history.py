"""Which ruling is the newest, and which was the first given under seal."""

from __future__ import annotations

import itertools

from tui.consensus.history import current_rulings, first_sealed
from tui.model import Ruling


def row(id: str, ruling: str = "short", second: float = 0, replaces: str = "", seen: bool = False, who: str = "heron"):
    utc = f"2031-01-01T00:00:{second:09.6f}Z"
    return Ruling("SM-0001", "dust", who, ruling, seen_others=seen, replaces=replaces, utc=utc, id=id)


def newest(*rows: Ruling) -> str | None:
    """Id of the current ruling, the same for every order in which the rows may arrive."""
    found = {
        (current_rulings(order).get(("dust", "heron")) or row("none")).id for order in itertools.permutations(rows)
    }
    assert len(found) == 1
    return found.pop()


def test_replaced_is_never_newest_even_when_its_clock_was_ahead():
    assert newest(row("a", second=9), row("b", second=1, replaces="a")) == "b"


def test_of_a_fork_the_latest_then_the_greater_id():
    base = row("a")
    assert newest(base, row("b", second=2, replaces="a"), row("c", second=3, replaces="a")) == "c"
    assert newest(base, row("b", second=2, replaces="a"), row("c", second=2, replaces="a")) == "c"


def test_a_chain_with_clocks_running_backwards():
    assert newest(row("a", second=5), row("b", second=9, replaces="a"), row("c", second=1, replaces="b")) == "c"


def test_withdrawn_leaves_none_and_a_later_one_stands():
    taken = (row("a"), row("b", "withdrawn", second=1, replaces="a"))
    assert newest(*taken) == "none"
    assert newest(*taken, row("c", "unclear", second=2, replaces="b")) == "c"


def test_only_ones_own_ruling_can_be_replaced():
    assert newest(row("a"), row("b", second=1, replaces="a", who="plover")) == "a"


def test_first_sealed_is_the_first_given_not_the_last():
    assert first_sealed([row("a", "explains"), row("b", second=1, replaces="a")])[("dust", "heron")].id == "a"


def test_first_made_with_the_seal_open_is_left_out():
    assert first_sealed([row("a", seen=True), row("b", second=1, replaces="a")]) == {}


def test_taken_back_under_seal_was_never_given():
    mistyped = [row("a", "explains"), row("b", "withdrawn", second=1, replaces="a"), row("c", second=2, replaces="b")]
    assert first_sealed(mistyped)[("dust", "heron")].id == "c"
    regretted = [row("a", "explains"), row("b", "withdrawn", second=1, replaces="a", seen=True)]
    assert first_sealed(regretted)[("dust", "heron")].id == "a"
