"""Styles that are looked up when first drawn."""

from __future__ import annotations

from rich.color import Color

from tui.desk.widgets.candidate_list import CandidateList


def colour_of(app, name: str) -> Color:
    """A colour of the theme that is on, as the terminal gets it."""
    return Color.parse(app.current_theme.variables[name].lower())


def test_a_style_is_looked_up_when_drawn_and_anew_when_the_colours_change(fake_session, drive, settled):
    async def steps(app, pilot):
        candidates = app.screen.query_one(CandidateList)
        drawn = set(candidates._component_styles)
        assert "candidate-list--name" in drawn and "candidate-list--unexplained" not in drawn
        seen = []
        for _ in range(2):
            seen.append(candidates._style("short", False).color)
            assert seen[-1] == colour_of(app, "state-short")
            await pilot.press("T")
            await settled(app, pilot)
        assert seen[0] != seen[1]

    drive(fake_session, steps)
