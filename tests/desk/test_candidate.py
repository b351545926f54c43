"""One candidate on the screen: walking, ruling, notes, pages, by keys alone."""

from __future__ import annotations

import threading

import pytest

from tui.desk.screens.candidate import CandidateScreen
from tui.errors import StoreError
from tui.model import CHECKS

NAME = "SM-0001"


@pytest.fixture(autouse=True)
def any_terminal(monkeypatch):
    """A terminal that can draw braille, whatever the tests run in."""
    monkeypatch.delenv("LC_ALL", raising=False)
    monkeypatch.setenv("LC_CTYPE", "C.UTF-8")
    monkeypatch.setenv("TERM", "xterm-256color")


@pytest.fixture
def on_candidate(drive, settled):
    """Run steps on a candidate's page: `on_candidate(session, steps, name=..., keys=...)`."""

    def run(session, steps, name=NAME, order=None, **options):
        async def whole(app, pilot):
            screen = CandidateScreen(session, name, order)
            app.push_screen(screen)
            await settled(app, pilot)

            async def press(*keys):
                for key in keys:
                    await pilot.press(key)
                    await settled(app, pilot)

            await steps(app, screen, press)

        drive(session, whole, **options)

    return run


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
        assert "Recorded: star falls short." in screen_text(app)

    on_candidate(fake_session, steps)


def test_enter_alone_records_nothing(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        await press("enter")
        assert fake_session.log == [] and "Choose first" in screen_text(app)
        await press("e", "e", "enter")
        assert fake_session.log == []

    on_candidate(fake_session, steps)


def test_whole_walk_ends_at_the_next_candidate(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        for _ in CHECKS:
            await press("f", "enter")
        assert [made.check for made in fake_session.log] == list(CHECKS)
        assert screen.walk.name == "SM-0002" and screen.walk.check == "star"
        assert "You are done with SM-0001" in screen_text(app)
        await press("z")
        assert screen.walk.name == NAME

    on_candidate(fake_session, steps)


def test_explains_ends_the_walk_at_once(fake_session, on_candidate):
    async def steps(app, screen, press):
        await press("d", "e", "enter")
        assert [made.check for made in fake_session.log] == ["dust"]
        assert screen.walk.name == "SM-0002"

    on_candidate(fake_session, steps)


def test_order_of_the_list_decides_what_is_next(fake_session, on_candidate):
    ids = fake_session.order("name")

    async def steps(app, screen, press):
        await press("e", "enter")
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
        assert "no ruling of yours to take back" in screen_text(app)
        await press("f", "enter", "s", "w")
        assert "> take back <" in screen_text(app)
        await press("enter")
        assert [made.ruling for made in fake_session.log] == ["short", "withdrawn"]
        assert screen.walk.check == "star"

    on_candidate(fake_session, steps)


def test_nodata_can_only_be_unclear(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        await press("x", "e")
        assert "No data test this check" in screen_text(app) and screen.walk.chosen == ""
        await press("u", "enter")
        assert fake_session.log[-1].ruling == "unclear"

    on_candidate(fake_session, steps, name="SM-0004")


def test_stale_ruling_is_told_and_reaffirmed_by_one_key(fake_session, on_candidate, screen_text):
    fake_session.rule("SM-0006", "blend", "short", "weak")

    async def steps(app, screen, press):
        await press("b")
        text = screen_text(app)
        assert "<short*" in text and "measured anew" in text and "r it stands" in text
        await press("r")
        assert (fake_session.log[-1].ruling, fake_session.log[-1].note) == ("short", "weak")

    on_candidate(fake_session, steps, name="SM-0006")


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


def test_resumes_at_candidate_check_and_draft(fake_session, on_candidate):
    fake_session.place = (NAME, "blend")
    fake_session.save_draft(NAME, "blend", "half a thought")

    async def steps(app, screen, press):
        assert (screen.walk.check, screen.walk.note) == ("blend", "half a thought")
        assert fake_session.claims == {NAME}
        await press("q")
        assert fake_session.claims == set() and fake_session.place == (NAME, "blend")

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


def test_late_evidence_never_shows_under_another_name(fake_session, on_candidate, monkeypatch):
    gate, plain = threading.Event(), fake_session.evidence

    def slow(name, kinds=None):
        if name == "SM-0002":
            gate.wait(20)
        return plain(name)

    monkeypatch.setattr(fake_session, "evidence", slow)

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
    gate, plain = threading.Event(), fake_session.evidence

    def slow(name, kinds=None):
        if name == "SM-0002":
            gate.wait(20)
        return plain(name)

    monkeypatch.setattr(fake_session, "evidence", slow)

    async def steps(app, screen, press):
        screen.open("SM-0002")
        screen.walk.loaded = None
        screen.action_choose("explains")
        screen.action_record()
        assert screen.walk.chosen == "" and fake_session.log == []
        gate.set()

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


def test_arrows_tell_the_point_in_words_and_zoom_follows(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        await press("left")
        assert "POINT" in screen_text(app) and "W4 22.1 micron" in screen_text(app)
        await press("plus", "plus")
        assert "zoomed" in screen_text(app)
        await press("left", "left", "left", "left")
        assert "Ks 2.16 micron" in screen_text(app)
        await press("0")
        assert "zoomed" not in screen_text(app)

    on_candidate(fake_session, steps)


def test_by_hand_holds_numbers_drops_bands_and_resets(fake_session, on_candidate, screen_text, monkeypatch):
    asked, plain = [], fake_session.probe
    monkeypatch.setattr(fake_session, "probe", lambda *a: asked.append(a[1:]) or plain(*a))

    async def steps(app, screen, press):
        await press("d", "h", "up")
        assert list(asked[-1][1]) == ["teff"] and asked[-1][1]["teff"] > 5612.3
        assert "by hand" in screen_text(app) and "as fitted" in screen_text(app)
        await press("tab", "tab", "down", "left", "space")
        check, fixed, dropped = asked[-1]
        assert check == "dust" and fixed["dust_temperature"] < 310 and dropped == {"W4"}
        assert "dropped: W4" in screen_text(app)
        await press("0")
        assert screen.walk.hand.fit is None and not screen.walk.hand.touched
        await press("h")
        assert screen.walk.hand is None and fake_session.log == []

    on_candidate(fake_session, steps)


def test_compare_draws_the_other_check_until_taken_away(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        await press("d", "c")
        assert "draw that check's best fit too" in screen_text(app)
        await press("b")
        assert screen.walk.check == "dust" and screen.walk.compared == "blend"
        assert "blend" in screen_text(app).split("RULE")[0].split("F_nu")[1]
        await press("c")
        assert screen.walk.compared == ""

    on_candidate(fake_session, steps)


def test_up_and_down_draw_the_other_fits(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        await press("b")
        assert "bound pair  fit 1 of 2" in screen_text(app)
        await press("down")
        assert "free pair  fit 2 of 2" in screen_text(app)

    on_candidate(fake_session, steps)


def test_pages_go_round_and_q_leads_back_to_the_plot(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        for title in (
            "facts",
            "measured",
            "all fits",
            "mixture",
            "dips",
            "pictures",
            "look-alikes",
            "rulings",
            "story",
        ):
            await press("v")
            assert title in screen_text(app)
        await press("v")
        assert "F_nu" in screen_text(app)
        await press("9", "q")
        assert "F_nu" in screen_text(app) and app.screen is screen
        await press("q")
        assert app.screen is not screen

    on_candidate(fake_session, steps)


def test_others_stay_sealed_until_done(fake_session, on_candidate, screen_text):
    from tui.workflow.records import RulingLine

    line = RulingLine(
        "x", "dust", "plover", "r-plover", "explains", "a secret note", "2026-03-01T10:00:00Z", False, True, ""
    )
    fake_session.other = {NAME: [line], "SM-0003": [line]}

    async def steps(app, screen, press):
        await press("8")
        assert "Sealed until you have been done" in screen_text(app)
        for page in "0123456789":
            await press(page)
            assert "secret" not in screen_text(app) and "plover" not in screen_text(app)
        screen.open("SM-0003")
        await press("8", "8")
        assert "a secret note" in screen_text(app)

    on_candidate(fake_session, steps)


def test_plot_alone_takes_the_whole_width(fake_session, on_candidate, screen_text):
    async def steps(app, screen, press):
        await press("p")
        assert "chi2" not in screen_text(app)
        assert screen.query_one("#walk-plot").size.width == 80
        await press("p")
        assert "chi2" in screen_text(app)

    on_candidate(fake_session, steps)


def test_changed_evidence_asks_once_before_anything_is_recorded(fake_session, on_candidate, screen_text, monkeypatch):
    from tests.desk.conftest import make_evidence

    async def steps(app, screen, press):
        await press("f")
        monkeypatch.setattr(fake_session, "stored_evidence", lambda name: make_evidence(30))
        await press("enter")
        assert fake_session.log == [] and "changed while you looked" in screen_text(app)
        assert screen.walk.own_evidence.digest == "star-30"
        await press("f", "enter")
        assert [made.evidence_digest for made in fake_session.log] == ["star-30"]

    on_candidate(fake_session, steps)


def test_unforeseen_failure_in_the_background_is_a_quiet_line(fake_session, on_candidate, screen_text, monkeypatch):
    def break_down(name, kinds=None):
        raise ZeroDivisionError("float division by zero")

    monkeypatch.setattr(fake_session, "evidence", break_down)

    async def steps(app, screen, press):
        text = screen_text(app)
        assert "Something went wrong inside the program" in text and "ZeroDivisionError" in text
        await press("q")
        assert app.screen is not screen

    on_candidate(fake_session, steps)


def test_pasted_note_keeps_its_lines_and_steers_nothing(fake_session, on_candidate, screen_text):
    from textual import events

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


def test_very_long_note_is_cut_not_refused(fake_session, on_candidate):
    from textual import events

    async def steps(app, screen, press):
        await press("a")
        app.post_message(events.Paste("x" * 9000))
        await press("right", "tab")
        assert len(fake_session.drafts[NAME, "star"]) == 4000

    on_candidate(fake_session, steps)
