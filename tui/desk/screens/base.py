"""What every screen of the desk shares: its keys, its key line, a quiet line for messages, help, back."""

from __future__ import annotations

from typing import TYPE_CHECKING, ClassVar, TypeVar

from textual import events
from textual.content import Content
from textual.screen import Screen
from textual.widgets import Static

from tui.desk.keys import PLACES
from tui.desk.text import safe
from tui.desk.widgets.candidate_list import CandidateList
from tui.desk.widgets.key_line import KeyLine

if TYPE_CHECKING:
    from tui.desk.app import Desk

Result = TypeVar("Result")


class DeskScreen(Screen[Result]):
    """A screen of one place; `PLACE` names its table of keys."""

    PLACE: ClassVar[str] = ""
    AUTO_FOCUS = ""  # none: a focused widget would swallow letters
    app: Desk

    def key_line(self, lines: int = 1) -> KeyLine:
        """The line that shows this place's keys as they are bound now."""
        return KeyLine(PLACES[self.PLACE], self.app.keys_of, lines, self.offers)

    def offers(self, action_id: str) -> bool | str:
        """Whether a key does something as things stand, or what it does then; the key line shows no other."""
        return True

    def say(self, text: str, *, is_error: bool = False) -> None:
        """A quiet plain line; it goes with the next key."""
        line = self.query_one("#message", Static)
        line.update(Content(safe(text)))
        line.set_class(is_error, "error")
        line.display = bool(text)

    def on_key(self, event: events.Key) -> None:
        """Any key takes the last message away."""
        for line in self.query("#message").results(Static):
            line.display = False

    def action_help(self) -> None:
        """The keys of this place, each with its reason."""
        from tui.desk.screens.help import HelpScreen

        self.app.push_screen(HelpScreen(self.PLACE), self.do)

    async def do(self, action: str | None) -> None:
        """Do what was chosen in the help."""
        if action:
            await self.run_action(action)

    def action_back(self) -> None:
        """To where one came from."""
        self.dismiss(None)

    def action_next_theme(self) -> None:
        """The next set of colours."""
        self.say(self.app.next_theme())


class MovesThroughList:
    """The keys that move through a screen's candidate list."""

    def action_up(self) -> None:
        """One line up."""
        self.query_one(CandidateList).move(-1)

    def action_down(self) -> None:
        """One line down."""
        self.query_one(CandidateList).move(1)

    def action_page_up(self) -> None:
        """One screen up."""
        candidates = self.query_one(CandidateList)
        candidates.move(-candidates.page)

    def action_page_down(self) -> None:
        """One screen down."""
        candidates = self.query_one(CandidateList)
        candidates.move(candidates.page)

    def action_first(self) -> None:
        """To the first line."""
        self.query_one(CandidateList).choose(0)

    def action_last(self) -> None:
        """To the last line."""
        candidates = self.query_one(CandidateList)
        candidates.choose(len(candidates.ids) - 1)
