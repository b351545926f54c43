"""The candidate's page at many sizes and with hostile names and notes: exact rows, nothing that moves the terminal."""

from __future__ import annotations

import pytest
from rich.cells import cell_len

from tests.desk.made import HOSTILE_NAMES
from tui.desk.screens.candidate import CandidateScreen

SIZES = ((80, 24), (120, 40), (200, 60))
pytestmark = pytest.mark.usefixtures("any_terminal")


@pytest.fixture
def page(drive, settled, screen_text):
    """`page(session, name, keys, size) -> text` of the candidate's page after some keys."""

    def run(session, name, keys=(), size=(80, 24), **options):
        texts = []

        async def steps(app, pilot):
            app.push_screen(CandidateScreen(session, name))
            await settled(app, pilot)
            for key in keys:
                await pilot.press(key)
                await settled(app, pilot)
            texts.append(screen_text(app))

        drive(session, steps, size=size, **options)
        return texts[0]

    return run


def is_tame(text: str, width: int) -> bool:
    """Whether every line is printable and no wider than the screen."""
    return all(line.isprintable() and cell_len(line) <= width for line in text.split("\n"))


def test_hostile_names_and_notes_leave_the_page_whole(fake_session, drive, settled, screen_text):
    for name in fake_session.names:
        fake_session.drafts[name, "star"] = f"[bold]{name}[/] \x1b[2J\x07 日本 \u202e x"

    async def steps(app, pilot):
        screen = CandidateScreen(fake_session, "SM-0001")
        app.push_screen(screen)
        await settled(app, pilot)
        for name in HOSTILE_NAMES:
            screen.open(name)
            await settled(app, pilot)
            await pilot.press("right", "f")
            await settled(app, pilot)
            text = screen_text(app)
            lines = text.split("\n")
            assert is_tame(text, 80), name
            assert "[STAR" in lines[1] and "? help" in lines[22] + lines[23], name
            assert ("> falls short <" in text or "no evidence" in text) and "note: [bold]" in text, name

    drive(fake_session, steps)


@pytest.mark.parametrize("size", [(80, 24), (200, 60)])
def test_every_page_and_mode_is_tame_and_shows_its_keys(fake_session, drive, settled, screen_text, size):
    async def steps(app, pilot):
        screen = CandidateScreen(fake_session, "[@click=app.exit]leave[/]")
        app.push_screen(screen)
        await settled(app, pilot)
        for key in ("d", "p", "p", "h", "h", "c", *"b123456789", "0"):
            await pilot.press(key)
            await settled(app, pilot)
            text = screen_text(app)
            assert is_tame(text, size[0]), key
            assert "RULE" in text, key
            assert "help" in "".join(text.rstrip().split("\n")[-2:]) or key == "c"

    drive(fake_session, steps, size=size)


@pytest.mark.parametrize("size", SIZES)
@pytest.mark.parametrize(
    ("title", "name", "keys"), [("page", "SM-0001", ["d"]), ("hostile", "\x1b[2J\x1b[31mred", ["b", "right", "e"])]
)
def test_snapshot(fake_session, page, snapshot, size, title, name, keys):
    text = page(fake_session, name, keys, size)
    snapshot(f"candidate-{title}-{size[0]}x{size[1]}", text)


@pytest.mark.parametrize("theme", ["dark", "light", "contrast", "terminal"])
def test_every_theme_draws(fake_session, page, theme):
    assert "chi2" in page(fake_session, "SM-0001", ["d", "right"], theme=theme)


def test_no_colour_draws_the_same_text(fake_session, page, monkeypatch):
    coloured = page(fake_session, "SM-0001", ["d", "right"])
    monkeypatch.setenv("NO_COLOR", "1")
    assert page(fake_session, "SM-0001", ["d", "right"]) == coloured


def test_resize_at_any_moment(fake_session, drive, settled, screen_text):
    async def steps(app, pilot):
        app.push_screen(CandidateScreen(fake_session, "SM-0001"))
        await settled(app, pilot)
        for width, height in ((200, 60), (80, 24), (60, 20), (81, 25), (300, 90), (80, 24)):
            await pilot.resize_terminal(width, height)
            await settled(app, pilot)
            assert is_tame(screen_text(app), width)
        assert "[STAR .todo]" in screen_text(app)

    drive(fake_session, steps)


def test_mouse_picks_a_point_a_check_and_a_ruling(fake_session, drive, settled, screen_text):
    async def steps(app, pilot):
        screen = CandidateScreen(fake_session, "SM-0001")
        app.push_screen(screen)
        await settled(app, pilot)
        lines = screen_text(app).split("\n")
        await pilot.click(offset=(lines[1].index("blend"), 1))
        await settled(app, pilot)
        assert screen.walk.check == "blend"
        names = next(number for number, line in enumerate(lines) if line.startswith("sigma"))
        await pilot.click(offset=(lines[names].index("W3"), names - 2))
        await settled(app, pilot)
        assert "POINT    W3" in screen_text(app)
        rule = next(number for number, line in enumerate(lines) if line.startswith(" RULE"))
        await pilot.click(offset=(lines[rule].index("unclear"), rule))
        await settled(app, pilot)
        assert screen.walk.chosen == "unclear"

    drive(fake_session, steps)


def test_bare_console_is_drawn_in_plain_letters(fake_session, page, monkeypatch):
    monkeypatch.setenv("TERM", "linux")
    text = page(fake_session, "SM-0001", ["d"])
    assert text.isascii() and "aaa star" in text
