"""The practice stars by keys: the answer after each ruling, what it was at the end, and nothing written anywhere."""

from __future__ import annotations

import asyncio
import dataclasses

import pytest

from tests.desk.conftest import settle, text_of
from tests.desk.made import make_evidence
from tui.desk.help import WORDS
from tui.desk.practice_desk import PracticeDesk
from tui.desk.screens.practice import PracticeScreen
from tui.desk.text import KEY_OF_CHECK, RULING_MEANINGS
from tui.model import CHECKS


@pytest.fixture(autouse=True)
def quick_evidence(monkeypatch):
    """Hand-made evidence: what the checks compute is tested elsewhere."""

    def made(star):
        return {kind: dataclasses.replace(one, facts={}) for kind, one in make_evidence(1).items()}

    monkeypatch.setattr("tui.workflow.practice_session.practice_evidence", made)
    monkeypatch.setattr("tui.workflow.practice_session.PracticeSession.curve", lambda *rest: None)


def in_practice(steps, size=(80, 24)):
    async def whole():
        app = PracticeDesk()
        async with app.run_test(size=size) as pilot:
            await settle(app, pilot)
            await steps(app, pilot)

    asyncio.run(whole())


async def press(app, pilot, *keys):
    for key in keys:
        await pilot.press(key)
        await settle(app, pilot)


def words(app) -> str:
    """The screen's text without its line ends, since answers are folded."""
    return " ".join(text_of(app).split())


def test_the_answer_follows_each_ruling_in_full():
    async def steps(app, pilot):
        practice, name = app.screen.practice, app.screen.walk.name
        assert "PRACTICE, 1 of 3" in words(app) and "Nothing is kept" in words(app)
        answers = practice.star(name).answers
        for check in CHECKS:
            if practice.view(name).done:
                break
            assert answers[check].why not in words(app)
            await press(app, pilot, {"explains": "e", "short": "f", "unclear": "u"}[answers[check].ruling], "enter")
            assert answers[check].why in words(app) and "So rules a practised eye too" in words(app)
            assert practice.view(name).done or "LOOK AT" in words(app)
        assert practice.star(name).told in words(app) and "m: the next practice star" in words(app)
        await press(app, pilot, "m")
        assert "PRACTICE, 2 of 3" in words(app) and app.saved == ""

    in_practice(steps)


def test_another_ruling_is_told_the_practised_one_and_both_stand_on_the_page_of_rulings():
    async def steps(app, pilot):
        name = app.screen.walk.name
        answer = app.screen.practice.answer(name, "star")
        await press(app, pilot, "u", "enter")
        assert "A practised eye rules: falls short" in words(app)
        await press(app, pilot, "8")
        assert answer.why in words(app) and "unclear you" in words(app)

    in_practice(steps, size=(120, 40))


def test_it_is_left_to_where_it_was_opened_from(fake_session, drive, settled):
    async def steps(app, pilot):
        below = app.screen
        app.push_screen(PracticeScreen(fake_session.reviewer))
        await settled(app, pilot)
        assert "you: heron" in text_of(app)
        await press(app, pilot, "f", "enter", "q")
        assert app.screen is below and fake_session.log == [] and fake_session.claims == set()

    drive(fake_session, steps)


def test_alone_it_ends_with_q():
    async def steps(app, pilot):
        await press(app, pilot, "q")
        assert not app.is_running or app._exit

    in_practice(steps)


def test_where_a_check_fits_and_yet_falls_short_the_answer_says_what_that_means_as_help_does():
    async def steps(app, pilot):
        adequate = [check for check, one in app.screen.walk.evidence.items() if one.adequate and check in CHECKS]
        check = next(one for one in adequate if app.screen.practice.answer(app.screen.walk.name, one).ruling == "short")
        await press(app, pilot, KEY_OF_CHECK[check], "f", "enter")
        assert f"It fits, yet falls short: {RULING_MEANINGS['short']}" in words(app)
        assert dict(WORDS)["<short"] == RULING_MEANINGS["short"]

    in_practice(steps, size=(120, 40))
