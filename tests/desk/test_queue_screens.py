"""Story, split and tally, on the queue in memory and on one on disk."""

from __future__ import annotations

import re

import pytest

from tui.desk.screens.split import SplitScreen
from tui.desk.screens.tally import TallyScreen
from tui.desk.widgets.candidate_list import CandidateList
from tui.errors import StoreError
from tui.workflow.session import Session

SIZES = [(80, 24), (120, 40), (200, 60)]


def timeless(text: str) -> str:
    """Text without the times at which the test ran."""
    return re.sub(r"\d\d:\d\d UTC", "00:00 UTC", re.sub(r"20\d\d-\d\d-\d\d( \d\d:\d\d)?", "2026-01-01", text))


@pytest.mark.parametrize("size", SIZES, ids=str)
def test_the_story_looks_so(fake_session, drive, screen_text, snapshot, settled, size):
    async def steps(app, pilot):
        await pilot.press("y")
        await settled(app, pilot)
        snapshot(f"story-{size[0]}x{size[1]}", screen_text(app))

    drive(fake_session, steps, size=size)


@pytest.mark.parametrize("size", SIZES, ids=str)
def test_a_split_looks_so(fake_session, drive, screen_text, snapshot, settled, size):
    async def steps(app, pilot):
        await pilot.press("down", "down", "v", "f")
        await settled(app, pilot)
        snapshot(f"split-{size[0]}x{size[1]}", screen_text(app))

    drive(fake_session, steps, size=size)


def test_a_split_is_ruled_again_with_a_note_and_the_first_ruling_stays(fake_session, drive, screen_text, settled):
    async def steps(app, pilot):
        await pilot.press("down", "down", "v", "a", *"K is plain", "enter", *"too", "tab", "e")
        await settled(app, pilot)
        assert fake_session.drafts["SM-0003", "blend"] == "K is plain\ntoo"
        assert "> explains <" in screen_text(app) and "K is plain / too" in screen_text(app)
        await pilot.press("enter")
        await settled(app, pilot)
        made = fake_session.log[-1]
        assert (made.check, made.ruling, made.note, made.seen_others) == ("blend", "explains", "K is plain\ntoo", True)
        assert made.evidence_digest == "blend-2"
        assert "Recorded: explains, with the others in view." in screen_text(app)
        assert "choose once more" not in screen_text(app) and "explains, recorded: nothing more is" in screen_text(app)
        assert app.saved == "05:06 UTC"

    drive(fake_session, steps)


def test_enter_without_a_choice_records_nothing(fake_session, drive, screen_text, settled):
    async def steps(app, pilot):
        await pilot.press("down", "down", "v", "enter")
        await settled(app, pilot)
        assert not fake_session.log and "Choose first" in screen_text(app)

    drive(fake_session, steps)


def test_a_refused_ruling_keeps_choice_and_note(fake_session, drive, screen_text, settled):
    async def steps(app, pilot):
        await pilot.press("down", "down", "v", "a", "w", "h", "y", "tab", "f")
        await settled(app, pilot)
        fake_session.fail = StoreError("The disk is full [/].")
        await pilot.press("enter")
        await settled(app, pilot)
        assert "The disk is full [/]." in screen_text(app) and "> falls short <" in screen_text(app)
        assert "note: why" in screen_text(app)

    drive(fake_session, steps)


def test_a_split_under_seal_shows_nobody_elses_words(fake_session, drive, screen_text, settled):
    fake_session.other["SM-0001"] = fake_session.other["SM-0003"] = []

    async def steps(app, pilot):
        await app.push_screen(SplitScreen(fake_session, "SM-0001", "blend"))
        await settled(app, pilot)
        text = screen_text(app)
        assert "Sealed: what others ruled here opens for you once you are done" in text
        assert "curlew" not in text and "nothing can be ruled here by you" in text

    drive(fake_session, steps)


def test_no_split_to_see_is_said(fake_session, drive, screen_text):
    async def steps(app, pilot):
        await pilot.press("v")
        await pilot.pause()
        assert "No split to see here" in screen_text(app)

    drive(fake_session, steps)


@pytest.mark.parametrize("size", SIZES, ids=str)
def test_the_tally_looks_so(disk_session, drive, screen_text, snapshot, settled, size):
    async def steps(app, pilot):
        await pilot.press("t")
        await settled(app, pilot)
        snapshot(f"tally-{size[0]}x{size[1]}", timeless(screen_text(app)))

    drive(disk_session, steps, size=size)


def test_a_count_of_the_tally_lists_its_candidates_in_the_queue(disk_session, drive, screen_text, settled):
    async def steps(app, pilot):
        await pilot.press("t")
        await settled(app, pilot)
        line = app.screen.tally.settled
        await pilot.press("enter")
        await settled(app, pilot)
        assert line.count > len(line.names) > 0 and line.unnamed > 0
        listed = {row.name for row in disk_session.rows(app.screen.query_one(CandidateList).ids)}
        assert listed == set(line.names) and f"showing {line.text}" in screen_text(app)
        await pilot.press("0")
        await settled(app, pilot)
        assert len(app.screen.query_one(CandidateList).ids) == 40

    drive(disk_session, steps)


def test_the_tally_names_nobody_still_sealed_to_the_reader(disk_session, drive, screen_text, settled):
    async def steps(app, pilot):
        await pilot.press("t")
        await settled(app, pilot)
        shown = screen_text(app)
        for row in disk_session.rows(disk_session.order()):
            if not row.seal_open:
                assert row.name not in shown
                assert all(row.name not in line.names for line in app.screen.tally.lines())

    drive(disk_session, steps, size=(200, 90))


def test_arrows_walk_the_counts_of_the_table(disk_session, drive, screen_text, settled):
    async def steps(app, pilot):
        await pilot.press("t")
        await settled(app, pilot)
        await pilot.press("down", "right", "right")
        assert re.search(r"> +star .*\[\d+\]", screen_text(app))
        await pilot.press("down", "down", "down", "enter")
        await settled(app, pilot)
        assert "split: blend" in screen_text(app)

    drive(disk_session, steps)


def test_the_reviewers_page_ranks_nobody(disk_session, drive, screen_text, settled):
    async def steps(app, pilot):
        await pilot.press("t", "r")
        await settled(app, pilot)
        text = screen_text(app)
        assert text.index("curlew") < text.index("heron") < text.index("plover") and "no ranking" in text
        await pilot.press("r")
        await settled(app, pilot)
        assert "1 IS IT DONE" in screen_text(app)

    drive(disk_session, steps)


@pytest.mark.parametrize("key", ["escape", "tab"])
def test_a_file_need_not_be_named(disk_session, drive, screen_text, settled, tmp_path, monkeypatch, key):
    monkeypatch.chdir(tmp_path)

    async def steps(app, pilot):
        await pilot.press("t")
        await settled(app, pilot)
        await pilot.press("w", "q")
        await settled(app, pilot)
        assert "Enter writes the file; Esc or Tab: nothing is written" in screen_text(app)
        await pilot.press(key)
        await settled(app, pilot)
        assert isinstance(app.screen, TallyScreen) and "Nothing was written." in screen_text(app)
        await pilot.press("q")
        await settled(app, pilot)
        assert not isinstance(app.screen, TallyScreen)

    drive(disk_session, steps)
    assert not list(tmp_path.glob("*vetted*"))


def test_a_file_that_exists_is_replaced_only_when_asked_twice(disk_session, drive, screen_text, settled, tmp_path):
    old = tmp_path / "old.csv"
    old.write_text("precious", encoding="utf-8")

    async def steps(app, pilot):
        await pilot.press("t")
        await settled(app, pilot)
        await pilot.press("w")
        app.screen.query_one("FileInput").value = str(old)
        await pilot.press("enter")
        await settled(app, pilot)
        assert "old.csv exists already: Enter again replaces it, or type" in " ".join(screen_text(app).split())
        assert old.read_text(encoding="utf-8") == "precious"
        await pilot.press("enter")
        await settled(app, pilot)
        assert "Wrote 40 candidates" in screen_text(app)

    drive(disk_session, steps, size=(200, 40))
    assert "SM-0001" in old.read_text(encoding="utf-8")


def test_q_leads_from_a_count_and_from_the_reviewers_back_to_the_tally(disk_session, drive, screen_text, settled):
    async def steps(app, pilot):
        await pilot.press("x", "t")
        await settled(app, pilot)
        await pilot.press("down", "right", "enter")
        await settled(app, pilot)
        assert "q to the tally" in screen_text(app)
        await pilot.press("q")
        await settled(app, pilot)
        assert isinstance(app.screen, TallyScreen) and re.search(r"> +star .*\[\d+\]", screen_text(app))
        await pilot.press("r", "q")
        await settled(app, pilot)
        assert isinstance(app.screen, TallyScreen) and "1 IS IT DONE" in screen_text(app)
        await pilot.press("q")
        await settled(app, pilot)
        assert app.screen.view.names is None and app.screen.view.unresolved == "extinction"

    drive(disk_session, steps)


def test_a_count_that_is_listed_accounts_for_those_still_sealed(disk_session, drive, screen_text, settled):
    async def steps(app, pilot):
        await pilot.press("t")
        await settled(app, pilot)
        line = app.screen.tally.settled
        await pilot.press("enter")
        await settled(app, pilot)
        assert f"showing {line.text} ({line.unnamed} sealed)  1 of {line.count - line.unnamed}" in screen_text(app)

    drive(disk_session, steps)


def test_the_tally_is_read_to_its_end_by_screens(disk_session, drive, screen_text, settled):
    async def steps(app, pilot):
        await pilot.press("t")
        await settled(app, pilot)
        assert "PgDn page down" in screen_text(app) and "PgUp" not in screen_text(app)
        for back, key in (("pageup", "pagedown"), ("home", "end")):
            await pilot.press(key, key)
            await settled(app, pilot)
            text = screen_text(app)
            assert "4 WHAT IT MEANS" in text and "PgUp page up" in text and "PgDn" not in text
            await pilot.press(back, back)
            await settled(app, pilot)
            assert "1 IS IT DONE" in screen_text(app)

    drive(disk_session, steps)


def test_the_vetted_list_is_written_from_the_tally(disk_session, drive, screen_text, settled, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)

    async def steps(app, pilot):
        await pilot.press("t")
        await settled(app, pilot)
        await pilot.press("w")
        entry = app.screen.query_one("FileInput")
        assert "past your seal" in screen_text(app) and entry.value == "saltmarsh-vetted.ecsv"
        assert entry.size.width >= 78 and f"{tmp_path.name[-20:]}\n" in screen_text(app)
        entry.value = str(tmp_path / "out.csv")
        await pilot.press("enter")
        await settled(app, pilot)
        assert isinstance(app.screen, TallyScreen) and "Wrote 40 candidates" in screen_text(app)
        assert (tmp_path / "out.csv").read_text(encoding="utf-8").count("SM-0001") == 1

    drive(disk_session, steps)


def test_two_people_are_brought_different_candidates(disk_session, drive, settled):
    opened = []

    async def steps(app, pilot):
        app.screen.open_candidate = opened.append
        await pilot.press("m")
        await settled(app, pilot)

    drive(disk_session, steps)
    with Session.open(disk_session.path, "plover") as other:
        drive(other, steps)
    assert len(opened) == 2 and opened[0] != opened[1]
