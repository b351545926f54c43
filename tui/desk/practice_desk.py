"""A desk that holds nothing but the practice stars, for whoever has no queue yet."""

from __future__ import annotations

from collections.abc import Mapping

from textual.screen import Screen

from tui.desk.app import Desk


class PracticeDesk(Desk):
    """The desk with the practice stars where the queue would lie."""

    CSS_PATH = ["desk.tcss", "screens/candidate.tcss"]  # the first screen's style, as the desk has the queue's

    def __init__(self, *, thin: bool = False, theme: str | None = None, keys: Mapping[str, str] | None = None) -> None:
        from tui.workflow.practice_session import PracticeSession

        super().__init__(PracticeSession(), thin=thin, theme=theme, keys=keys)

    def get_default_screen(self) -> Screen[None]:
        """The first practice star."""
        from tui.desk.screens.practice import PracticeScreen

        return PracticeScreen()
