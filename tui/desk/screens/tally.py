"""The tally: how far the team is, whether it can be trusted, what is left, what it means; names under the seal."""

from __future__ import annotations

import os
from dataclasses import dataclass
from pathlib import PurePath
from typing import TYPE_CHECKING, NamedTuple

from textual import on, work
from textual.app import ComposeResult
from textual.message import Message
from textual.widgets import Input, Static

from tui.desk.keys import bindings
from tui.desk.screens.base import DeskScreen
from tui.desk.screens.tally_rows import Choice, chosen_line, reviewer_rows, tally_rows, title_row
from tui.desk.text import safe
from tui.desk.widgets.file_line import FileLine
from tui.desk.widgets.key_line import KeyLine
from tui.desk.widgets.pick_rows import ALL, PickRow, PickRows
from tui.desk.widgets.rows import Row, row
from tui.desk.widgets.rows_view import RowsView
from tui.errors import TuiError

if TYPE_CHECKING:
    from tui.workflow.session import Session
    from tui.workflow.tally_record import Tally

PAST_SEALS = (
    "The vetted list is the team's: it holds everyone's rulings and every outcome, past your seal. "
    "Endings: .ecsv .fits .vot .csv"
)


class Counted(NamedTuple):
    """What a line of the tally counts, to be listed in the queue, and where in the tally that line stands."""

    names: frozenset[str]
    text: str
    unnamed: int  # counted, but sealed to the reader
    place: tuple[int, int]  # row, count


class TallyScreen(DeskScreen[Counted | None]):
    """Dismissed with the names that a line counts, to be listed in the queue."""

    PLACE = "tally"
    CSS_PATH = "rows.tcss"
    BINDINGS = bindings("tally")

    @dataclass
    class Made(Message):
        """The tally is ready."""

        tally: Tally

    @dataclass
    class Said(Message):
        """Something in the background ended, well or not."""

        text: str
        is_error: bool = False

    def __init__(self, session: Session, row: int = 0, count: int = 0) -> None:
        """Begin where a count stands.

        Args:
            row: of all that is shown; the nearest that counts something is chosen.
            count: of that row.
        """
        super().__init__()
        self.session = session
        self.tally: Tally | None = None
        self.first_row, self.column = row, count
        self.shows_reviewers = False
        self.may_replace = ""  # the file that Enter replaces, once that was asked

    def compose(self) -> ComposeResult:
        """Title, the tally, where to write, keys."""
        yield RowsView(self.draw_title, id="title")
        yield PickRows(self.make_rows, id="rows")
        yield FileLine(id="file")
        yield Static("", id="message", markup=False)
        yield self.key_line(1)

    def on_mount(self) -> None:
        """Count in the background."""
        self.count()

    @work(thread=True, exclusive=True, group="tally", exit_on_error=False)
    def count(self) -> None:
        """Runs in a thread; only posts."""
        try:
            with self.session.clone() as session:
                self.post_message(self.Made(session.tally()))
        except TuiError as error:
            self.post_message(self.Said(str(error), is_error=True))

    @on(Made)
    def show_tally(self, message: Made) -> None:
        """Show it."""
        self.tally = message.tally
        self.redraw()
        self.query_one(PickRows).choose_nearest(self.first_row)
        self.redraw()

    def redraw(self) -> None:
        """Draw all again."""
        self.query_one("#title", RowsView).rows_from(self.draw_title)
        self.query_one(PickRows).renew()
        self.call_after_refresh(self.query_one(KeyLine).renew)

    def draw_title(self, width: int, height: int) -> list[Row]:
        """The first line."""
        return [title_row(PurePath(self.session.path).name, self.tally, width)]

    def make_rows(self, width: int) -> list[PickRow]:
        """The tally, or what each reviewer has done."""
        if self.tally is None:
            return [PickRow(), PickRow(row((" counting ...", "quiet")))]
        if self.shows_reviewers:
            return reviewer_rows(self.tally, width)
        return tally_rows(self.tally, width, Choice(self.query_one("#rows", PickRows).line, self.column))

    def offers(self, action_id: str) -> bool | str:
        """Enter where a count is chosen; the reviewers once they are counted, and from them the tally."""
        if action_id == "tally.list":
            return not self.shows_reviewers and self.cells > 0
        if action_id in ("tally.reviewers", "leave.back") and self.shows_reviewers:
            return "the tally"
        above, below = self.query_one(PickRows).has_above_below if self.query(PickRows) else (False, False)
        if action_id in ("tally.page_up", "tally.first"):
            return above
        if action_id in ("tally.page_down", "tally.last"):
            return below
        return self.tally is not None or action_id != "tally.reviewers"

    # --- keys ---

    def action_up(self) -> None:
        """The line above."""
        self.query_one(PickRows).move(-1)
        self.query_one(PickRows).renew()

    def action_down(self) -> None:
        """The line below."""
        self.query_one(PickRows).move(1)
        self.query_one(PickRows).renew()

    def action_page_up(self) -> None:
        """One screen up."""
        self.query_one(PickRows).turn(-1)
        self.redraw()

    def action_page_down(self) -> None:
        """One screen down."""
        self.query_one(PickRows).turn(1)
        self.redraw()

    def action_first(self) -> None:
        """To the beginning."""
        self.query_one(PickRows).turn(-ALL)
        self.redraw()

    def action_last(self) -> None:
        """To the end."""
        self.query_one(PickRows).turn(ALL)
        self.redraw()

    def action_back(self) -> None:
        """From the reviewers to the tally, from the tally to where one came from."""
        if self.shows_reviewers:
            self.action_reviewers()
        else:
            self.dismiss(None)

    def action_left(self) -> None:
        """The count to the left."""
        self.column = max(0, min(self.column, self.cells - 1) - 1)
        self.query_one(PickRows).renew()

    def action_right(self) -> None:
        """The count to the right."""
        self.column = max(0, min(self.cells - 1, self.column + 1))
        self.query_one(PickRows).renew()

    @property
    def cells(self) -> int:
        """Counts on the chosen row."""
        targets = [rows.target for rows in self.query(PickRows)]
        return len(targets[0]) if targets and isinstance(targets[0], tuple) else 0

    @on(PickRows.Picked)
    def action_list(self) -> None:
        """List what the chosen line counts."""
        line = chosen_line(self.query_one(PickRows).target, self.column)
        if line is None:
            return
        if line.names:
            place = (self.query_one(PickRows).line, self.column)
            self.dismiss(Counted(frozenset(line.names), line.text, line.unnamed, place))
        elif line.unnamed:
            self.say(f"{line.text}: all of them are still sealed to you and not named.")
        else:
            self.say("It counts no candidate.")

    def action_reviewers(self) -> None:
        """What each reviewer has done; again for the tally."""
        self.shows_reviewers = not self.shows_reviewers
        self.query_one(PickRows).to_top()
        self.redraw()

    def action_write_out(self) -> None:
        """Ask where to."""
        self.say(PAST_SEALS)
        self.may_replace = ""
        stem = PurePath(self.session.path).stem
        self.query_one(FileLine).open(f"{stem}-vetted.ecsv")

    @on(Input.Changed)
    def keep_quiet(self, message: Input.Changed) -> None:
        """Typing a file's name does nothing yet."""
        message.stop()

    @on(FileLine.Left)
    def leave_file(self) -> None:
        """Write nothing."""
        self.set_focus(None)
        self.query_one(FileLine).display = False
        self.say("Nothing was written.")

    @on(FileLine.Named)
    def write(self, message: FileLine.Named) -> None:
        """Write to the file that was named; where there is one of that name, once more is asked for."""
        if message.path != self.may_replace and os.path.exists(message.path):
            self.may_replace = message.path
            self.say(f"{message.path} exists already: Enter again replaces it, or type another name.")
            return
        self.set_focus(None)
        self.query_one(FileLine).display = False
        self.say(f"Writing {message.path} ...")
        self.export(message.path, message.path == self.may_replace)

    @work(thread=True, exclusive=True, group="export", exit_on_error=False)
    def export(self, out: str, may_replace: bool) -> None:
        """Runs in a thread; only posts."""
        from tui.workflow.exporting import export

        try:
            self.post_message(self.Said(export(self.session.path, out, force=may_replace).sentence()))
        except (TuiError, OSError) as error:
            self.post_message(self.Said(str(error), is_error=True))

    @on(Said)
    def say_said(self, message: Said) -> None:
        """A quiet plain line."""
        self.say(safe(message.text), is_error=message.is_error)
