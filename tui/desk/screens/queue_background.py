"""The queue's work behind the keys: ordering in a thread, counting, watching what others write."""

from __future__ import annotations

from array import array
from dataclasses import dataclass
from time import monotonic
from typing import TYPE_CHECKING

from textual import on, work
from textual.message import Message
from textual.worker import get_current_worker

from tui.desk.queue_order import beginning, line_of, ordered
from tui.desk.queue_view import QueueView
from tui.desk.screens.base import DeskScreen
from tui.desk.widgets.candidate_list import CandidateList
from tui.errors import TuiError

if TYPE_CHECKING:
    from tui.workflow.session import Session

POLL_S = 1.0  # how often to ask whether others wrote; the question takes microseconds
POLL_THIN_S = 4.0
REST = 4.0  # others' writing orders the list anew at most so often, in units of what ordering takes


class QueueBackground(DeskScreen[None]):
    """Keeps a candidate list in the order wished for, without ever holding up a key."""

    @dataclass
    class Ordered(Message):
        """The list for a view is ready."""

        view: QueueView
        ids: array[int]
        is_whole: bool  # False: the beginning of it, shown while the rest is ordered

    @dataclass
    class Counted(Message):
        """How many candidates each filter shows."""

        counts: dict[str, int]

    @dataclass
    class Failed(Message):
        """Work in the background came to nothing."""

        text: str

    def __init__(self, session: Session) -> None:
        super().__init__()
        self.session = session
        self.view = QueueView()
        self.counts: dict[str, int] = {}
        self.is_ordering = False
        self.ordering_s = 0.0
        self._asked_at = 0.0
        self._listed: QueueView | None = None
        self._version = session.data_version()
        self._refreshed_at = 0.0
        self._was_left = False
        self._counts_due = True
        self.wanted: str | None = None  # name to choose when the next list arrives

    def orient(self, is_new: bool) -> None:
        """Whether the reader has yet to be told what this is."""

    def tell_head(self) -> None:
        """The lines above the list have something new to show."""

    def order(self, counting: bool = False) -> None:
        """Make the list for the view that is wished for now; `counting`: what each filter shows may differ too."""
        self._counts_due = self._counts_due or counting  # until they come: a newer wish may take this one's place
        self.is_ordering = True
        self._asked_at = monotonic()
        self.tell_head()
        if self.view != self._listed:
            self.list_beginning()
        self.make_order(self.view, self._counts_due)

    def list_beginning(self) -> None:
        """Show the first lines while a long queue is ordered; a millisecond's work."""
        try:
            ids = beginning(self.session, self.view)
        except TuiError:
            return  # the thread meets the same fault and says so
        if ids:
            self.query_one(CandidateList).show(ids, line_of(ids, self._kept_id(), 0))

    @work(thread=True, exclusive=True, group="order", exit_on_error=False)
    def make_order(self, view: QueueView, counting: bool) -> None:
        """Runs in a thread, on a connection of its own; only posts. A newer wish ends it, in the midst of a search."""
        worker = get_current_worker()

        def is_wanted() -> bool:
            return not worker.is_cancelled

        try:
            with self.session.clone() as session, session.while_wanted(is_wanted):
                for ids, is_whole in ordered(session, view, is_wanted):
                    if worker.is_cancelled:
                        return
                    self.post_message(self.Ordered(view, ids, is_whole))
                if counting:
                    self.post_message(self.Counted(session.counts()))
        except TuiError as error:
            if is_wanted():  # else it is the search that was given up
                self.post_message(self.Failed(str(error)))

    @on(Ordered)
    def list_order(self, message: Ordered) -> None:
        """Show the list, the cursor on the candidate it was on."""
        if message.view != self.view:
            return
        candidates = self.query_one(CandidateList)
        otherwise = candidates.cursor if message.view == self._listed else 0
        line = 0 if message.view.find else line_of(message.ids, self._kept_id(), otherwise)
        candidates.show(message.ids, line, self.view.empty_words())
        self._listed = message.view
        self.is_ordering = not message.is_whole
        if message.is_whole:
            self.wanted = None
            self.ordering_s = monotonic() - self._asked_at
        self.tell_head()

    def _kept_id(self) -> int | None:
        """The candidate that the cursor should stand on."""
        chosen = self.query_one(CandidateList).chosen
        if self.wanted is not None:
            try:
                return self.session.id_of(self.wanted)
            except TuiError:
                self.wanted = None  # gone from the queue since
        return chosen.id if chosen else None

    @on(Counted)
    def show_counts(self, message: Counted) -> None:
        """The counts beside the filters."""
        self.counts = message.counts
        self._counts_due = False
        self.tell_head()
        if message.counts.get("mine"):
            self.orient(is_new=False)

    @on(Failed)
    def say_failed(self, message: Failed) -> None:
        """A quiet plain line."""
        self.is_ordering = False
        self.tell_head()
        self.say(message.text, is_error=True)

    def poll(self) -> None:
        """Others may have written: read the lines in sight anew, then the order."""
        if self.app.screen is not self or self.is_ordering:
            return
        try:
            version = self.session.data_version()
        except TuiError as error:
            self.say(str(error), is_error=True)
            return
        if version != self._version and monotonic() - self._refreshed_at > REST * self.ordering_s:
            self._version = version
            self.refresh_all()

    def refresh_all(self) -> None:
        """What is in the queue may have changed."""
        self._refreshed_at = monotonic()
        self.query_one(CandidateList).forget_rows()
        self.order(counting=True)

    def on_screen_resume(self) -> None:
        """Back from a candidate: what was ruled there shows here."""
        if self._was_left:
            self._was_left = False
            self.refresh_all()
            self.say(self.app.break_line())

    def on_screen_suspend(self) -> None:
        """Another screen lies over this one."""
        self._was_left = True
