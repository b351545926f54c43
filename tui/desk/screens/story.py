"""What happened to a candidate, in time order, as far as the reader may know."""

from __future__ import annotations

from typing import TYPE_CHECKING

from textual.app import ComposeResult
from textual.widgets import Static

from tui.desk.keys import bindings
from tui.desk.screens.base import DeskScreen
from tui.desk.text import safe
from tui.desk.widgets.pick_rows import PickRow, PickRows
from tui.desk.widgets.rows import row
from tui.desk.widgets.story_rows import NEW, story_rows
from tui.errors import TuiError

if TYPE_CHECKING:
    from tui.workflow.records import StoryLine
    from tui.workflow.session import Session


class StoryScreen(DeskScreen[None]):
    """One line or more for each thing that happened."""

    PLACE = "story"
    CSS_PATH = "rows.tcss"
    BINDINGS = bindings("story")

    def __init__(self, session: Session, name: str) -> None:
        super().__init__()
        self.session = session
        self.candidate_name = name
        self.happened: list[StoryLine] = []

    def compose(self) -> ComposeResult:
        """Title, what happened, keys."""
        yield Static(f" {safe(self.candidate_name)}   STORY, times in UTC", id="title", markup=False)
        yield PickRows(self.make_rows, id="rows")
        yield Static("", id="message", markup=False)
        yield self.key_line(1)

    def on_mount(self) -> None:
        """Read it; a candidate has tens of lines at most."""
        try:
            self.happened = self.session.story(self.candidate_name)
        except TuiError as error:
            self.say(str(error), is_error=True)
        self.query_one(PickRows).renew()

    def make_rows(self, width: int) -> list[PickRow]:
        """The story for a width."""
        rows: list[PickRow] = [PickRow()]
        has_marked = False
        for line in self.happened:
            if line.since_mine and not has_marked:
                has_marked = True
                rows += [PickRow(), PickRow(row((f" {NEW} since you last ruled on it", "head")))]
            rows += [PickRow(spans) for spans in story_rows(line, width)]
        if not self.happened:
            rows.append(PickRow(row((" Nothing is told of it.", "quiet"))))
        return rows

    def action_up(self) -> None:
        """Scroll up."""
        self.query_one(PickRows).scroll_rows(-1)

    def action_down(self) -> None:
        """Scroll down."""
        self.query_one(PickRows).scroll_rows(1)

    def action_page_up(self) -> None:
        """One screen up."""
        rows = self.query_one(PickRows)
        rows.scroll_rows(1 - rows.size.height)

    def action_page_down(self) -> None:
        """One screen down."""
        rows = self.query_one(PickRows)
        rows.scroll_rows(rows.size.height - 1)

    def action_first(self) -> None:
        """To the beginning."""
        self.query_one(PickRows).to_top()

    def action_last(self) -> None:
        """To the end."""
        self.query_one(PickRows).scroll_rows(1_000_000)
