"""Every further page of a candidate, its split and its story, in three sizes, all their text made to do harm."""

from __future__ import annotations

import re

import pytest
from rich.cells import cell_len

from tests.desk.rich_session import RICH, RichSession
from tui.desk.screens.page_data import facts_page
from tui.desk.screens.pages import PAGES, tab_row
from tui.desk.screens.split import SplitScreen
from tui.desk.screens.story import StoryScreen
from tui.desk.screens.walk import Loaded, Walk
from tui.desk.widgets.rows import row_text
from tui.model import CHECKS

SIZES = ((80, 24), (120, 40), (200, 60))
LONG = re.compile(r"\d\.\d{6,}|\d{7,}\.\d|\d{3,}\.\d{3,}")  # more digits than anything here was measured to

pytestmark = pytest.mark.usefixtures("any_terminal")


@pytest.fixture
def rich():
    return RichSession()


@pytest.mark.parametrize("size", SIZES, ids=str)
def test_the_pages_look_so(rich, on_candidate, screen_text, snapshot, size):
    async def steps(app, screen, press):
        await press("i")
        for number, page in enumerate(PAGES, start=1):
            await press(str(number))
            text = screen_text(app)
            assert all(line.isprintable() and cell_len(line) <= size[0] for line in text.split("\n"))
            assert f"[{number} " in text and "RULE" in text
            snapshot(f"page-{page.short}-{size[0]}x{size[1]}", text)

    on_candidate(rich, steps, name=RICH, size=size)


@pytest.mark.parametrize("size", SIZES, ids=str)
@pytest.mark.parametrize("check", CHECKS)
def test_the_facts_of_every_check_look_so(rich, size, check, snapshot):
    text = "\n".join(row_text(line).rstrip() for line in facts_page(walk_of(rich, check), size[0], 50)) + "\n"
    assert all(line.isprintable() and cell_len(line) <= size[0] for line in text.split("\n"))
    snapshot(f"facts-{check}-{size[0]}", text)


@pytest.mark.parametrize("size", SIZES, ids=str)
@pytest.mark.parametrize("title", ["split", "story"])
def test_split_and_story_under_a_hostile_name_look_so(rich, drive, settled, screen_text, snapshot, title, size):
    async def steps(app, pilot):
        app.push_screen(SplitScreen(rich, RICH, "blend") if title == "split" else StoryScreen(rich, RICH))
        await settled(app, pilot)
        text = screen_text(app)
        assert all(line.isprintable() and cell_len(line) <= size[0] for line in text.split("\n"))
        snapshot(f"{title}-hostile-{size[0]}x{size[1]}", text)

    drive(rich, steps, size=size)


def walk_of(session, check: str) -> Walk:
    walk = Walk(RICH, check)
    walk.take(Loaded(session.candidate(RICH), session.view(RICH), session.band_info()))
    walk.evidence = session.stored_evidence(RICH)
    walk.cutouts, walk.dip_curves = tuple(session.cutouts(RICH)), tuple(session.dip_curves(RICH))
    walk.look_alikes, walk.story = session.look_alikes(RICH), tuple(session.story(RICH))
    walk.redrawn()
    return walk


@pytest.mark.parametrize("width", [78, 118, 198])
@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.short)
def test_no_page_prints_a_raw_number_or_a_p_of_nothing(rich, page, width):
    """Digits beyond what was measured, `p 0`, `nan` and `None` are marks of a number that nobody wrote for a reader."""
    for text in (row_text(line) for check in CHECKS for line in page.draw(walk_of(rich, check), width, 50)):
        assert cell_len(text) <= width, text
        told = re.sub(r"JD [\d.]+|[\d.]+ deg", "", text)  # times and places are known to more digits than fluxes
        assert not LONG.search(told), text
        assert not re.search(r"\bp,?( at most)? +0(\.0+)?( |$)|\bnan\b|\bNone\b|e-2\d\d", told), text


def test_decimal_points_stand_under_one_another_whatever_stands_before_them(rich):
    """The same column of cells for the point of every cosine, wide and combining names or not."""
    page = next(page for page in PAGES if page.short == "alike")
    rows = [row_text(line) for line in page.draw(walk_of(rich, "star"), 118, 50)]
    points = {cell_len(text[: text.index("0.950")]) for text in rows if "0.950" in text}
    assert len(points) == 1


@pytest.mark.parametrize("width", [80, 90, 100, 200])
@pytest.mark.parametrize("here", range(1, len(PAGES) + 1))
def test_every_title_of_the_pages_stands_on_the_line_whole(width, here):
    text = row_text(tab_row(here, width))
    assert cell_len(text) <= width
    titles = [page.title if width >= 100 else page.short for page in PAGES]
    for number, title in enumerate(titles, start=1):
        assert (f"[{number} {title}]" if number == here else f" {number} {title}") in text + " "
