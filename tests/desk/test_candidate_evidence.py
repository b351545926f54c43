"""Evidence comes from another thread: late, refused or broken, it harms no page and no ruling."""

from __future__ import annotations

import threading

import pytest

from tui.errors import StoreError

pytestmark = pytest.mark.usefixtures("any_terminal")


def test_evidence_that_cannot_be_had_is_said_on_the_page(fake_session, on_candidate, screen_text, monkeypatch):
    def refuse(name, kinds=None):
        raise StoreError("The photosphere grid is gone: plainlight set QUEUE photosphere dwarfs.")

    monkeypatch.setattr(fake_session, "evidence", refuse)

    async def steps(app, screen, press):
        assert "photosphere grid is gone" in screen_text(app)
        await press("e")
        assert screen.walk.chosen == ""
        await press("q")
        assert app.screen is not screen

    on_candidate(fake_session, steps)


def test_evidence_is_asked_for_off_the_interface_thread(fake_session, on_candidate, monkeypatch):
    threads, plain = [], fake_session.evidence
    monkeypatch.setattr(fake_session, "evidence", lambda *a: threads.append(threading.get_ident()) or plain(*a))

    async def steps(app, screen, press):
        assert threads and threading.get_ident() not in threads

    on_candidate(fake_session, steps)


def held_back(session, monkeypatch) -> threading.Event:
    """The evidence of SM-0002 waits for this event."""
    gate, plain = threading.Event(), session.evidence

    def slow(name, kinds=None):
        if name == "SM-0002":
            gate.wait(20)
        return plain(name)

    monkeypatch.setattr(session, "evidence", slow)
    return gate


def test_late_evidence_never_shows_under_another_name(fake_session, on_candidate, monkeypatch):
    gate = held_back(fake_session, monkeypatch)

    async def steps(app, screen, press):
        left = screen.walk
        screen.open("SM-0002")
        assert screen.walk.evidence == {} and screen.walk is not left
        screen.open("SM-0003")
        gate.set()
        await press("right")
        assert screen.walk.name == "SM-0003"
        assert screen.walk.evidence["star"].digest == "star-2"

    on_candidate(fake_session, steps)


def test_nothing_can_be_ruled_before_the_numbers_are_there(fake_session, on_candidate, monkeypatch):
    gate = held_back(fake_session, monkeypatch)

    async def steps(app, screen, press):
        screen.open("SM-0002")
        screen.walk.loaded = None
        screen.action_choose("explains")
        screen.action_record()
        assert screen.walk.chosen == "" and fake_session.log == []
        gate.set()

    on_candidate(fake_session, steps)


def test_unforeseen_failure_in_the_background_is_a_quiet_line(
    fake_session, on_candidate, screen_text, monkeypatch, tmp_path
):
    monkeypatch.setattr("platformdirs.user_log_path", lambda *args, **kwargs: tmp_path)

    def break_down(name, kinds=None):
        raise ZeroDivisionError("float division by zero")

    async def steps(app, screen, press):
        app.is_guarded = True
        monkeypatch.setattr(fake_session, "evidence", break_down)
        screen.open("SM-0002")
        await press("right")
        text = screen_text(app)
        assert "The evidence could not be had" in text and "no evidence, so nothing can be ruled" in text
        assert "ZeroDivisionError" in (tmp_path / "desk-faults.txt").read_text(encoding="utf-8")
        await press("q")
        assert app.screen is not screen

    on_candidate(fake_session, steps)
