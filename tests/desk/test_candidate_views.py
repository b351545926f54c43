"""Moving through the plot, by hand, comparing, other fits and the further pages, by keys alone."""

from __future__ import annotations

from dataclasses import replace

import pytest

from tui.workflow.records import RulingLine

NAME = "SM-0001"
pytestmark = pytest.mark.usefixtures("any_terminal")


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
        check, fixed, dropped, _ = asked[-1]
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
        for title in ("facts", "bands", "fits", "mixture", "dips", "pictures", "alike", "rulings", "story"):
            await press("v")
            assert f" {title}]" in screen_text(app)
        await press("v")
        assert "F_nu" in screen_text(app)
        await press("9", "q")
        assert "F_nu" in screen_text(app) and app.screen is screen
        await press("q")
        assert app.screen is not screen

    on_candidate(fake_session, steps)


def test_others_stay_sealed_until_done(fake_session, on_candidate, screen_text):
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


def test_by_hand_begins_from_the_fit_that_is_drawn_with_the_bands_that_it_did_without(
    fake_session, on_candidate, screen_text, monkeypatch
):
    asked, plain, stored = [], fake_session.probe, fake_session.stored_evidence
    monkeypatch.setattr(fake_session, "probe", lambda *a: asked.append(a[1:]) or plain(*a))

    def without_w3(name):
        made = stored(name)
        fit = made["instrument"].fits[0]
        pulls = {band: pull for band, pull in fit.pulls.items() if band != "W3"}
        made["instrument"] = replace(made["instrument"], fits=(replace(fit, pulls=pulls),))
        return made

    monkeypatch.setattr(fake_session, "stored_evidence", without_w3)

    async def steps(app, screen, press):
        await press("i", "h")
        assert "dropped: W3" in screen_text(app) and "all as fitted" not in screen_text(app)
        await press("up")
        assert asked[-1][0] == "instrument" and asked[-1][2] == {"W3"}
        await press("0")
        assert not screen.walk.hand.touched and screen.walk.hand.dropped == {"W3"}

    on_candidate(fake_session, steps)


def test_by_hand_holds_the_model_on_view_and_never_sets_another_beside_it_as_the_same(
    fake_session, on_candidate, screen_text, monkeypatch
):
    asked, plain = [], fake_session.probe
    monkeypatch.setattr(fake_session, "probe", lambda *a: asked.append(a) or plain(*a))

    async def steps(app, screen, press):
        await press("b", "down", "h", "up")
        text = screen_text(app)
        assert asked[-1][-1] == "free pair" and "by hand: free pair" in text and "as fitted" in text
        monkeypatch.setattr(fake_session, "probe", lambda *a: plain(*a[:-1], "bound pair"))
        await press("up")
        text = screen_text(app)
        assert "by hand: bound pair" in text and text.count("as fitted") == 1 and "free pair" in text

    on_candidate(fake_session, steps)


def test_a_curve_compared_with_has_a_mark_of_its_own_and_a_page_ends_the_asking(
    fake_session, on_candidate, screen_text
):
    async def steps(app, screen, press):
        await press("d", "c", "b")
        head = screen_text(app).split("\n")[3]
        assert "+ blend" in head
        await press("c", "c", "v", "b")
        assert screen.walk.check == "blend" and not screen.walk.compared

    on_candidate(fake_session, steps)
