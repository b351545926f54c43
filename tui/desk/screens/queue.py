"""The queue: what needs me, why it is odd, where it stands."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from pathlib import PurePath
from typing import TYPE_CHECKING

from textual import on, work
from textual.app import ComposeResult
from textual.containers import Horizontal, Vertical
from textual.geometry import Offset
from textual.message import Message
from textual.timer import Timer
from textual.widgets import Static

from tui.desk.keys import bindings
from tui.desk.screens.base import MovesThroughList
from tui.desk.screens.queue_background import POLL_S, POLL_THIN_S, QueueBackground
from tui.desk.summary import begun_sentence, looking_sentence, oddness_sentence, standing_sentence
from tui.desk.text import KEY_OF_CHECK, safe
from tui.desk.widgets.candidate_list import CandidateList
from tui.desk.widgets.described import Described
from tui.desk.widgets.key_line import KeyLine
from tui.desk.widgets.queue_head import ColumnHead, HeadFacts, QueueTitle
from tui.errors import TuiError

if TYPE_CHECKING:
    from textual.widgets import Input

    from tui.desk.queue_view import QueueView
    from tui.desk.screens.tally import Counted
    from tui.desk.widgets.find_line import FindLine
    from tui.model import Evidence
    from tui.workflow.records import QueueRow
    from tui.workflow.session import Session

PEEK_FROM = 165  # columns: below it the list needs them all
PEEK_LEAST = 80
LIST_MOST = 120  # columns: the widest that the list's own columns take
SETTLE_S = 0.04  # a candidate is described once the cursor has rested on it so long
LEAVING = "q again leaves; everything is kept."
SIGN_WORDS = ".todo not ruled by you   .sealed opens when you are done   * stale"


class QueueScreen(MovesThroughList, QueueBackground):
    """Every candidate, one a line."""

    PLACE = "queue"
    BINDINGS = bindings("queue")

    @dataclass
    class NextFound(Message):
        """The candidate that needs this reviewer most; None when nothing does."""

        name: str | None

    def __init__(self, session: Session) -> None:
        super().__init__(session)
        self._settle: Timer | None = None
        self._asked_to_leave = self._was_asked = False
        self._before_tally: QueueView | None = None  # what was listed, while a count of the tally is
        self._tally_place = (0, 0)  # row and count of it

    def compose(self) -> ComposeResult:
        """Head, list with the chosen candidate's data beside it, what is said of it, keys."""
        yield QueueTitle()
        with Horizontal(id="middle"):
            with Vertical(id="left"):
                yield ColumnHead()
                yield CandidateList(self.session.rows, id="list")
        yield Described(id="described")
        yield Static("", id="orientation", markup=False)
        yield Static("", id="message", markup=False)
        yield self.key_line(2)

    def on_mount(self) -> None:
        """List at once what can be listed at once; resume where the reviewer was."""
        reviewer = self.session.reviewer
        position = self.session.position() if reviewer else None
        self.orient(is_new=position is None)
        self.wanted = position[0] if position else None
        self.tell_head()
        self.list_beginning()
        self.call_after_refresh(self.order, counting=True)  # the first rows first: ordering takes the processor
        self.set_interval(POLL_THIN_S if self.app.thin else POLL_S, self.poll)
        if position and position[1]:  # cut off amid a candidate: on with it
            self.call_after_refresh(self.open_candidate, position[0])

    def orient(self, is_new: bool) -> None:
        """Three lines for who comes for the first time."""
        from tui.desk.help import ORIENTATION, READER_LINE

        line = self.query_one("#orientation", Static)
        line.update("\n".join(ORIENTATION if self.session.reviewer else (READER_LINE,)))
        line.display = is_new or self.session.reviewer is None

    # --- the chosen candidate ---

    @on(CandidateList.Chosen)
    def choose(self, message: CandidateList.Chosen) -> None:
        """Describe the candidate once the cursor rests."""
        self.tell_head()
        if self._settle is not None:
            self._settle.stop()
        self._settle = self.set_timer(SETTLE_S, lambda: self.describe(message.row))
        self.place_terminal_cursor()

    async def describe(self, row: QueueRow | None) -> None:
        """One sentence on why it is odd, one on where it stands, its data beside the list if there is room."""
        if row is None:
            self.query_one(Described).say([])
            return
        try:
            evidence = self.session.stored_evidence(row.name)
            view = self.session.view(row.name) if self.session.reviewer else None
            others = self.session.others_looking(row.name)
        except TuiError as error:
            self.say(str(error), is_error=True)
            return
        said = [(safe(f"{row.name}  {oddness_sentence(row, evidence)}"), "plain")]
        stands = [looking_sentence(others), begun_sentence(view)]
        stands += [standing_sentence(row, view)] if self.session.reviewer else []
        said += [(safe(" ".join(filter(None, stands))), "quiet")] if any(stands) else []
        self.query_one(Described).say([*said, (SIGN_WORDS, "quiet")])
        if self.has_room:
            await self.peek(row.name, evidence)

    @property
    def has_room(self) -> bool:
        """Whether the chosen candidate's data fit beside the list."""
        return self.size.width >= PEEK_FROM and not self.app.thin

    async def peek(self, name: str, evidence: Mapping[str, Evidence]) -> None:
        """Show the candidate's data beside the list."""
        from tui.desk.widgets.peek import Peek

        if not self.query(Peek):
            await self.query_one("#middle").mount(Peek(id="peek"))
        self.query_one(Peek).styles.width = max(PEEK_LEAST, self.size.width - LIST_MOST)
        try:
            self.query_one(Peek).show(self.session.candidate(name), evidence, self.session.band_info())
        except TuiError as error:
            self.say(str(error), is_error=True)

    def on_resize(self) -> None:
        """More room shows more, less takes it away."""
        for peek in self.query("#peek"):
            peek.display = self.has_room
        self.call_later(self.describe, self.query_one(CandidateList).chosen)

    def offers(self, action_id: str) -> bool | str:
        """A split is offered where there is one, `all` where not all is listed, and a reader is not offered work."""
        row = self.query_one(CandidateList).chosen if self.query("#list") else None
        return {
            "queue.split": row is not None and "split" in row.states.values(),
            "queue.all": not self.view.is_whole,
            "queue.next": self.session.reviewer is not None,
            "queue.quit": True if self.view.names is None else "to the tally",
            "queue.needs_me": self.session.reviewer is not None,
        }.get(action_id, True)

    def place_terminal_cursor(self) -> None:
        """The terminal's own cursor follows the choice, for those who read by it."""
        candidates = self.query_one(CandidateList)
        line = candidates.cursor - candidates.scroll_offset.y
        self.app.cursor_position = candidates.region.offset + Offset(0, max(0, line))

    def tell_head(self) -> None:
        """Hand the lines above the list what they show."""
        candidates, reviewer = self.query_one(CandidateList), self.session.reviewer
        facts = HeadFacts(
            queue_name=PurePath(self.session.path).name,
            handle=reviewer.handle if reviewer else "",
            saved=self.app.saved,
            view=self.view,
            counts=self.counts,
            line=candidates.cursor + 1 if candidates.ids else 0,
            listed=len(candidates.ids),
            is_ordering=self.is_ordering,
            letters=self._letters(),
        )
        self.query_one(QueueTitle).show(facts)
        self.query_one(ColumnHead).show(replace(facts, line=0, listed=0, is_ordering=False))
        self.query_one(KeyLine).renew()

    def _letters(self) -> dict[str, str]:
        """The key that filters by each check."""
        return {check: self.app.keys_of.get(f"queue.unresolved_{check}", key) for check, key in KEY_OF_CHECK.items()}

    # --- keys ---

    def action_unresolved(self, check: str) -> None:
        """Only what is unresolved in one check; again for all."""
        self.look(self.view.toggled(check))

    @on(ColumnHead.CheckClicked)
    def click_check(self, message: ColumnHead.CheckClicked) -> None:
        """The head of a column does what its key does."""
        self.action_unresolved(message.check)

    def action_needs_me(self) -> None:
        """Only what needs this reviewer; again for all."""
        if self.session.reviewer is None:
            self.say("Without a handle nothing can need you. Join first: plainlight join QUEUE HANDLE.")
            return
        self.look(replace(self.view, needs_me=not self.view.needs_me, find=""))

    def action_all(self) -> None:
        """Every candidate."""
        self.look(self.view.whole())

    def action_order(self) -> None:
        """The next order."""
        self.look(self.view.next_order())

    def action_reverse(self) -> None:
        """The order turned around."""
        self.look(replace(self.view, descending=not self.view.descending))

    def look(self, view: QueueView) -> None:
        """Wish for another view."""
        self.view = view
        if not view.find:
            self.close_find()
        self.order()

    def close_find(self) -> None:
        """Take the line to search in away, unless something is still typed there."""
        for line in self.query("FindLine").results():
            line.display = line.has_focus_within

    async def action_find(self) -> None:
        """Open the line to search in."""
        from tui.desk.widgets.find_line import FindLine

        if not self.query(FindLine):
            await self.mount(FindLine(id="find"), before="#message")
        self.query_one(FindLine).open(self.view.find)

    def on_input_changed(self, message: Input.Changed) -> None:
        """List what matches so far; typing never waits for it."""
        message.stop()
        if message.value != self.view.find:
            self.look(replace(self.view.whole(), find=message.value))

    def on_find_line_left(self, message: FindLine.Left) -> None:
        """Letters are keys again; a search given up is over."""
        self.set_focus(None)
        if message.is_given_up and self.view.find:
            self.look(self.view.whole())
        elif not self.view.find:
            self.close_find()
        self.place_terminal_cursor()

    def action_open(self) -> None:
        """Open the chosen candidate."""
        row = self.query_one(CandidateList).chosen
        if row is not None:
            self.open_candidate(row.name)

    @on(CandidateList.Opened)
    def open_clicked(self) -> None:
        """A second click opens."""
        self.action_open()

    def action_next_for_me(self) -> None:
        """The candidate that needs this reviewer most; the question may take a while on a long queue."""
        if self.session.reviewer is None:
            self.say("Without a handle nothing can need you. Join first: plainlight join QUEUE HANDLE.")
            return
        self.find_next()

    @work(thread=True, exclusive=True, group="next", exit_on_error=False)
    def find_next(self) -> None:
        """Runs in a thread: finds and claims; only posts."""
        try:
            with self.session.clone() as session:
                name = session.claim_next()
        except TuiError as error:
            self.post_message(self.Failed(str(error)))
        else:
            self.post_message(self.NextFound(name))

    @on(NextFound)
    def open_next(self, message: NextFound) -> None:
        """Open it, unless the reviewer went elsewhere meanwhile."""
        if self.app.screen is not self:
            return
        if message.name is None:
            self.say("Nothing needs you now. You may still look: t shows how far the team is.")
        else:
            self.open_candidate(message.name)

    def open_candidate(self, name: str) -> None:
        """Show one candidate; coming back, the cursor stands on the one last seen."""
        from tui.desk.screens.candidate import CandidateScreen

        self.orient(is_new=False)
        self.wanted = name
        self.app.push_screen(CandidateScreen(self.session, name, order=self.query_one(CandidateList).ids))

    def action_story(self) -> None:
        """What happened to the chosen candidate."""
        from tui.desk.screens.story import StoryScreen

        row = self.query_one(CandidateList).chosen
        if row is not None:
            self.app.push_screen(StoryScreen(self.session, row.name))

    def action_practice(self) -> None:
        """Three practice stars, their answers after each ruling."""
        from tui.desk.screens.practice import PracticeScreen

        self.app.push_screen(PracticeScreen(self.session.reviewer))

    def action_split(self) -> None:
        """Everybody's notes where the chosen candidate's rulings part."""
        row = self.query_one(CandidateList).chosen
        parted = [check for check, state in row.states.items() if state == "split"] if row else []
        if row is None or not parted:
            self.say("No split to see here: either nobody parted on it, or its seal is not yet open to you.")
            return
        from tui.desk.screens.split import SplitScreen

        self.app.push_screen(SplitScreen(self.session, row.name, parted[0]))

    def action_tally(self, row: int = 0, count: int = 0) -> None:
        """How far the team is, from a count of it."""
        from tui.desk.screens.tally import TallyScreen

        self.app.push_screen(TallyScreen(self.session, row, count), self.list_counted)

    def list_counted(self, counted: Counted | None) -> None:
        """List just the candidates that a line of the tally counts; q leads back there."""
        if counted is None:
            return
        self._before_tally, self._tally_place = self.view, counted.place
        self.look(replace(self.view.whole(), names=counted.names, counted=counted.text, unnamed=counted.unnamed))

    def action_quit(self) -> None:
        """Back to the tally whose count is listed; else leave the desk, once it is asked for twice running."""
        if self.view.names is not None:
            self.look(self._before_tally or self.view.whole())
            self.action_tally(*self._tally_place)
        elif self._was_asked or self._asked_to_leave:
            self.action_quit_now()
        else:
            self._asked_to_leave = True
            self.say(LEAVING)

    def action_quit_now(self) -> None:
        """Leave the desk."""
        self.app.exit()

    def on_key(self) -> None:
        """Any other key takes the wish to leave back."""
        self._was_asked, self._asked_to_leave = self._asked_to_leave, False
