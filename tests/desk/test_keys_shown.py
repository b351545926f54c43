"""Every key that a screen names does something there, as things stand: pressed one by one, each on a screen of its own.

What a key may do: change what is on the screen, open another, leave this one, or say in words why it cannot.
"""

from __future__ import annotations

import re

import pytest

from tests.desk.conftest import settle, text_of
from tui.desk.screens.candidate import CandidateScreen
from tui.desk.screens.candidate_keys import offered
from tui.desk.screens.help import HelpScreen
from tui.desk.screens.split import SplitScreen
from tui.desk.screens.story import StoryScreen
from tui.desk.screens.tally import TallyScreen
from tui.desk.widgets.key_line import KeyLine

pytestmark = pytest.mark.usefixtures("any_terminal")

NAMES = {key: key.lower() for key in ("Enter", "Space", "Tab", "Up", "Down", "Left", "Right", "Home", "End")}
NAMES |= {"PgUp": "pageup", "PgDn": "pagedown"}
NAMES |= {
    "?": "question_mark",
    "/": "slash",
    "+": "plus",
    "-": "minus",
    "<": "less_than_sign",
    ">": "greater_than_sign",
}

SCREENS = {
    "split": lambda session: SplitScreen(session, "SM-0003", "blend"),
    "split under seal": lambda session: SplitScreen(session, "SM-0001", "blend"),
    "story": lambda session: StoryScreen(session, "SM-0001"),
    "help": lambda session: HelpScreen("queue"),
    "help on story": lambda session: HelpScreen("story"),
}
CANDIDATE = {  # the keys that lead to a state of the page
    "ruled, other fits": ("b",),
    "page that scrolls": ("1",),
    "page that does not": ("6",),
    "plot alone, zoomed": ("p", "plus"),
    "by hand, changed": ("d", "h", "up", "left"),
    "asked what to compare with": ("d", "c"),
}


def keys_on(app) -> list[str]:
    """The keys that the last lines of the screen name."""
    screen = app.screen
    if isinstance(screen, CandidateScreen):
        scrolls = screen.walk.page > 0 and screen.query_one("#walk-page").has_more
        entries = offered(screen.walk, app.keys_of, screen.session.reviewer is not None, scrolls)
        named = " ".join(keys for keys, _, _ in entries).replace("1-9", "2 3")
        foot = "\n".join(text_of(app).split("\n")[-4:])
        assert all(entry[1] in foot for entry in entries[-2:])
    else:
        named = " ".join(piece.keys for line in screen.query_one(KeyLine).placed() for piece in line)
    return [NAMES.get(key, key) for key in named.split()]


def pressed_one_by_one(session, drive, open_screen, lead=(), size=(80, 24)):
    """Press each key that is named, each on a screen of its own; the keys after which nothing was different."""
    idle = []

    async def steps(app, pilot):
        ground = app.screen
        for key in dict.fromkeys(await opened(app, pilot)):
            if app.screen is ground:
                await opened(app, pilot)
            before, shown = text_of(app), app.screen
            await pilot.press(key)
            await settle(app, pilot)
            if app.screen is shown and text_of(app) == before:
                idle.append(key)
            while app.screen is not ground:
                app.pop_screen()
                await pilot.pause()

    async def opened(app, pilot):
        session.forget()
        app.push_screen(open_screen(session))
        await settle(app, pilot)
        for key in lead:
            await pilot.press(key)
            await settle(app, pilot)
        named = keys_on(app)
        assert named, "a screen names its keys"
        return named

    drive(session, steps, size=size)
    return idle


@pytest.mark.parametrize("state", SCREENS)
def test_a_key_on_the_key_line_works(fake_session, drive, state):
    assert pressed_one_by_one(fake_session, drive, SCREENS[state]) == []


@pytest.mark.parametrize("state", CANDIDATE)
def test_a_key_on_a_candidates_page_works(fake_session, drive, state):
    """Who stands at one end of the points, or on a check, goes no farther that way: the others of the group lead on."""

    def open_screen(session):
        if state.startswith("ruled"):
            session.rule("SM-0001", "blend", "short")
        return CandidateScreen(session, "SM-0001")

    idle = set(pressed_one_by_one(fake_session, drive, open_screen, CANDIDATE[state]))
    groups = ({"left", "right"}, {"less_than_sign", "greater_than_sign"}, set("sixbd"))
    assert all(any(key in group and len(group & idle) == 1 for group in groups) for key in idle), idle


def test_a_reader_without_a_handle_is_shown_no_ruling_key(reader_session, drive):
    reading = pressed_one_by_one(reader_session, drive, lambda session: CandidateScreen(session, "SM-0001"))
    assert reading == ["s"]  # the check on view
    assert pressed_one_by_one(reader_session, drive, SCREENS["split"]) == []


def test_enter_stands_on_the_key_line_of_a_split_only_once_something_is_chosen(fake_session, drive):
    async def steps(app, pilot):
        app.push_screen(SCREENS["split"](fake_session))
        await settle(app, pilot)
        assert "enter" not in keys_on(app)
        await pilot.press("f")
        await settle(app, pilot)
        assert "enter" in keys_on(app)

    drive(fake_session, steps)


@pytest.mark.parametrize("lead", [(), ("down",), ("r",)], ids=["counts", "a check", "reviewers"])
def test_a_key_on_the_tally_works(disk_session, drive, lead):
    disk_session.forget = lambda: None  # its rulings stay: no key of the tally rules
    assert pressed_one_by_one(disk_session, drive, TallyScreen, lead) == []


def test_while_something_is_typed_the_line_names_the_way_out(fake_session, drive):
    async def steps(app, pilot):
        app.push_screen(SCREENS["split"](fake_session))
        await settle(app, pilot)
        await pilot.press("a")
        await settle(app, pilot)
        assert re.search(r"Tab leaves the note; Enter begins a new line\s*$", text_of(app))
        await pilot.press("q", "tab")
        await settle(app, pilot)
        assert isinstance(app.screen, SplitScreen) and "f falls short" in text_of(app).split("\n")[-2]

    drive(fake_session, steps)
