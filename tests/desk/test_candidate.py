"""One candidate on the screen: walking, ruling and going on to the next, by keys alone."""

from __future__ import annotations

from threading import Thread

import pytest
from textual.pilot import Pilot

from tests.desk.made import make_evidence
from tui.desk.screens.candidate import CandidateScreen
from tui.desk.screens.split import SplitScreen
from tui.errors import StoreError
from tui.model import CHECKS

NAME = "SM-0001"
pytestmark = pytest.mark.usefixtures("any_terminal")


def test_page_shows_question_plot_numbers_and_keys(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        text = screen_text(app)
        for words in (
            "SM-0001",
            "[STAR .todo]",
            "Is it a plain star",
            "F_nu",
            "micron",
            "chi2",
            "T star K",
            "LOOK AT",
            "RULE",
            "e explains",
            "? help",
        ):
            assert words in text

    on_candidate(fake_session, steps)


def test_letter_chooses_and_enter_records_and_goes_on(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        await press("f")
        assert fake_session.log == []
        assert "> falls short <" in screen_text(app)
        await press("enter")
        (made,) = fake_session.log
        assert (made.candidate, made.check, made.ruling) == (NAME, "star", "short")
        assert made.evidence_digest == "star-0"
        assert screen.walk.check == "instrument" and screen.walk.chosen == ""
        text = screen_text(app)
        assert "Recorded: star falls short" in text and "LOOK AT" in text, "what to read stays in its place"
        await press("right")
        assert "Recorded" not in screen_text(app)

    on_candidate(fake_session, steps)


def test_enter_alone_records_nothing(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        await press("enter")
        assert fake_session.log == [] and "Choose first" in screen_text(app)

    on_candidate(fake_session, steps)


def test_a_letter_that_bounces_keeps_the_choice_and_another_changes_it(fake_session, on_candidate):
    async def steps(app, screen, press):
        await press("e", "e")
        assert screen.walk.chosen == "explains"
        await press("f", "enter")
        assert [made.ruling for made in fake_session.log] == ["short"]

    on_candidate(fake_session, steps)


def test_whole_walk_ends_on_the_star_itself_at_what_was_ruled(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        for _ in CHECKS:
            await press("f", "enter")
        assert [made.check for made in fake_session.log] == list(CHECKS)
        text = " ".join(screen_text(app).split())
        assert screen.walk.name == NAME and "[8 rulings]" in text and "rulings of others" in text
        assert f"You are done with {NAME}; the seal is open" in text and "m: next star, a: add a note" in text
        for key in ("enter", "f", "f"):  # a steady rhythm rules on nothing that was not looked at
            await press(key)
        assert screen.walk.name == NAME and len(fake_session.log) == len(CHECKS)
        assert "others in view" in screen_text(app)
        await press("m")
        assert screen.walk.name == "SM-0002" and screen.walk.check == "star"
        await press("z")
        assert screen.walk.name == NAME

    on_candidate(fake_session, steps)


def test_enter_on_a_finished_star_says_how_to_go_on(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        await press("e", "enter", "enter")
        assert len(fake_session.log) == 1 and "Done. m: next star, a: add a note." in screen_text(app)
        await press("p")
        assert "m next star" in screen_text(app)

    on_candidate(fake_session, steps)


def test_a_note_after_the_end_goes_to_the_same_star_with_the_ruling_once_more(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        await press("d", "e", "enter", "a", "w", "h", "y", "tab")
        assert screen.walk.name == NAME and "r it stands" in screen_text(app)
        await press("r", "enter")
        assert [(one.candidate, one.check, one.ruling, one.note) for one in fake_session.log] == [
            (NAME, "dust", "explains", ""), (NAME, "dust", "explains", "why")]  # fmt: skip

    on_candidate(fake_session, steps)


def test_explains_ends_the_walk_at_once(fake_session, on_candidate):
    async def steps(app, screen, press):
        await press("d", "e", "enter")
        assert [made.check for made in fake_session.log] == ["dust"]
        assert screen.walk.name == NAME and screen.walk.is_done
        await press("m")
        assert screen.walk.name == "SM-0002"

    on_candidate(fake_session, steps)


def test_order_of_the_list_decides_what_is_next(fake_session, on_candidate):
    ids = fake_session.order("name")

    async def steps(app, screen, press):
        await press("e", "enter", "m")
        place = list(ids).index(fake_session.id_of(NAME))
        wanted = next(row.name for row in fake_session.rows(ids[place + 1 :]) if row.needs_me)
        assert screen.walk.name == wanted

    on_candidate(fake_session, steps, order=ids)


def test_later_skips_for_good_and_says_when_nothing_is_left(fake_session, on_candidate, screen_text):
    fake_session.names = fake_session.names[:2]

    async def steps(app, screen, press):
        await press("l")
        assert screen.walk.name == "SM-0002"
        assert list(fake_session.later) == [NAME]
        await press("l")
        assert screen.walk.name == "SM-0002" and "Nothing else needs you" in screen_text(app)

    on_candidate(fake_session, steps)


def test_withdraw_takes_two_keys(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        await press("w")
        assert "no ruling of yours to withdraw" in screen_text(app)
        await press("f", "enter", "s", "w")
        assert "> withdraw <" in screen_text(app)
        await press("enter")
        assert [made.ruling for made in fake_session.log] == ["short", "withdrawn"]
        assert screen.walk.check == "star" and "Withdrawn: your ruling on star" in screen_text(app)

    on_candidate(fake_session, steps)


def test_nodata_can_only_be_unclear(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        await press("x", "e")
        assert "No data test this check" in screen_text(app) and screen.walk.chosen == ""
        await press("f", "enter")
        assert "only u (unclear) can be ruled here" in screen_text(app) and fake_session.log == []
        await press("u", "enter")
        assert fake_session.log[-1].ruling == "unclear"

    on_candidate(fake_session, steps, name="SM-0004")


def test_stale_ruling_is_told_and_chosen_anew_by_one_key(fake_session, on_candidate, screen_text):
    fake_session.rule("SM-0006", "blend", "short", "weak")

    async def steps(app, screen, press):
        await press("b")
        text = screen_text(app)
        assert "<short*" in text and "measured anew" in text and "r it stands" in text and "u unclear" in text
        await press("r")
        assert len(fake_session.log) == 1 and "> falls short <" in screen_text(app)
        await press("enter")
        assert (fake_session.log[-1].ruling, fake_session.log[-1].note) == ("short", "weak")

    on_candidate(fake_session, steps, name="SM-0006")


def test_resumes_at_candidate_check_and_draft(fake_session, on_candidate):
    fake_session.place = (NAME, "blend")
    fake_session.save_draft(NAME, "blend", "half a thought")

    async def steps(app, screen, press):
        assert (screen.walk.check, screen.walk.note) == ("blend", "half a thought")
        assert fake_session.claims == {NAME}
        await press("q")
        assert fake_session.claims == set() and fake_session.place == (NAME, "")

    on_candidate(fake_session, steps)


def test_reader_without_handle_rules_nothing(reader_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        await press("e", "enter", "a", "l")
        assert reader_session.log == [] and screen.walk.name == NAME
        assert "without a handle" in screen_text(app)

    on_candidate(reader_session, steps)


def test_refused_ruling_is_a_quiet_line_and_the_choice_stays(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        fake_session.fail = StoreError("The queue file is full [/]: free some space and rule again.")
        await press("f", "enter")
        assert "The queue file is full [/]" in screen_text(app)
        fake_session.fail = None
        await press("enter")
        assert [made.ruling for made in fake_session.log] == ["short"]

    on_candidate(fake_session, steps)


def test_keys_typed_before_the_page_was_drawn_are_dropped(fake_session, drive, settled):
    async def steps(app, pilot):
        screen = CandidateScreen(fake_session, NAME)
        app.push_screen(screen)
        await settled(app, pilot)
        for key in ("f", "enter", "e", "enter", "e", "enter"):  # as fast as a held key: no pause in between
            app.simulate_key(key)
        await settled(app, pilot)
        assert [(made.check, made.ruling) for made in fake_session.log] == [("star", "short")]
        assert screen.walk.chosen == ""

    drive(fake_session, steps)


def test_changed_evidence_asks_once_before_anything_is_recorded(fake_session, on_candidate, screen_text, monkeypatch):
    async def steps(app, screen, press):
        await press("f")
        monkeypatch.setattr(fake_session, "stored_evidence", lambda name: make_evidence(30))
        await press("enter")
        assert fake_session.log == [] and "changed while you looked" in screen_text(app)
        assert screen.walk.own_evidence.digest == "star-30"
        await press("f", "enter")
        assert [made.evidence_digest for made in fake_session.log] == ["star-30"]

    on_candidate(fake_session, steps)


def test_a_ruling_made_on_another_screen_is_told_before_a_second_one_takes_its_place(
    fake_session, on_candidate, screen_text
):
    async def steps(app, screen, press):
        fake_session.rule(NAME, "star", "unclear", "made elsewhere")
        await press("f", "enter")
        assert len(fake_session.log) == 1
        assert "ruled this unclear at 05:06 UTC on another screen" in " ".join(screen_text(app).split())
        assert screen.walk.chosen == "short" and screen.walk.check == "star"
        await press("enter")
        assert [made.ruling for made in fake_session.log] == ["unclear", "short"]

    on_candidate(fake_session, steps)


def test_a_queue_that_may_only_be_read_says_so_and_takes_nothing(fake_session, on_candidate, screen_text):
    fake_session.read_only = True

    async def steps(app, screen, press):
        assert "read only: nothing can be ruled or kept" in screen_text(app) and "chi2" in screen_text(app)
        for key in ("f", "a", "l", "w"):
            await press(key)
            assert "The queue is read only" in screen_text(app) and screen.walk.name == NAME
        await press("enter")
        assert fake_session.log == [] and fake_session.drafts == {}

    on_candidate(fake_session, steps)


def test_a_wait_for_another_program_is_said(fake_session, on_candidate, screen_text, settled):
    async def steps(app, screen, press):
        Thread(target=fake_session.hook, args=("Another program holds the queue",)).start()
        while not screen.walk.message:
            await settled(app, Pilot(app))
        assert "Another program holds the queue." in screen_text(app)

    on_candidate(fake_session, steps)


def test_a_split_check_leads_to_everybodys_notes_and_back(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        await press("b")
        assert "N shows all notes side by side" in " ".join(screen_text(app).split())
        await press("N")
        assert isinstance(app.screen, SplitScreen)
        await press("q")
        assert app.screen is screen and screen.walk.check == "blend"
        await press("s", "N")
        assert app.screen is screen and "are not split" in screen_text(app)

    on_candidate(fake_session, steps, name="SM-0003")


def test_who_was_cut_off_comes_back_to_candidate_check_and_draft_and_who_left_to_the_queue(
    fake_session, drive, settled, screen_text
):
    fake_session.place = (NAME, "blend")
    fake_session.save_draft(NAME, "dust", "half a thought")

    async def cut_off(app, pilot):
        assert isinstance(app.screen, CandidateScreen) and "[BLEND .todo]" in screen_text(app)
        assert 'wdust".todo' in screen_text(app), "a note begun elsewhere is announced"
        await pilot.press("q")
        await settled(app, pilot)
        assert not isinstance(app.screen, CandidateScreen)

    async def left(app, pilot):
        assert not isinstance(app.screen, CandidateScreen)

    drive(fake_session, cut_off)
    drive(fake_session, left)
