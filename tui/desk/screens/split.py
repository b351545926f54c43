"""A split: everybody's rulings and notes on one check side by side with the numbers, and a ruling made once more."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

from textual import on, work
from textual.app import ComposeResult
from textual.message import Message
from textual.widgets import Static

from tui.desk.keys import bindings
from tui.desk.screens.base import DeskScreen
from tui.desk.screens.questions import question
from tui.desk.screens.split_rows import Split, foot_row, head_rows, split_rows
from tui.desk.text import RULING_WORDS
from tui.desk.widgets.key_line import KeyLine
from tui.desk.widgets.note import TOO_LONG, NoteEditor
from tui.desk.widgets.rows import Row
from tui.desk.widgets.rows_view import RowsView
from tui.errors import TuiError

if TYPE_CHECKING:
    from tui.model import Evidence, Ruling
    from tui.workflow.records import CandidateView
    from tui.workflow.session import Session


NO_HANDLE = "Without a handle nothing can be ruled. Join first: plainlight join QUEUE HANDLE."
STILL_SEALED = "It is still sealed to you: rule on the star's own page first."
RULING_KEYS = frozenset({"split.explains", "split.short", "split.unclear", "split.note"})


class SplitScreen(DeskScreen[None]):
    """One check of one candidate whose seal is open to the reader."""

    PLACE = "split"
    CSS_PATH = ["rows.tcss", "split.tcss"]
    BINDINGS = bindings("split")

    @dataclass
    class Recorded(Message):
        """The ruling is in the file."""

        made: Ruling

    @dataclass
    class Refused(Message):
        """The ruling was not taken."""

        text: str

    def __init__(self, session: Session, name: str, check: str) -> None:
        super().__init__()
        self.session = session
        self.candidate_name, self.check = name, check
        self.view: CandidateView | None = None
        self.evidence: Mapping[str, Evidence] = {}
        self.chosen = ""
        self.recorded = ""  # the ruling made here last
        self.is_recording = False

    def compose(self) -> ComposeResult:
        """Head, everybody's words, the note, the ruling, keys."""
        yield RowsView(self.draw_head, id="split-head")
        yield RowsView(self.draw_body, scrolls=True, id="split-body")
        yield NoteEditor(id="note")
        yield Static("", id="message", markup=False)
        yield RowsView(self.draw_foot, id="split-foot")
        yield self.key_line(1)

    def on_mount(self) -> None:
        """Read what stands."""
        self.note = self.session.draft(self.candidate_name, self.check) if self.session.reviewer else ""
        self.read()

    def read(self) -> None:
        """Read the candidate anew and draw."""
        try:
            self.view = self.session.view(self.candidate_name)
            self.evidence = self.session.stored_evidence(self.candidate_name)
        except TuiError as error:
            self.say(str(error), is_error=True)
        self.redraw()

    def redraw(self) -> None:
        """Draw all parts again."""
        self.query_one("#split-head", RowsView).rows_from(self.draw_head)
        self.query_one("#split-body", RowsView).rows_from(self.draw_body)
        self.query_one("#split-foot", RowsView).rows_from(self.draw_foot)
        self.query_one(KeyLine).renew()

    @property
    def can_rule(self) -> bool:
        """Whether the reader may rule here: with a handle, and with the seal open to them."""
        return self.session.reviewer is not None and self.view is not None and self.view.seal_open

    def offers(self, action_id: str) -> bool:
        """Ruling keys where one may rule; Enter once something is chosen."""
        if action_id == "split.record":
            return self.can_rule and bool(self.chosen) and not self.is_recording
        return self.can_rule or action_id not in RULING_KEYS

    @property
    def split(self) -> Split:
        """All that the drawing needs."""
        handle = self.session.reviewer.handle if self.session.reviewer else ""
        asked = question(self.check, self.evidence)
        return Split(self.candidate_name, self.check, handle, self.view, self.evidence, asked)

    def draw_head(self, width: int, height: int) -> list[Row]:
        """Candidate, check, question."""
        return head_rows(self.split, width)

    def draw_body(self, width: int, height: int) -> list[Row]:
        """Numbers, then each reviewer's words in a column of their own."""
        return split_rows(self.split, width)

    def draw_foot(self, width: int, height: int) -> list[Row]:
        """The ruling in one row."""
        return [foot_row(width, self.chosen, self.note, self.is_recording, self.can_rule, self.recorded)]

    # --- keys ---

    def action_up(self) -> None:
        """Scroll up."""
        self.query_one("#split-body", RowsView).scroll_rows(-1)

    def action_down(self) -> None:
        """Scroll down."""
        self.query_one("#split-body", RowsView).scroll_rows(1)

    def action_choose(self, ruling: str) -> None:
        """Choose; nothing is recorded yet."""
        if not self.can_rule:
            self.say(NO_HANDLE if self.session.reviewer is None else STILL_SEALED)
            return
        self.chosen = ruling
        self.redraw()

    def action_note(self) -> None:
        """Write the note; it is kept at every keystroke."""
        if not self.can_rule:
            self.say(NO_HANDLE if self.session.reviewer is None else STILL_SEALED)
            return
        note = self.query_one(NoteEditor)
        note.display = True
        note.open(self.note)

    @on(NoteEditor.Full)
    def say_full(self, message: NoteEditor.Full) -> None:
        """What did not fit was not taken in silently."""
        self.say(TOO_LONG.format(left_out=message.left_out))

    @on(NoteEditor.Typed)
    def keep_draft(self, message: NoteEditor.Typed) -> None:
        """Keep the note as it is typed."""
        self.note = message.text
        self.save_draft(message.text)

    @work(thread=True, exclusive=True, group="draft", exit_on_error=False)
    def save_draft(self, text: str) -> None:
        """Runs in a thread: a busy file must not hold up typing."""
        try:
            with self.session.clone() as session:
                session.save_draft(self.candidate_name, self.check, text)
        except TuiError as error:
            self.post_message(self.Refused(str(error)))

    @on(NoteEditor.Left)
    def leave_note(self) -> None:
        """Letters are keys again."""
        self.set_focus(None)
        self.query_one(NoteEditor).display = False
        self.redraw()

    def action_record(self) -> None:
        """Record what was chosen."""
        if not self.chosen:
            self.say("Choose first: e explains, f falls short, u unclear. Then Enter records.")
        elif not self.is_recording:
            self.is_recording = True
            self.redraw()
            own = self.evidence.get(self.check)
            self.record(self.chosen, self.note, own.digest if own else None)

    @work(thread=True, group="record", exit_on_error=False)
    def record(self, ruling: str, note: str, evidence_digest: str | None) -> None:
        """Runs in a thread; only posts."""
        try:
            with self.session.clone() as session:
                made = session.rule(self.candidate_name, self.check, ruling, note, evidence_digest)
        except TuiError as error:
            self.post_message(self.Refused(str(error)))
        else:
            self.post_message(self.Recorded(made))

    @on(Recorded)
    def show_recorded(self, message: Recorded) -> None:
        """It is in the file: say so, and show where the check stands now."""
        self.app.note_ruling(message.made.utc)
        self.is_recording = False
        self.chosen, self.note, self.recorded = "", "", message.made.ruling
        self.read()
        self.say(f"Recorded: {RULING_WORDS[message.made.ruling]}, with the others in view.")

    @on(Refused)
    def say_refused(self, message: Refused) -> None:
        """A quiet plain line; choice and note stay."""
        self.is_recording = False
        self.redraw()
        self.say(message.text, is_error=True)
