"""The app around the screens: keys, colours, sizes, help."""

from __future__ import annotations

import os

import pytest
from textual.color import Color

from tui.desk.app import Desk
from tui.desk.keys import PLACES, RESERVED, checked_keymap
from tui.desk.screens.help import HelpScreen, key_rows
from tui.desk.screens.pages import PAGES
from tui.desk.screens.small import SmallScreen
from tui.desk.theme import THEME_NAMES, theme_name, themes
from tui.desk.widgets.candidate_list import CandidateList
from tui.desk.widgets.pick_rows import PickRows
from tui.desk.widgets.rows import row_text
from tui.errors import SettingError


@pytest.mark.parametrize("name", THEME_NAMES)
def test_every_theme_draws_every_screen(fake_session, drive, settled, name):
    async def steps(app, pilot):
        assert app.theme == theme_name(name)
        for keys in (("down", "down", "v", "q"), ("y", "q"), ("question_mark", "q")):
            await pilot.press(*keys)
            await settled(app, pilot)

    drive(fake_session, steps, theme=name)


def test_colours_are_changed_by_a_key_and_named(fake_session, drive, screen_text):
    async def steps(app, pilot):
        await pilot.press("T")
        await pilot.pause()
        assert app.theme == theme_name("light") and "Colours: light" in screen_text(app)

    drive(fake_session, steps)


def contrast(one: Color, other: Color) -> float:
    """WCAG 2.1, section 1.4.3: contrast ratio of two colours."""

    def luminance(colour: Color) -> float:
        parts = [part / 12.92 if part <= 0.03928 else ((part + 0.055) / 1.055) ** 2.4 for part in colour.normalized]
        return 0.2126 * parts[0] + 0.7152 * parts[1] + 0.0722 * parts[2]

    light, dark = sorted((luminance(one), luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


@pytest.mark.parametrize("theme", [theme for theme in themes() if not theme.ansi], ids=lambda theme: theme.name)
def test_every_word_stands_out_from_every_ground(theme):
    """WCAG 2.1, 1.4.3: 4.5 for text; 7 (1.4.6) in the theme of high contrast."""
    words = {key: value for key, value in theme.variables.items()
             if key.startswith(("state-", "attention", "quiet", "pull-", "series-"))}  # fmt: skip
    grounds = (theme.background, theme.surface, theme.variables["cursor-row"])
    for ground in grounds:
        for key, colour in words.items():
            ratio = contrast(Color.parse(colour), Color.parse(ground))
            assert ratio >= (7 if theme.name == theme_name("contrast") else 4.5), (key, ground, ratio)


@pytest.mark.parametrize("theme", [theme for theme in themes() if not theme.ansi], ids=lambda theme: theme.name)
def test_lines_of_a_plot_can_be_seen_and_stay_behind_its_data(theme):
    """WCAG 2.1, 1.4.11: 3 for graphics that carry meaning; what is drawn over the grid stands out more."""
    ground = Color.parse(theme.background)
    grid, data = (contrast(Color.parse(theme.variables[name]), ground) for name in ("plot-grid", "series-1"))
    assert 3 <= grid < data


def test_nothing_is_drawn_dim(fake_session, drive, settled):
    """Dim text on many terminals is half of whatever contrast its colour had."""

    async def steps(app, pilot):
        for keys in ((), ("down", "down", "v"), ("q", "y"), ("q", "question_mark"), ("q", "enter"), ("1",)):
            await pilot.press(*keys)
            await settled(app, pilot)
            strips = app.screen._compositor.render_strips()
            assert not [part.text for strip in strips for part in strip if part.style and part.style.dim]

    drive(fake_session, steps, size=(120, 40))


def test_no_colour_leaves_every_meaning(fake_session, drive, screen_text, monkeypatch):
    monkeypatch.setenv("NO_COLOR", "1")

    async def steps(app, pilot):
        text = screen_text(app)
        assert "> SM-0001" in text and "/split" in text and "<short" in text and "=expl" in text

    drive(fake_session, steps)


@pytest.mark.parametrize("size", [(79, 24), (80, 23), (20, 5), (1, 1)], ids=str)
def test_a_terminal_too_small_gets_a_plain_sentence_and_everything_comes_back(fake_session, drive, screen_text, size):
    async def steps(app, pilot):
        await pilot.press("down", "down")
        await pilot.resize_terminal(*size)
        await pilot.pause()
        assert isinstance(app.screen, SmallScreen)
        if size[0] > 60:
            assert "The desk needs 80 by 24" in " ".join(screen_text(app).split())
        await pilot.resize_terminal(100, 30)
        await pilot.pause()
        assert app.screen.query_one(CandidateList).cursor == 2

    drive(fake_session, steps)


def test_a_desk_started_too_small_waits(fake_session, drive):
    async def steps(app, pilot):
        assert isinstance(app.screen, SmallScreen)
        await pilot.resize_terminal(80, 24)
        await pilot.pause()
        assert app.screen.query_one(CandidateList).chosen.name == "SM-0001"

    drive(fake_session, steps, size=(40, 10))


def test_keys_can_be_given_by_file_and_every_line_says_so(fake_session, drive, screen_text, settled):
    async def steps(app, pilot):
        assert "j next, fewest finished" in screen_text(app)
        await pilot.press("7")
        await settled(app, pilot)
        assert app.screen.view.unresolved == "dust"
        await pilot.press("question_mark")
        await settled(app, pilot)
        assert "j            next, fewest finished" in screen_text(app)

    drive(fake_session, steps, keys={"queue.next": "j", "queue.down": "down", "queue.unresolved_dust": "7"})


@pytest.mark.parametrize(
    ("keys", "reason"),
    [
        ({"queue.nxt": "f"}, "queue.nxt: there is no such action. Nearest: queue.next, [a-z_.]+, [a-z_.]+. Mend it"),
        ({"queue.next": "q"}, "queue.next: 'q' is already queue.quit"),
        ({"queue.next": "ctrl+c"}, "terminal's"),
        ({"queue.next": ""}, "given no key"),
        ({"queue.next": "notakey"}, "no key 'notakey'. Nearest: .* Mend it in .*settings.toml"),
        ({"queue.next": "pgdn"}, "no key 'pgdn'. Nearest: pagedown, "),
        ({"queue.next": "ctrl + c"}, r"no key 'ctrl \+ c'. Nearest: ctrl\+(?!c,)"),
        ({"queue.next": "n,,f"}, "given no key"),
    ],
)
def test_keys_that_cannot_be_had_are_refused_with_the_file_and_what_stands_near(keys, reason, monkeypatch):
    monkeypatch.setenv("PLAINLIGHT_CONFIG", "/somewhere/settings.toml")
    with pytest.raises(SettingError, match=reason):
        checked_keymap(keys)


def test_signs_in_the_file_are_keys_too(fake_session, drive, settled):
    async def steps(app, pilot):
        await pilot.press("comma")
        await settled(app, pilot)
        assert app.screen.view.sort == "name"
        await pilot.press("f5")
        await settled(app, pilot)
        assert app.screen.view.needs_me

    drive(fake_session, steps, keys={"queue.order": ",", "queue.needs_me": "&, f5"})


def test_each_letter_that_leads_elsewhere_means_one_thing_in_every_place():
    """Story and tally lie apart: who presses their letter on a star's page must not change a drawing instead."""
    for letter, action in (("y", "story"), ("t", "tally"), ("m", "next_for_me")):
        assert {key.action for place in PLACES.values() for key in place if letter in key.keys.split(",")} == {action}


def test_every_page_of_a_candidate_is_named_in_its_help():
    named = [key.why for key in PLACES["candidate"] if key.id.startswith("candidate.page_") and key.id[-1].isdigit()]
    assert named == [f"The page {page.title}." for page in PAGES]
    views = next(key for key in PLACES["candidate"] if key.id == "candidate.views")
    assert all(page.title in views.why for page in PAGES)


def test_no_place_has_two_actions_on_one_key_or_takes_the_terminals():
    checked_keymap({})
    for entries in PLACES.values():
        assert not RESERVED.intersection(key for entry in entries for key in entry.keys.split(","))


def test_an_unknown_theme_is_refused(fake_session):
    with pytest.raises(SettingError, match="dark, light"):
        Desk(fake_session, theme="sepia")


@pytest.mark.parametrize("keys", [("q", "q"), ("Q",), ("ctrl+c",)], ids=str)
def test_leaving(fake_session, drive, keys):
    async def steps(app, pilot):
        await pilot.press(*keys)
        await pilot.pause()
        assert not app.is_running or app._exit

    drive(fake_session, steps)


def test_a_queue_deleted_while_open_is_told_in_a_plain_line_and_can_be_left(
    disk_session, drive, screen_text, settled
):
    async def steps(app, pilot):
        os.unlink(disk_session.path)
        for key in ("o", "m", "t"):
            await pilot.press(key)
            await settled(app, pilot)
            assert "was moved, deleted or replaced while open" in " ".join(screen_text(app).split())
        await pilot.press("q", "q", "q")
        await pilot.pause()
        assert app._exit

    drive(disk_session, steps)


def test_one_q_too_many_does_not_end_the_program(fake_session, drive, screen_text, settled):
    async def steps(app, pilot):
        await pilot.press("y", "q", "q")
        await settled(app, pilot)
        assert not app._exit and "q again leaves; everything is kept." in screen_text(app)
        await pilot.press("down", "q")
        await settled(app, pilot)
        assert not app._exit and "q again leaves" in screen_text(app)

    drive(fake_session, steps)


@pytest.mark.parametrize("key", sorted(RESERVED - {"ctrl+c", "ctrl+z"}))
def test_the_terminals_own_keys_do_nothing(fake_session, drive, screen_text, key):
    async def steps(app, pilot):
        before = screen_text(app)
        await pilot.press(key)
        await pilot.pause()
        assert screen_text(app) == before and app.is_running

    drive(fake_session, steps)


def test_help_finds_an_action_by_name_and_does_it(fake_session, drive, settled):
    async def steps(app, pilot):
        await pilot.press("question_mark", "slash", *"dust", "enter", "enter")
        await settled(app, pilot)
        assert not isinstance(app.screen, HelpScreen)
        assert app.screen.view.unresolved == "dust"

    drive(fake_session, steps)


def test_help_names_actions_of_other_places_without_doing_them(fake_session, drive, screen_text, settled):
    async def steps(app, pilot):
        await pilot.press("question_mark", "slash", *"withdraw", "enter")
        await settled(app, pilot)
        assert "in Candidate" in screen_text(app)
        assert app.screen.query_one(PickRows).target is None

    drive(fake_session, steps)


@pytest.mark.parametrize("size", [(80, 24), (120, 40), (200, 60)], ids=str)
def test_help_looks_so(fake_session, drive, screen_text, snapshot, size):
    async def steps(app, pilot):
        await pilot.press("question_mark")
        await pilot.pause()
        snapshot(f"help-{size[0]}x{size[1]}", screen_text(app))

    drive(fake_session, steps, size=size)


@pytest.mark.parametrize("place", PLACES)
def test_no_name_of_an_action_is_cut_in_help(place):
    for made in key_rows(place, {}, 76):
        if made.target is not None:
            assert f"{made.target.label} " in row_text(made.spans)


@pytest.mark.parametrize("word", ["--", "again", "3/5", "oddness"])
def test_help_explains_what_the_columns_read(fake_session, drive, word):
    async def steps(app, pilot):
        await pilot.press("question_mark")
        await pilot.pause()
        assert f"\n  {word} " in app.screen.query_one(PickRows).text

    drive(fake_session, steps)


def test_thin_leaves_out_what_a_slow_line_need_not_carry(fake_session, drive):
    async def steps(app, pilot):
        assert app.animation_level == "none" and not app.screen.has_room

    drive(fake_session, steps, size=(200, 60), thin=True)


def test_a_long_round_is_told_of_a_break_once(fake_session, drive, monkeypatch):
    now = [1000.0]
    monkeypatch.setattr("tui.desk.app.monotonic", lambda: now[0])

    async def steps(app, pilot):
        assert app.break_line() == ""
        app.note_ruling("2026-03-04T05:06:07.000000Z")
        now[0] += 51 * 60
        assert app.break_line().startswith("51 minutes without a break.")
        assert app.break_line() == ""

    drive(fake_session, steps)
