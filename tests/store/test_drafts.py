"""Drafts and positions, kept at every keystroke."""

from __future__ import annotations

import pytest

from tests.store.making import utc, walk
from tui.errors import StoreError, UnknownNameError
from tui.store.candidate_view import standing_for
from tui.store.connect import open_queue
from tui.store.digests import queue_digest
from tui.store.drafts import draft, position, save_draft, save_position


def test_a_draft_outlives_its_connection(filled, team, path):
    heron, plover, _ = team
    for text in ("w", "wa", "wärm\n[/]"):
        save_draft(filled, heron.id, "SM-0001", "dust", text)
    other = open_queue(path)
    assert draft(other, heron.id, "SM-0001", "dust") == "wärm\n[/]"
    assert draft(other, plover.id, "SM-0001", "dust") == ""
    assert standing_for(other, heron.id, "SM-0001").drafts == {"dust": "wärm\n[/]"}
    assert standing_for(other, plover.id, "SM-0001").drafts == {}
    other.close()


def test_an_empty_draft_is_forgotten(filled, team):
    save_draft(filled, team[0].id, "SM-0001", "dust", "x")
    save_draft(filled, team[0].id, "SM-0001", "dust", "")
    assert filled.execute("SELECT COUNT(*) FROM draft").fetchone() == (0,)


def test_what_cannot_be_a_note_is_refused(filled, team):
    with pytest.raises(StoreError):
        save_draft(filled, team[0].id, "SM-0001", "dust", "x" * 20_001)
    with pytest.raises(StoreError):
        save_draft(filled, team[0].id, "SM-0001", "mixture", "x")
    with pytest.raises(UnknownNameError):
        save_draft(filled, team[0].id, "SM-0099", "dust", "x")


def test_positions(filled, team):
    heron, plover, _ = team
    assert position(filled, heron.id) is None
    save_position(filled, heron.id, "SM-0001", "dust")
    save_position(filled, heron.id, "SM-0002", "star")
    assert position(filled, heron.id) == ("SM-0002", "star")
    assert position(filled, plover.id) is None


def test_neither_enters_the_digest_of_the_queue(filled, team):
    before = queue_digest(filled)
    save_draft(filled, team[0].id, "SM-0001", "dust", "x")
    save_position(filled, team[0].id, "SM-0001", "dust")
    assert queue_digest(filled) == before
    walk(filled, team[0], "SM-0001", second=float(utc()[17:19]) + 50)
    assert queue_digest(filled) != before
