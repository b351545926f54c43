"""Joining, handles, and their changes."""

from __future__ import annotations

import pytest

from tests.store.making import utc
from tui.errors import HandleError, UnknownNameError
from tui.store.reviewers import add_reviewer, rename_reviewer, reviewer_by_handle, reviewers


def test_joining(queue):
    heron = add_reviewer(queue, "heron", utc(5))
    assert reviewer_by_handle(queue, "heron") == heron
    assert reviewer_by_handle(queue, "plover") is None
    assert heron.joined_utc == utc(5)


def test_ids_are_random(queue, tmp_path):
    assert add_reviewer(queue, "heron", utc()).id != add_reviewer(queue, "plover", utc()).id


@pytest.mark.parametrize("handle", ["", "Heron", "a b", "é", "x" * 33, "heron\n", "[/]"])
def test_a_malformed_handle_is_refused(queue, handle):
    with pytest.raises(HandleError):
        add_reviewer(queue, handle, utc())
    assert reviewers(queue) == []


def test_a_taken_handle_is_refused(filled):
    with pytest.raises(HandleError, match="--as heron"):
        add_reviewer(filled, "heron", utc())


def test_a_change_of_handle_is_a_further_row(filled, team):
    heron, _, curlew = team
    assert rename_reviewer(filled, curlew.id, "ruff", utc(10)).handle == "ruff"
    assert rename_reviewer(filled, curlew.id, "knot", utc(5)).handle == "knot"  # the later call holds, not the clock
    assert reviewer_by_handle(filled, "curlew") is None
    assert reviewer_by_handle(filled, "knot").id == curlew.id
    with pytest.raises(HandleError):
        rename_reviewer(filled, curlew.id, "heron", utc(20))
    with pytest.raises(UnknownNameError):
        rename_reviewer(filled, "nobody", "stint", utc(20))
    assert rename_reviewer(filled, heron.id, "curlew", utc(30)).handle == "curlew"  # free again
    assert [one.handle for one in reviewers(filled)] == ["curlew", "knot", "plover"]
