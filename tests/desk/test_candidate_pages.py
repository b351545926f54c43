"""The pages of dips and look-alikes: plotted, looked for when asked, and tame whatever the names are."""

from __future__ import annotations

import numpy as np
import pytest

from tests.desk.made import HOSTILE_NAMES
from tui.desk.screens.candidate import CandidateScreen
from tui.errors import StoreError
from tui.workflow.dip_curves import DipCurve
from tui.workflow.lookalikes import LookAlike, LookAlikes

FOUND = LookAlikes(
    "SM-0001", "W4", "Ks", 60, 13, 0.5, 0.01, {"magnitude": 0.01, "place": 0.4}, True,
    "13 candidates share this pattern of pulls, chance alone gives 0.5. They share magnitude too.",
    tuple(LookAlike(name, 0.95, 8.1, 9.123, "2010.5", float("nan")) for name in HOSTILE_NAMES[:12]),
)  # fmt: skip


@pytest.fixture
def opened(fake_session, drive, settled, screen_text):
    """`opened(name, keys, size) -> text` of a candidate's page."""

    def run(name, keys, size=(80, 24)):
        texts = []

        async def steps(app, pilot):
            app.push_screen(CandidateScreen(fake_session, name))
            await settled(app, pilot)
            for key in keys:
                await pilot.press(key)
                await settled(app, pilot)
            texts.append(screen_text(app))

        drive(fake_session, steps, size=size)
        return texts[0]

    return run


def test_look_alikes_are_looked_for_once_and_only_on_their_page(fake_session, opened):
    asked = []
    fake_session.look_alikes = lambda name, star=None: asked.append(name) or FOUND
    opened("SM-0001", "12")
    assert asked == []
    text = opened("SM-0001", "767", size=(120, 40))
    assert asked == ["SM-0001"]
    assert "chance alone gives 0.5" in text and "W4 pull" in text and "Ks mag" in text and "and 1 more" in text
    assert "9.12" in text and "touches no check" in " ".join(text.split())
    assert all(line.isprintable() for line in text.splitlines())


def test_trouble_with_look_alikes_is_a_plain_line(fake_session, opened):
    def fails(name, star=None):
        raise StoreError("The queue is locked.")

    fake_session.look_alikes = fails
    text = opened("SM-0001", "7")
    assert "The queue is locked." in text and "RULE" in text


def test_a_candidate_without_pulls_says_so(opened):
    assert "could not be fitted here" in opened("SM-0001", "7")


@pytest.mark.parametrize("size", [(80, 24), (200, 60)])
def test_depth_is_plotted_against_wavelength(fake_session, opened, size):
    name = next(name for name in fake_session.names if fake_session.candidate(name).dips)
    wave = np.geomspace(0.4, 2.0, 20)
    fake_session.dip_curves = lambda name: [DipCurve("one", "grey", 1.0, 1, 0.3, wave, np.full(20, 0.02))]
    text = opened(name, "5", size)
    assert "depth against wavelength" in text and "grey: one depth" in text and "micron" in text
    assert any(line.strip().startswith("2 ") for line in text.splitlines())  # the depth of 2 percent on its axis
