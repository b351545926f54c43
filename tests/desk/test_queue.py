"""The queue's screen, driven by keys."""

from __future__ import annotations

from tui.desk.widgets.candidate_list import CandidateList


def test_first_screen_lists_every_candidate_most_odd_first(fake_session, drive, screen_text):
    async def steps(app, pilot):
        print(screen_text(app))
        text = screen_text(app)
        assert "> SM-0001" in text
        assert "60" in text

    drive(fake_session, steps)
