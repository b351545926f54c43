"""Practising: the packaged stars behind the face of a session, so that the same page walks them. Nothing is written."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

from tui.errors import StoreError, UnknownNameError
from tui.model import CHECKS, KINDS, Band, Candidate, Evidence, Fit, Reviewer, Ruling, Settings
from tui.workflow.basis import Basis
from tui.workflow.clock import utc_now
from tui.workflow.practice import Answer, PracticeStar, practice_evidence, practice_stars
from tui.workflow.records import CandidateView, Cutout, RulingLine, StoryLine

if TYPE_CHECKING:
    from tui.checks import Curve
    from tui.workflow.dip_curves import DipCurve
    from tui.workflow.lookalikes import LookAlikes

ANSWER = "answer"  # under whose name the practised ruling stands on the page of rulings
LEARNER = Reviewer("practice", "practice")


class PracticeSession:
    """What the candidate's page asks of a session, for stars that belong to no queue.

    One object for all threads: everything lives in memory and goes with it.
    """

    path = "practice stars"
    write = False
    read_only = False  # what is practised is kept for as long as the practice lasts

    def __init__(self, reviewer: Reviewer | None = None) -> None:
        """Begin with nothing ruled.

        Args:
            reviewer: whose handle is shown; nothing is recorded under it.
        """
        self.reviewer = reviewer or LEARNER
        self.settings = Settings()
        self.basis = Basis()
        self.stars = {star.name: star for star in practice_stars()}
        self._evidence: dict[str, dict[str, Evidence]] = {}
        self._own: dict[tuple[str, str], Ruling] = {}
        self._history: dict[str, list[RulingLine]] = {name: [] for name in self.stars}
        self._drafts: dict[tuple[str, str], str] = {}
        self._later: set[str] = set()

    def clone(self) -> PracticeSession:
        """The same practice: rulings made in one thread are seen in all."""
        return self

    def close(self) -> None:
        """Nothing is open."""

    def on_wait(self, hook: Callable[[str], None] | None) -> None:
        """No other program holds what lives in memory."""

    # --- the stars ---

    def star(self, name: str) -> PracticeStar:
        """One star. UnknownNameError if none is called so."""
        if name not in self.stars:
            raise UnknownNameError("practice star", name)
        return self.stars[name]

    def answer(self, name: str, check: str) -> Answer:
        """What a practised reviewer rules there, and why."""
        return self.star(name).answers[check]

    def candidate(self, name: str) -> Candidate:
        """What was measured."""
        return self.star(name).candidate

    def evidence(self, name: str, kinds: Sequence[str] = KINDS) -> dict[str, Evidence]:
        """Evidence with default settings, computed when first asked for."""
        if name not in self._evidence:
            self._evidence[name] = practice_evidence(self.star(name))
        return {kind: found for kind, found in self._evidence[name].items() if kind in kinds}

    def stored_evidence(self, name: str) -> dict[str, Evidence]:
        """What was computed so far."""
        return dict(self._evidence.get(name, {}))

    def curve(self, name: str, check: str, fit_index: int = 0) -> Curve | None:
        """The spectrum of one of a check's fits."""
        from tui.workflow import probing

        return probing.fit_curve(self.candidate(name), self.evidence(name)[check], fit_index, self.basis)

    def probe(
        self,
        name: str,
        check: str,
        fixed: Mapping[str, float],
        dropped: Iterable[str] = (),
        model: str | None = None,
    ) -> tuple[Fit, Curve]:
        """A fit with some numbers held and some bands dropped."""
        from tui.workflow import probing

        return probing.probe(self.candidate(name), check, fixed, frozenset(dropped), self.basis, model)

    def band_info(self) -> Mapping[str, Band]:
        """Every band by name."""
        return self.basis.bands()

    def cutouts(self, name: str) -> list[Cutout]:
        """None: the answers need no pictures."""
        return []

    def dip_curves(self, name: str) -> list[DipCurve]:
        """None: no practice star dims."""
        return []

    def look_alikes(self, name: str, star: Evidence | None = None) -> LookAlikes | None:
        """None: there is no queue to look through."""
        return None

    def story(self, name: str) -> list[StoryLine]:
        """What the star was, once it is done."""
        star = self.star(name)
        told = [StoryLine(utc_now(), "told", ANSWER, "", star.told)] if self.view(name).done else []
        return [StoryLine(utc_now(), "practice", "Plainlight", "", f"{star.title}. It belongs to no queue."), *told]

    # --- rulings, in memory alone ---

    def view(self, name: str) -> CandidateView:
        """Where the learner stands; the answers to the checks that they ruled are shown as another's rulings."""
        star = self.star(name)
        own = {check: self._own[name, check] for check in CHECKS if (name, check) in self._own}
        found = any(own[check].ruling == "explains" == star.answers[check].ruling for check in own)
        done = found or len(own) == len(CHECKS)
        return CandidateView(
            name=name,
            states={check: own[check].ruling if check in own else "todo" for check in CHECKS},
            stale={},
            outcome="practised" if done else "sealed",
            pending_reason="",
            seal_open=bool(own),
            done=done,
            needs_me=not done,
            own=own,
            others=[answer_line(star, check, own[check].utc) for check in own],
            drafts={check: text for (of, check), text in self._drafts.items() if of == name and text},
            to_rule=() if done else tuple(check for check in CHECKS if check not in own),
            own_history=list(self._history[name]),
        )

    def rule(self, name: str, check: str, ruling: str, note: str = "", evidence_digest: str | None = None) -> Ruling:
        """Keep a ruling for as long as the practice lasts."""
        self.star(name)
        made = Ruling(name, check, self.reviewer.id, ruling, note, evidence_digest or "", utc=utc_now())
        self._own.pop((name, check), None)
        if ruling != "withdrawn":
            self._own[name, check] = made
        kept = [replace(line, current=False) if line.check == check else line for line in self._history[name]]
        self._history[name] = [*kept, RulingLine("", check, self.reviewer.handle, self.reviewer.id, ruling, note,
                                                 made.utc, False, ruling != "withdrawn", "")]  # fmt: skip
        self._drafts.pop((name, check), None)
        return made

    def withdraw(self, name: str, check: str, note: str = "") -> Ruling:
        """Take a ruling back; its answer is hidden again."""
        if (name, check) not in self._own:
            raise StoreError("There is no ruling of yours to withdraw on this check.")
        return self.rule(name, check, "withdrawn", note)

    def draft(self, name: str, check: str) -> str:
        """The note begun on a check."""
        return self._drafts.get((name, check), "")

    def save_draft(self, name: str, check: str, text: str) -> None:
        """Keep a note that is being typed, in memory."""
        self._drafts[name, check] = text

    # --- which star is next ---

    def claim_next(self, skip: Iterable[str] = ()) -> str | None:
        """The next star that is not done; those put off come last."""
        waiting = [name for name in self.stars if name not in set(skip) and not self.view(name).done]
        return min(waiting, key=lambda name: name in self._later, default=None)

    def claim(self, name: str) -> bool:
        """Nobody else looks at it."""
        return True

    def release(self, name: str) -> None:
        """Nobody else waits for it."""

    def put_off(self, name: str) -> None:
        """Come back to it later."""
        self._later.add(name)

    def take_up(self, name: str) -> None:
        """Undo `put_off`."""
        self._later.discard(name)

    def position(self) -> tuple[str, str] | None:
        """A practice always begins anew."""
        return None

    def save_position(self, name: str, check: str) -> None:
        """A practice always begins anew."""


def answer_line(star: PracticeStar, check: str, utc: str) -> RulingLine:
    """The practised ruling on one check, as the page of rulings shows it."""
    found = star.answers[check]
    return RulingLine("", check, ANSWER, ANSWER, found.ruling, found.why, utc, False, True, "")
