"""Opening a candidate: what was measured and ruled, then evidence and curves, off the interface's thread."""

from __future__ import annotations

from collections.abc import Callable
from time import monotonic
from typing import TYPE_CHECKING, Any

from textual import work

from tui.desk.screens.pages import LOOK_ALIKES
from tui.desk.screens.walk import Loaded, Walk, first_check
from tui.desk.widgets.rows_view import RowsView
from tui.errors import TuiError
from tui.model import CHECKS

if TYPE_CHECKING:
    from tui.desk.screens.candidate import CandidateScreen
    from tui.workflow.session import Session

NONE = "There is no evidence on this check: q leads back; plainlight assess QUEUE computes it."


class OpensCandidates:
    """The part of the candidate's screen that fills a walk; a walk that was left takes nothing."""

    def open(self: CandidateScreen, name: str, check: str = "", keep_message: bool = False) -> None:
        """Turn to a candidate: nothing of the one before stays but what was said of it."""
        old = self.walk
        self.leave_note()
        self._ready_at = float("inf")
        message = old.message if old.name != name or keep_message else ""
        self.walk = Walk(
            name, check or CHECKS[0], message=message, plot_view=old.plot_view.fresh(), plot_only=old.plot_only
        )
        self.draw()
        self.load(self.walk, check)

    @work(exclusive=True, group="open", exit_on_error=False)
    async def load(self: CandidateScreen, walk: Walk, check: str) -> None:
        """Read what is measured and ruled, then compute what lacks; a page that was left takes nothing."""
        name = walk.name
        try:
            loaded = await self.reads.ask(lambda s: Loaded(s.candidate(name), s.view(name), s.band_info()))
            if not self.is_here(walk):
                return
            walk.take(loaded)
            walk.go(first_check(loaded.view, check), keep_message=True)
            self.draw()
            self.be_ready()
            self.keep_place()
            walk.cutouts = tuple(await self.reads.ask(lambda s: s.cutouts(name)))
            evidence = await self.reads.ask(lambda s: s.evidence(name))
            if not self.is_here(walk):
                return
            walk.evidence = dict(evidence)
            walk.p_min = self.session.settings.p_min
            if not all(check in evidence for check in CHECKS):
                walk.trouble = NONE
            walk.story = tuple(await self.reads.ask(lambda s: s.story(name)))
            if loaded.candidate.dips:
                walk.dip_curves = tuple(await self.reads.ask(lambda s: s.dip_curves(name)))
            if walk.page == LOOK_ALIKES:
                self.look_for_alikes()
            await self.draw_curves(walk)
        except TuiError as error:
            walk.trouble = walk.message = str(error)
            if self.is_here(walk):
                self.draw()
                self.be_ready()

    async def draw_curves(self: CandidateScreen, walk: Walk) -> None:
        """The curve of the check on view first, then those the reviewer may turn to."""
        here = walk.check
        for check in (here, *(other for other in CHECKS if other != here)):
            await self.read_curve(walk, check, 0)
            if not self.is_here(walk):
                return
            if check in (walk.check, walk.compared) or check == here:
                self.draw()

    async def read_curve(self: CandidateScreen, walk: Walk, check: str, index: int) -> None:
        """Fetch one curve into the page it belongs to, once."""
        found = walk.evidence.get(check)
        if (check, index) in walk.curves or found is None or index >= len(found.fits):
            return
        walk.curves[check, index] = await self.reads.ask(lambda s: s.curve(walk.name, check, index))

    @work(exclusive=True, group="curve", exit_on_error=False)
    async def show_curve(self: CandidateScreen, walk: Walk, check: str, index: int) -> None:
        """Fetch and draw one curve."""
        try:
            await self.read_curve(walk, check, index)
        except TuiError as error:
            walk.message = str(error)
        if self.is_here(walk):
            self.draw()

    def look_for_alikes(self: CandidateScreen) -> None:
        """Look through the queue once, when the page of look-alikes is turned to and the evidence is here."""
        walk = self.walk
        if walk.look_alikes is None and not walk.looking and not walk.alike_trouble and walk.evidence.get("star"):
            walk.looking = True
            self.find_alikes(walk)

    @work(group="alike", exit_on_error=False)
    async def find_alikes(self: CandidateScreen, walk: Walk) -> None:
        """Fetch what looks like this candidate; in a long queue this takes seconds, and a thread of its own."""
        try:
            star = walk.evidence.get("star")
            walk.look_alikes = await self.alikes.ask(lambda s: s.look_alikes(walk.name, star))
            walk.alike_trouble = "" if walk.look_alikes else "the star alone could not be fitted here"
        except TuiError as error:
            walk.alike_trouble = str(error)
        walk.looking = False
        if self.is_here(walk):
            self.query_one("#walk-page", RowsView).redraw()
            self.draw_foot()

    def is_here(self: CandidateScreen, walk: Walk) -> bool:
        """Whether that page is still the one on view: what comes late is ignored."""
        return walk is self.walk and self.is_attached

    def be_ready(self: CandidateScreen) -> None:
        """From the next painted frame on, keys count."""

        def ready() -> None:
            self._ready_at = monotonic()

        self.call_after_refresh(ready)

    def keep_place(self: CandidateScreen) -> None:
        """Resume here after whatever may happen, and tell others that somebody looks at this candidate."""
        if self.session.reviewer is not None:
            name, check = self.walk.name, self.walk.check
            self.write(lambda s: (s.save_position(name, check), s.claim(name)))

    @work(group="write", exit_on_error=False)
    async def write(self: CandidateScreen, job: Callable[[Session], Any]) -> None:
        """Something small for the queue, in order, off this thread; trouble is a quiet line."""
        try:
            await self.writes.ask(job)
        except TuiError as error:
            self.say(str(error), is_error=True)
