"""The queue's screen: what it shows, and what the chosen candidate is told to be."""

from __future__ import annotations

from dataclasses import replace

import pytest
from rich.cells import cell_len

from tui.desk.widgets.candidate_list import CandidateList
from tui.desk.widgets.described import Described
from tui.desk.widgets.queue_columns import columns_for, row_cells
from tui.errors import StoreError
from tui.model import CHECKS

SIZES = [(80, 24), (120, 40), (200, 60)]


def lines_of(text: str) -> list[str]:
    """The lines that list a candidate."""
    return [line for line in text.splitlines() if ".sealed" in line and (" 0/5" in line or " 0/4" in line)]


@pytest.mark.parametrize("size", SIZES, ids=str)
def test_the_queue_looks_so(fake_session, drive, screen_text, snapshot, size):
    fake_session.place = ("SM-0003", "")

    async def steps(app, pilot):
        app.screen._settle.stop()
        await app.screen.describe(app.screen.query_one(CandidateList).chosen)
        await pilot.pause()
        snapshot(f"queue-{size[0]}x{size[1]}", screen_text(app))

    drive(fake_session, steps, size=size)


@pytest.mark.parametrize("size", [(80, 24), (300, 90)], ids=str)
def test_hostile_and_wide_names_keep_the_columns_in_line(fake_session, drive, screen_text, settled, size):
    async def steps(app, pilot):
        await pilot.press("end")
        await settled(app, pilot)
        rows = lines_of(screen_text(app))
        assert len(rows) >= 8
        starts = {cell_len(row[: row.index(".sealed")]) for row in rows}
        assert len(starts) == 1
        assert not any(ord(character) < 32 or 0x7F <= ord(character) < 0xA0 for row in rows for character in row)

    drive(fake_session, steps, size=size)


def test_markup_in_a_name_is_text_and_does_nothing(fake_session, drive, screen_text, settled):
    async def steps(app, pilot):
        await pilot.press("slash", *"click")
        await settled(app, pilot)
        await pilot.press("enter")
        assert "[@click=app.exit]leave[/]" in screen_text(app) or "[@..eave[/]" in screen_text(app)
        await pilot.click(CandidateList, offset=(4, 0))
        assert app.is_running

    drive(fake_session, steps)


def test_others_rulings_show_within_a_second_or_so(fake_session, drive, settled):
    async def steps(app, pilot):
        for check in CHECKS:
            fake_session.rule("SM-0001", check, "short")
        fake_session.version += 1
        app.screen.ordering_s = 0.0
        app.screen.poll()
        await settled(app, pilot)
        assert app.screen.query_one(CandidateList).row_at(0).done

    drive(fake_session, steps)


def test_a_candidate_is_told_in_one_sentence(fake_session, drive):
    async def steps(app, pilot):
        row = app.screen.query_one(CandidateList).chosen
        await app.screen.describe(row)
        said = [text for text, _ in app.screen.query_one(Described).said]
        assert said[0] == "SM-0001  9.1 sigma: W3 and W4 brighter than the star alone; 8 bands agree."
        assert "What others ruled opens when you are done" in said[1]

    drive(fake_session, steps)


def test_who_else_looks_and_a_note_begun_are_told_of_the_chosen_candidate(fake_session, drive):
    fake_session.looking = {"SM-0001": ["plover"]}
    fake_session.drafts["SM-0001", "blend"] = "half a thou"

    async def steps(app, pilot):
        await app.screen.describe(app.screen.query_one(CandidateList).chosen)
        said = [text for text, _ in app.screen.query_one(Described).said]
        assert said[1].startswith("plover is looking at it. A note is begun on blend. You have ruled nothing")
        assert "half a thou" not in said[1]

    drive(fake_session, steps)


def test_oddness_by_which_the_list_is_ordered_is_a_column_at_80_too(fake_session, drive, screen_text):
    async def steps(app, pilot):
        lines = screen_text(app).splitlines()
        head = next(line for line in lines if " odd " in line)
        odd = [float(line[head.index("odd") - 1 :].split()[0]) for line in lines_of("\n".join(lines))]
        assert odd == sorted(odd, reverse=True) and odd[0] == 9.1

    drive(fake_session, steps)


@pytest.mark.parametrize(
    ("oddness", "pull", "shown"), [(9.14, -8.25, "9.1"), (123.4, 9999.0, "123"), (45_678.0, -1e9, "46k")], ids=str
)
@pytest.mark.parametrize("band", ["W3", "PACS160", "a_band_of_a_long_name"])
def test_numbers_of_any_size_keep_the_columns_in_line(fake_session, oddness, pull, shown, band):
    row = replace(fake_session.row(0), oddness=oddness, odd_pull=pull, odd_band=band)
    cells = row_cells(row, columns_for(80), chosen=True)
    assert sum(cell_len(text) for text, _ in cells) == 80 and cells[2][0].strip() == shown
    assert len(cells[3][0]) == 11


def test_a_wall_screen_gives_the_room_beside_the_list_to_the_chosen_candidate(fake_session, drive, settled):
    async def steps(app, pilot):
        await app.screen.describe(app.screen.query_one(CandidateList).chosen)
        await settled(app, pilot)
        assert app.screen.query_one("#peek").size.width > 170 and app.screen.query_one(CandidateList).size.width == 120

    drive(fake_session, steps, size=(300, 90))


def test_next_for_me_claims_and_opens(fake_session, drive, settled):
    opened = []

    async def steps(app, pilot):
        app.screen.open_candidate = opened.append
        await pilot.press("m")
        await settled(app, pilot)
        assert opened == ["SM-0001"] and fake_session.claims == {"SM-0001"}

    drive(fake_session, steps)


def test_when_nothing_needs_me_it_says_so(fake_session, drive, screen_text, settled):
    fake_session.claim_next = lambda skip=(): None

    async def steps(app, pilot):
        await pilot.press("m")
        await settled(app, pilot)
        assert "Nothing needs you now" in screen_text(app)

    drive(fake_session, steps)


def test_a_reader_without_a_handle_is_offered_no_work(reader_session, drive, screen_text, settled):
    async def steps(app, pilot):
        assert "fewest finished" not in screen_text(app) and "You are reading without a handle" in screen_text(app)
        await pilot.press("m")
        await settled(app, pilot)
        assert "Without a handle nothing can need you. Join first" in screen_text(app)

    drive(reader_session, steps)


def test_a_fault_of_the_store_is_a_plain_line(fake_session, drive, screen_text, settled):
    async def steps(app, pilot):
        fake_session.fail = StoreError("saltmarsh.db is locked [/]; try again.")
        await pilot.press("o")
        await settled(app, pilot)
        assert "saltmarsh.db is locked [/]; try again." in screen_text(app)
        fake_session.fail = None
        await pilot.press("o")
        await settled(app, pilot)
        assert "locked" not in screen_text(app)

    drive(fake_session, steps)


def test_the_queue_resumes_where_the_reviewer_was(fake_session, drive):
    fake_session.place = ("SM-0030", "")

    async def steps(app, pilot):
        assert app.screen.query_one(CandidateList).chosen.name == "SM-0030"

    drive(fake_session, steps)


def test_the_first_run_is_told_what_this_is_and_later_ones_are_not(fake_session, drive, screen_text):
    async def first(app, pilot):
        assert "try to explain it away" in screen_text(app)

    async def later(app, pilot):
        assert "try to explain it away" not in screen_text(app)

    drive(fake_session, first)
    fake_session.place = ("SM-0001", "star")
    drive(fake_session, later)


def test_the_mouse_chooses_and_the_second_click_opens(fake_session, drive, settled):
    opened = []

    async def steps(app, pilot):
        app.screen.open_candidate = opened.append
        await pilot.click(CandidateList, offset=(5, 2))
        assert app.screen.query_one(CandidateList).cursor == 2 and not opened
        await pilot.click(CandidateList, offset=(5, 2))
        await settled(app, pilot)
        assert opened == ["SM-0003"]
        await pilot.click("ColumnHead", offset=(29, 0))
        await settled(app, pilot)
        assert app.screen.view.unresolved == "star"

    drive(fake_session, steps)


def test_a_million_rows_are_drawn_line_by_line(million_session, drive, screen_text, settled):
    async def steps(app, pilot):
        candidates = app.screen.query_one(CandidateList)
        assert len(candidates.ids) == 1_000_000
        for key in ("end", "up", "home", "pagedown", "end"):
            await pilot.press(key)
            await settled(app, pilot)
        assert "SM-0999999" in screen_text(app) and "1,000,000 of 1,000,000" in screen_text(app)
        assert million_session.fetched < 2000

    drive(million_session, steps)


def test_a_row_gone_from_the_queue_is_a_plain_line(fake_session, drive, screen_text, settled):
    async def steps(app, pilot):
        candidates = app.screen.query_one(CandidateList)
        candidates.fetch = lambda ids: []
        candidates.forget_rows()
        await settled(app, pilot)
        assert "gone from the queue" in screen_text(app)

    drive(fake_session, steps)
