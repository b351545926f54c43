"""The queue's views: filters, searches and orders, driven by keys."""

from __future__ import annotations

import threading
from array import array

import pytest

from tui.desk.widgets.candidate_list import CandidateList
from tui.errors import StoreError
from tui.model import CHECKS


@pytest.mark.parametrize(("key", "check"), list(zip("sixbd", CHECKS, strict=True)))
def test_a_checks_key_filters_by_it_and_once_more_shows_all(fake_session, drive, settled, key, check):
    async def steps(app, pilot):
        await pilot.press(key)
        await settled(app, pilot)
        listed = [row.states[check] for row in fake_session.rows(app.screen.query_one(CandidateList).ids)]
        assert listed and set(listed) <= {"open", "split", "todo"}
        await pilot.press(key)
        await settled(app, pilot)
        assert len(app.screen.query_one(CandidateList).ids) == len(fake_session.names)

    drive(fake_session, steps)


def test_counts_stand_over_the_columns_and_the_active_one_in_brackets(fake_session, drive, screen_text, settled):
    async def steps(app, pilot):
        wanted = fake_session.counts()
        await pilot.press("x")
        await settled(app, pilot)
        text = screen_text(app)
        assert f"[{wanted['unresolved:extinction']}]" in text
        assert f"{wanted['needs_me']} NEED YOU" in text

    drive(fake_session, steps)


def test_a_filter_that_lists_nothing_says_the_way_out(fake_session, drive, screen_text, settled):
    fake_session.lets_through = lambda row, where: where.unresolved is None

    async def steps(app, pilot):
        await pilot.press("b")
        await settled(app, pilot)
        assert "Nothing to list: blend unresolved. 0 shows every candidate." in screen_text(app)
        await pilot.press("0")
        await settled(app, pilot)
        assert "> SM-0001" in screen_text(app)

    drive(fake_session, steps)


def test_search_lists_names_that_begin_with_the_text_before_those_that_hold_it(fake_session, drive, settled):
    fake_session.names[:0] = ["Z-0042", "0042-A"]

    async def steps(app, pilot):
        await pilot.press("slash", *"0042")
        await settled(app, pilot)
        found = [fake_session.names[i] for i in app.screen.query_one(CandidateList).ids]
        assert found[:2] == ["0042-A", "Z-0042"] and "SM-0042" in found
        await pilot.press("enter", "down", "down")
        assert app.screen.query_one(CandidateList).chosen.name == "SM-0042"

    drive(fake_session, steps)


def test_letters_are_keys_again_after_a_search(fake_session, drive, settled):
    async def steps(app, pilot):
        await pilot.press("slash", *"sixbdq", "enter")
        await settled(app, pilot)
        assert app.screen.view.find == "sixbdq"
        await pilot.press("s")
        await settled(app, pilot)
        assert app.screen.view.unresolved == "star" and not app.screen.view.find

    drive(fake_session, steps)


def test_orders_come_in_turn_and_can_be_turned_around(fake_session, drive, settled):
    async def steps(app, pilot):
        await pilot.press("o")
        await settled(app, pilot)
        names = [fake_session.names[i] for i in app.screen.query_one(CandidateList).ids]
        assert names == sorted(names)
        await pilot.press("O")
        await settled(app, pilot)
        names = [fake_session.names[i] for i in app.screen.query_one(CandidateList).ids]
        assert names == sorted(names, reverse=True)

    drive(fake_session, steps)


def test_the_cursor_stays_on_its_candidate_when_the_order_changes(fake_session, drive, settled):
    async def steps(app, pilot):
        await pilot.press("down", "down", "down")
        name = app.screen.query_one(CandidateList).chosen.name
        await pilot.press("o")
        await settled(app, pilot)
        assert app.screen.query_one(CandidateList).chosen.name == name

    drive(fake_session, steps)


def test_ordering_is_done_in_another_thread(fake_session, drive):
    async def steps(app, pilot):
        assert fake_session.ordered_in[-1] != threading.get_ident()

    drive(fake_session, steps)


def test_a_filter_is_kept_beside_another(fake_session, drive, screen_text, settled):
    async def steps(app, pilot):
        await pilot.press("x", "n")
        await settled(app, pilot)
        assert "showing extinction unresolved, needs you" in screen_text(app)
        await pilot.press("x")
        await settled(app, pilot)
        assert "showing needs you" in screen_text(app)

    drive(fake_session, steps)


@pytest.mark.parametrize("keys", [("enter", "0"), ("enter", "x"), ("escape",)], ids=str)
def test_a_search_that_is_over_leaves_no_line_behind(fake_session, drive, screen_text, settled, keys):
    async def steps(app, pilot):
        await pilot.press("slash", *"zzz")
        await settled(app, pilot)
        assert "find zzz" in screen_text(app) and "Esc drops it" in screen_text(app)
        await pilot.press(*keys)
        await settled(app, pilot)
        assert "zzz" not in screen_text(app) and app.screen.query_one(CandidateList).ids

    drive(fake_session, steps)


def test_typing_is_never_held_up_by_a_slow_search(million_session, drive, settled):
    gate = threading.Event()

    def slow(text, substring=False, limit=-1):
        gate.wait(10)
        return array("q", [7])

    million_session.find = slow

    async def steps(app, pilot):
        await pilot.press("slash", *"sm")
        assert app.screen.query_one("FindInput").value == "sm"
        gate.set()
        await settled(app, pilot)
        assert list(app.screen.query_one(CandidateList).ids) == [7]

    drive(million_session, steps)


def test_typing_on_gives_up_the_search_that_runs(fake_session, drive, settled, screen_text, monkeypatch):
    find, begun, given_up = fake_session.find, threading.Event(), threading.Event()

    def endless(text, substring=False, limit=-1):
        if substring and text == "00":
            begun.set()
            while fake_session.asked.is_wanted():
                given_up.wait(0.001)  # lets the other thread go on
            given_up.set()
            raise StoreError("interrupted")
        return find(text, substring, limit)

    fake_session.find = endless
    monkeypatch.setattr("tui.desk.queue_order.REST_S", 0)

    async def steps(app, pilot):
        await pilot.press("slash", *"00")
        while not begun.is_set():
            await pilot.pause()
        await pilot.press("1")
        await settled(app, pilot)
        assert given_up.is_set() and "interrupted" not in screen_text(app)
        assert [fake_session.names[one] for one in app.screen.query_one(CandidateList).ids][:2] == ["SM-0001", "SM-0010"]

    drive(fake_session, steps)


def test_counts_are_not_lost_when_a_newer_wish_takes_the_place_of_the_one_that_counted(fake_session, drive, settled):
    async def steps(app, pilot):
        app.screen.counts = {}
        app.screen.order(counting=True)
        app.screen.action_unresolved("blend")
        await settled(app, pilot)
        assert app.screen.counts["all"] == len(fake_session.names)

    drive(fake_session, steps)
