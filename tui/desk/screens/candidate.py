"""One candidate, one check at a time: where the data leave the model, the numbers, and the key that rules."""

from __future__ import annotations

import os
from collections.abc import Sequence
from dataclasses import replace
from pathlib import PurePath
from typing import TYPE_CHECKING

from textual import events, on
from textual.app import ComposeResult
from textual.containers import Horizontal
from textual.worker import Worker, WorkerState

from tui.desk.keys import bindings
from tui.desk.screens.base import DeskScreen
from tui.desk.screens.candidate_actions import MovesThroughPlot, ProbesByHand
from tui.desk.screens.candidate_draw import advice_height, draw_foot, draw_head, draw_numbers
from tui.desk.screens.candidate_layout import shares
from tui.desk.screens.candidate_opening import OpensCandidates
from tui.desk.screens.candidate_ruling import RecordsRulings
from tui.desk.screens.pages import LOOK_ALIKES, PAGES, page_rows
from tui.desk.screens.walk import Walk, step_check
from tui.desk.session_thread import SessionThread
from tui.desk.widgets.cutout import STRETCHES
from tui.desk.widgets.note import TOO_LONG, NoteEditor
from tui.desk.widgets.rows import Row
from tui.desk.widgets.rows_view import RowsView
from tui.desk.widgets.spectrum_plot import SpectrumPlot, braille_works
from tui.workflow.records import MAX_NOTE

if TYPE_CHECKING:
    from tui.workflow.session import Session


NOWHERE = ""  # the check of a position that was left in order
FAULT = "The evidence could not be had: something went wrong inside the program."


class CandidateScreen(OpensCandidates, RecordsRulings, MovesThroughPlot, ProbesByHand, DeskScreen[None]):
    """One candidate; evidence is computed off the interface's thread, and never drawn under another's name."""

    PLACE = "candidate"
    CSS_PATH = "candidate.tcss"
    BINDINGS = bindings("candidate")

    def __init__(self, session: Session, name: str, order: Sequence[int] | Sequence[str] | None = None) -> None:
        """Open a candidate.

        Args:
            session: the reader's own; only its clones are used in threads.
            name: of the candidate.
            order: ids or names in the order in which the queue lists them; without it the queue decides what is next.
        """
        super().__init__()
        self.session = session
        self.order = order
        self.walk = Walk(name)
        self.skipped: set[str] = set()
        self.before: list[str] = []
        self.reads = SessionThread(session, "evidence")
        self.writes = SessionThread(session, "rulings")
        self.alikes = SessionThread(session, "look-alikes")
        self._ready_at = float("inf")  # keys older than the page they would hit are dropped
        self._draft_of: tuple[str, str] | None = None

    # --- life ---

    def compose(self) -> ComposeResult:
        """Checks and question, plot and numbers (or a further page), note, ruling and keys."""
        yield RowsView(lambda width, height: draw_head(self.walk, width, height, self._right()), id="walk-head")
        with Horizontal(id="walk-middle"):
            yield SpectrumPlot(unicode=braille_works(os.environ), id="walk-plot")
            yield RowsView(lambda width, height: draw_numbers(self.walk, width, height), id="walk-numbers")
        yield RowsView(
            lambda width, height: page_rows(self.walk, width, height) if self.walk.page else [],
            scrolls=True,
            id="walk-page",
        )
        yield NoteEditor(id="walk-note")
        yield RowsView(self._foot, id="walk-foot")

    def on_mount(self) -> None:
        """Open at the check where the reviewer was, else at the first one still to rule."""
        self.session.on_wait(self.heard_waiting)
        position = self.session.position() if self.session.reviewer else None
        self.open(self.walk.name, position[1] if position and position[0] == self.walk.name else "")

    def on_unmount(self) -> None:
        """Finish what is being written; leave what is being read."""
        self.reads.close(finish=False)
        self.alikes.close(finish=False)
        self.writes.close(finish=True)

    def heard_waiting(self, sentence: str) -> None:
        """Called in a thread that waits for another program: say so instead of nothing."""
        self.app.call_later(self.say, f"{sentence}.")

    def on_resize(self, event: events.Resize) -> None:
        """Share the terminal anew, once there is something to share it among."""
        if self.query("#walk-foot"):
            self.lay_out(event.size.width, event.size.height)

    def lay_out(self, width: int, height: int) -> None:
        """Give every part its rows and columns."""
        writing = self._draft_of is not None
        advice = 0 if writing else advice_height(self.walk, width)
        share = shares(width, height, self.walk.plot_only, advice, self.walk.is_lesson and bool(self.walk.message))
        self.query_one("#walk-head").styles.height = share.head
        self.query_one("#walk-foot").styles.height = share.foot
        self.query_one("#walk-numbers").styles.width = max(share.side, 1)
        self.set_class(self.walk.plot_only, "-plot-only")
        self.set_class(self.walk.page > 0, "-page")
        self.set_class(writing, "-writing")

    def on_key(self, event: events.Key) -> None:
        """Keys typed before this page was drawn were meant for the one before: drop them."""
        if event.time < self._ready_at:
            event.stop()
            event.prevent_default()
        elif self._draft_of is None and (self.walk.message or self.walk.recorded):
            self.walk.message, self.walk.recorded = "", ()
            self.draw_foot()

    def on_worker_state_changed(self, event: Worker.StateChanged) -> None:
        """What nobody foresaw does not end the round: keys count again, and nothing is thought to be recorded.

        That it happened is said by the desk's guard.
        """
        if event.state is WorkerState.ERROR:
            self.walk.recording = False
            self.walk.trouble = self.walk.trouble or ("" if self.walk.evidence else FAULT)
            self.draw()
            self.be_ready()

    # --- drawing ---

    def draw(self) -> None:
        """Everything, from the state of the walk."""
        plot = self.walk.redrawn()
        self.lay_out(*self.size)
        self.query_one("#walk-plot", SpectrumPlot).show(plot, self.walk.plot_view)
        for part in ("#walk-head", "#walk-numbers", "#walk-page", "#walk-foot"):
            self.query_one(part, RowsView).redraw()

    def draw_view(self) -> None:
        """Another part of the plot, or another point of it: the numbers stay."""
        self.query_one("#walk-plot", SpectrumPlot).show(self.walk.drawn, self.walk.plot_view)
        self.draw_foot()

    def draw_foot(self) -> None:
        """The last lines only, with as many rows as they need now."""
        self.lay_out(*self.size)
        self.query_one("#walk-foot", RowsView).redraw()

    def say(self, text: str, *, is_error: bool = False) -> None:
        """A quiet plain line in place of the advice; it goes with the next key."""
        self.walk.message = text
        self.draw_foot()

    def _foot(self, width: int, height: int) -> list[Row]:
        scrolls = self.walk.page > 0 and self.query_one("#walk-page", RowsView).has_more
        is_writing = self._draft_of is not None
        return draw_foot(self.walk, width, height, self.app.keys_of, self.session, is_writing, scrolls)

    def _right(self) -> tuple[str, ...]:
        """Queue, reader and the last ruling recorded, at less and less length."""
        reviewer = self.session.reviewer
        you = f"you: {reviewer.handle}" if reviewer else "reading"
        saved = f"  saved {self.app.saved}" if self.app.saved else ""
        return f"{PurePath(self.session.path).name}  {you}{saved}", f"{you}{saved}", you

    # --- checks and pages ---

    def action_check(self, check: str) -> None:
        """Turn to a check, or compare with it when that was asked."""
        walk = self.walk
        if walk.asking_compare:
            walk.asking_compare = False
            walk.compared = "" if check == walk.check else check
            if walk.compared:
                self.show_curve(walk, check, 0)
        else:
            walk.go(check)
            walk.page = 0 if walk.page and check != walk.check else walk.page
            self.keep_place()
            self.show_curve(walk, check, 0)
        self.draw()

    def action_next_check(self) -> None:
        """The next check; by hand, the next number."""
        if self.walk.hand is not None:
            self.next_param(1)
        else:
            self.action_check(step_check(self.walk.check, 1))

    def action_previous_check(self) -> None:
        """The check before."""
        if self.walk.hand is not None:
            self.next_param(-1)
        else:
            self.action_check(step_check(self.walk.check, -1))

    def action_views(self) -> None:
        """The next further page; after the last the plot."""
        self.action_page((self.walk.page + 1) % (len(PAGES) + 1))

    def action_views_back(self) -> None:
        """The page before."""
        self.action_page((self.walk.page - 1) % (len(PAGES) + 1))

    def action_page(self, number: int) -> None:
        """One page by its number; 0 is the plot."""
        self.walk.page = number if 0 <= number <= len(PAGES) else 0
        self.walk.hand, self.walk.asking_compare = None, False
        if self.walk.page == LOOK_ALIKES:
            self.look_for_alikes()
        self.query_one("#walk-page", RowsView).to_top()
        self.draw()
        self.call_after_refresh(self.draw_foot)  # whether the page scrolls is known once it has its place

    def action_stretch(self) -> None:
        """The pictures' next stretch: faint, middle, bright."""
        self.walk.stretch = (self.walk.stretch + 1) % len(STRETCHES)
        self.draw()

    def action_swap(self) -> None:
        """Other bands' pictures first: two of them under one eye, in turn."""
        self.walk.first_cutout = (self.walk.first_cutout + 1) % max(1, len(self.walk.cutouts))
        self.draw()

    def action_split(self) -> None:
        """Everybody's notes on this check side by side, where its rulings part; then here again, as things stand."""
        if not self.walk.is_split:
            self.say("The rulings on this check are not split, as far as you may see.")
            return
        from tui.desk.screens.split import SplitScreen

        name, check = self.walk.name, self.walk.check
        self.app.push_screen(SplitScreen(self.session, name, check), lambda _: self.open(name, check))

    def action_back(self) -> None:
        """Out of a mode, a page or the large plot; else to the queue."""
        walk = self.walk
        if walk.asking_compare or walk.hand is not None:
            walk.asking_compare, walk.hand = False, None
        elif walk.page or walk.plot_only:
            walk.page, walk.plot_only = 0, False
        else:
            self.leave()
            return
        self.draw()

    def leave(self) -> None:
        """Back to the queue; somebody else may look at this candidate."""
        name = self.walk.name
        if self.session.reviewer is not None:
            self.write(lambda s: (s.release(name), s.save_position(name, NOWHERE)))  # who is cut off comes back here
        self.dismiss(None)

    # --- notes ---

    def action_note(self) -> None:
        """Write the note of this check."""
        if self.session.reviewer is None or self.session.read_only or self.walk.loaded is None:
            self.say(self.cannot_rule())
            return
        self._draft_of = (self.walk.name, self.walk.check)
        self.lay_out(*self.size)
        self.query_one(NoteEditor).open(self.walk.note)
        self.draw_foot()

    @on(SpectrumPlot.PointPicked)
    def pick_point(self, message: SpectrumPlot.PointPicked) -> None:
        """The mouse puts the cursor on a point."""
        self.walk.plot_view = replace(self.walk.plot_view, cursor=message.index)
        self.draw_view()

    @on(SpectrumPlot.Zoomed)
    def zoom_by_wheel(self, message: SpectrumPlot.Zoomed) -> None:
        """The wheel zooms."""
        self.action_zoom(message.direction)

    @on(NoteEditor.Typed)
    def keep_draft(self, message: NoteEditor.Typed) -> None:
        """Kept at every keystroke, in order, under the check it was begun on."""
        if self._draft_of is None:
            return
        name, check = self._draft_of
        self.walk.notes[check] = message.text
        if self.walk.message and len(message.text) < MAX_NOTE:
            self.say("")
        self.write(lambda s: s.save_draft(name, check, message.text))

    @on(NoteEditor.Full)
    def say_full(self, message: NoteEditor.Full) -> None:
        """What did not fit was not taken in silently."""
        self.say(TOO_LONG.format(left_out=message.left_out))

    @on(NoteEditor.Left)
    def leave_note(self) -> None:
        """Letters are keys again."""
        if self._draft_of is not None:
            self._draft_of = None
            self.walk.message = ""
            self.set_focus(None)
            self.lay_out(*self.size)
            self.draw_foot()
