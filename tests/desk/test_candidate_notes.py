"""Notes beside a ruling: kept at every key, of one check only, tame whatever is pasted."""

from __future__ import annotations

import pytest
from textual import events

from tui.desk.widgets.note import NoteEditor
from tui.workflow.records import MAX_NOTE

NAME = "SM-0001"
pytestmark = pytest.mark.usefixtures("any_terminal")


def test_note_is_kept_at_every_key_and_recorded(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        await press("a", "e", "q")
        assert fake_session.drafts[NAME, "star"] == "eq"
        await press("enter", "f", "tab")
        assert fake_session.drafts[NAME, "star"] == "eq\nf" and app.focused is None
        assert "note: eq / f" in screen_text(app)
        await press("f", "enter")
        assert fake_session.log[-1].note == "eq\nf"
        assert not fake_session.drafts.get((NAME, "star"))

    on_candidate(fake_session, steps)


def test_draft_of_another_check_waits_there(fake_session, on_candidate):
    fake_session.save_draft(NAME, "dust", "begun before")

    async def steps(app, screen, press):
        await press("a", "x", "tab", "d")
        assert screen.walk.note == "begun before"
        await press("s")
        assert screen.walk.note == "x"

    on_candidate(fake_session, steps)


def test_pasted_note_keeps_its_lines_and_steers_nothing(fake_session, on_candidate, screen_text):
    fake_session.save_draft(NAME, "star", "kept \x1b[31m")

    async def steps(app, screen, press):
        await press("a")
        app.post_message(events.Paste(" one\r\ntwo\x1b[2J \u202e [/] \tend"))
        await press("right", "tab")
        note = fake_session.drafts[NAME, "star"]
        assert note.split("\n")[0] == "kept \ufffd[31m one" and note.split("\n")[1].startswith(
            "two\ufffd[2J \ufffd [/]"
        )
        assert all(line.isprintable() for line in screen_text(app).split("\n"))

    on_candidate(fake_session, steps)


def test_very_long_note_is_cut_and_that_is_said(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        await press("a", "y")
        screen.query_one(NoteEditor).post_message(events.Paste("x" * 9000))
        await press("right")
        assert fake_session.drafts[NAME, "star"] == "y" + "x" * (MAX_NOTE - 1)
        assert "A note holds 4,000 characters: 5,001 more were left out." in screen_text(app)
        await press("z")
        assert "A note holds 4,000 characters: 1 more were left out." in screen_text(app)
        assert len(fake_session.drafts[NAME, "star"]) == MAX_NOTE
        await press("tab")
        assert app.focused is None

    on_candidate(fake_session, steps)


@pytest.mark.parametrize(("pasted", "kept"), [("a\r\nb\r\n\r\nc", "a\nb\n\nc"), ("a\rb", "a\nb"), ("a\nb", "a\nb")])
def test_line_ends_of_any_system_are_one_line_end_each(fake_session, on_candidate, pasted, kept):
    async def steps(app, screen, press):
        await press("a")
        screen.query_one(NoteEditor).post_message(events.Paste(pasted))
        await press("right")
        assert fake_session.drafts[NAME, "star"] == kept

    on_candidate(fake_session, steps)


def test_a_paste_goes_in_at_the_cursor_in_its_own_order(fake_session, on_candidate):
    async def steps(app, screen, press):
        await press("a", "A", "B", "left")
        screen.query_one(NoteEditor).post_message(events.Paste("1\x1b2\x1b[31m3"))
        await press("x")
        assert fake_session.drafts[NAME, "star"] == "A1\ufffd2\ufffd[31m3xB"

    on_candidate(fake_session, steps)
