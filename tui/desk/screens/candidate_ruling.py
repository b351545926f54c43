"""Ruling on a candidate and going on: a letter chooses, Enter records, then the next check or the next candidate."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from textual import work

from tui.desk.screens.pages import RULINGS
from tui.desk.screens.walk import ONLY_UNCLEAR, Loaded, Walk, next_to_rule, refusal
from tui.desk.text import RULING_WORDS, SHORT_CHECKS, clock, state_text
from tui.errors import TuiError
from tui.model import CHECK_TITLES, Evidence, Ruling
from tui.workflow.records import CandidateView

if TYPE_CHECKING:
    from tui.desk.screens.candidate import CandidateScreen
    from tui.workflow.session import Session

CHOOSE = "Choose first: e explains, f falls short, u unclear. Then Enter records."
FURTHER = "m: next star, a: add a note."
READ_ONLY = "The queue is read only: nothing can be ruled or kept. Copy it to a folder of yours, and gather the copy."
NOBODY = "Nothing else needs you. q: back to the queue."
MORE = 400  # candidates of the list looked at for the next one, before the queue is asked
CHANGED = "The evidence changed while you looked; this is the new one. Nothing was recorded: look, and choose again."


def has_changed(stored: Evidence | None, shown: str) -> bool:
    """Whether the queue holds other evidence than what is on the screen."""
    return stored is not None and stored.digest != shown


class RecordsRulings:
    """The part of the candidate's screen that rules; every write is off the interface's thread."""

    def action_choose(self: CandidateScreen, ruling: str) -> None:
        """Choose, record nothing yet; the same letter again, as slow lines repeat it, keeps the choice."""
        walk = self.walk
        why = self.cannot_rule() or refusal(walk.loaded.view, walk.check, ruling)
        if why:
            self.say(why)
            return
        walk.choose(ruling)
        self.draw_foot()

    def action_withdraw(self: CandidateScreen) -> None:
        """Choose to withdraw the ruling on this check."""
        self.action_choose("withdrawn")

    def action_reaffirm(self: CandidateScreen) -> None:
        """A ruling that is stale, or gets a further note, still holds: choose it once more."""
        walk = self.walk
        own = walk.loaded.view.own.get(walk.check) if walk.loaded else None
        if self.cannot_rule() or own is None or not may_stand(walk):
            self.say(self.cannot_rule() or "There is no stale ruling of yours on this check.")
            return
        walk.choose(own.ruling, stands=True)
        self.draw_foot()

    def cannot_rule(self: CandidateScreen) -> str:
        """Why nothing can be ruled now, as a plain sentence; '' where it can."""
        if self.session.reviewer is None:
            return "You read without a handle. To rule: plainlight join QUEUE HANDLE, then review --as HANDLE."
        if self.session.read_only:
            return READ_ONLY
        if self.walk.loaded is None or self.walk.own_evidence is None:
            return "The evidence is not here yet: rulings open when the numbers are."
        return "Recording ..." if self.walk.recording else ""

    def action_record(self: CandidateScreen) -> None:
        """Record what was chosen with its note; the evidence on view is cited."""
        walk = self.walk
        if self.cannot_rule() or not walk.chosen:
            self.say(self.cannot_rule() or why_nothing_is_chosen(walk))
            return
        walk.recording = True
        self._ready_at = float("inf")
        self.draw_foot()
        self.record(walk, walk.check, walk.chosen, walk.note)

    @work(group="record", exit_on_error=False)
    async def record(self: CandidateScreen, walk: Walk, check: str, ruling: str, note: str) -> None:
        """Write the ruling off this thread, then go on; where anything has changed meanwhile, ask once more."""
        name, shown, current = walk.name, walk.own_evidence.digest, own_id(walk.loaded.view, check)

        def job(session: Session) -> tuple[Ruling | None, CandidateView] | None:
            view = session.view(name)
            if own_id(view, check) != current:
                return None, view
            if ruling == "withdrawn":
                made = session.withdraw(name, check, note)
            elif has_changed(session.stored_evidence(name).get(check), shown):
                return None
            else:
                made = session.rule(name, check, ruling, note, evidence_digest=shown)
            session.save_draft(name, check, "")
            session.take_up(name)
            return made, session.view(name)

        try:
            written = await self.writes.ask(job)
        except TuiError as error:
            walk.recording = False
            self.be_ready()
            self.say(str(error), is_error=True)
            return
        walk.recording = False
        if written is None:
            walk.message = CHANGED
            self.open(name, check, keep_message=True)
            return
        made, view = written
        if made is None:
            self.take_elsewhere(walk, view, check)
            return
        self.note_recorded(made.utc)
        if self.is_here(walk):
            await self.go_on(walk, view, check, ruling)

    def take_elsewhere(self: CandidateScreen, walk: Walk, view: CandidateView, check: str) -> None:
        """The same reviewer ruled meanwhile on another screen: say so, and let them decide what holds."""
        own = view.own.get(check)
        ruled = f"ruled this {RULING_WORDS[own.ruling]} at {clock(own.utc)}" if own else "withdrew your ruling on this"
        begun = dict(walk.notes)
        walk.take(Loaded(walk.loaded.candidate, view, walk.loaded.bands))
        walk.notes |= begun
        walk.message = f"You {ruled} on another screen. Nothing was recorded here; Enter again records your choice."
        self.draw()
        self.be_ready()

    def note_recorded(self: CandidateScreen, utc: str) -> None:
        """A ruling is in the file."""
        self.app.note_ruling(utc)

    async def go_on(self: CandidateScreen, walk: Walk, view: CandidateView, check: str, ruling: str) -> None:
        """To the next check that this reviewer has to rule; after the last, to what has been ruled on this star."""
        walk.take(Loaded(walk.loaded.candidate, view, walk.loaded.bands))
        following = None if view.done or ruling == "withdrawn" else next_to_rule(view, check)
        walk.go(following or check)
        walk.recorded = recorded_words(check, ruling)
        if following is None and ruling != "withdrawn":
            walk.page = RULINGS
            walk.message = done_words(walk.name, view)
        self.draw()
        self.be_ready()
        self.keep_place()
        self.show_curve(walk, walk.check, 0)

    # --- going on ---

    def action_next_for_me(self: CandidateScreen) -> None:
        """From a star that is done the next of the list; else what needs this reviewer most, wherever it stands."""
        self.walk.message = ""
        self.turn(self.walk, by_list=self.walk.is_done)

    def action_later(self: CandidateScreen) -> None:
        """Leave this candidate for later and take the next."""
        if self.session.reviewer is None or self.session.read_only:
            self.say(self.cannot_rule())
            return
        name = self.walk.name
        self.skipped.add(name)
        self.write(lambda s: s.put_off(name))
        self.walk.message = f"Left for later: {name}."
        self.turn(self.walk, by_list=True)

    def action_last_candidate(self: CandidateScreen) -> None:
        """Back to the candidate before."""
        if not self.before:
            self.say("There is no candidate before this one.")
            return
        name = self.before.pop()
        self.open(name)

    @work(exclusive=True, group="turn", exit_on_error=False)
    async def turn(self: CandidateScreen, walk: Walk, by_list: bool) -> None:
        """Find and open the next candidate."""
        self._ready_at = float("inf")
        await self.take_next(walk, by_list)

    async def take_next(self: CandidateScreen, walk: Walk, by_list: bool = True) -> None:
        """Open the next candidate, or say that there is none."""
        skip = frozenset(self.skipped | {walk.name})
        try:
            following = await self.writes.ask(lambda s: self.following(s, walk.name, skip, by_list))
        except TuiError as error:
            walk.message, following = str(error), None
        if not self.is_here(walk):
            return
        if following is None:
            walk.message = f"{walk.message} {NOBODY}".strip()
            walk.go(walk.check, keep_message=True)
            self.draw()
            self.be_ready()
            return
        self.before.append(walk.name)
        self.open(following)

    def following(
        self: CandidateScreen, session: Session, name: str, skip: frozenset[str], by_list: bool
    ) -> str | None:
        """The next candidate of the list that needs this reviewer, else what the queue says; runs in a thread."""
        if session.reviewer is None:
            return None
        session.release(name)
        if by_list and self.order is not None and len(self.order):
            for entry in session.rows(ids_after(session, self.order, name)):
                if entry.needs_me and entry.name not in skip:
                    return entry.name
        return session.claim_next(skip)


def own_id(view: CandidateView, check: str) -> str:
    """The id of the reader's current ruling on a check; '' where there is none."""
    own = view.own.get(check)
    return own.id if own else ""


def may_stand(walk: Walk) -> bool:
    """Whether the reader's ruling on the check on view can be made once more: it is stale, or a note was begun."""
    view = walk.loaded.view if walk.loaded else None
    return view is not None and walk.check in view.own and bool(walk.check in view.stale or walk.note)


def why_nothing_is_chosen(walk: Walk) -> str:
    """What to do where Enter has nothing to record."""
    if walk.loaded.view.states.get(walk.check) == "nodata":
        return ONLY_UNCLEAR
    return f"Done. {FURTHER}" if walk.is_done else CHOOSE


def recorded_words(check: str, ruling: str) -> tuple[str, ...]:
    """What was just recorded, at less and less length."""
    if ruling == "withdrawn":
        return f"Withdrawn: your ruling on {CHECK_TITLES[check]}", f"Withdrawn: {SHORT_CHECKS[check]}"
    return (
        f"Recorded: {CHECK_TITLES[check]} {RULING_WORDS[ruling]}",
        f"Recorded: {SHORT_CHECKS[check]} {state_text(ruling)}",
    )


def done_words(name: str, view: CandidateView) -> str:
    """That a star is finished, and what comes next."""
    if not view.seal_open:
        return f"Done. {FURTHER}"
    return f"You are done with {name}; the seal is open: {view.outcome}. {FURTHER}"


def ids_after(session: Session, order: Sequence[int] | Sequence[str], name: str) -> list[int]:
    """Ids of the next candidates of a list of ids or names; from its start where `name` is not on it."""
    own = name if isinstance(order[0], str) else session.id_of(name)
    place = order.index(own) + 1 if own in order else 0
    return [session.id_of(one) if isinstance(one, str) else one for one in order[place : place + MORE]]
