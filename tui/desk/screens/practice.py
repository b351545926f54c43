"""Practice stars on the candidate's own page: after each ruling the answer and its reason. No queue is written to."""

from __future__ import annotations

from tui.desk.screens.candidate import CandidateScreen
from tui.desk.screens.walk import Loaded, Walk, next_to_rule
from tui.desk.text import RULING_MEANINGS, RULING_WORDS
from tui.model import CHECK_TITLES, Reviewer
from tui.workflow.practice_session import PracticeSession
from tui.workflow.records import CandidateView

ALL_DONE = "These were all the practice stars. q leaves; nothing of this was kept."
WELCOME = (
    "PRACTICE, {place} of {count}: {title}. Nothing is kept. After each ruling you read what a practised eye rules."
)


class PracticeScreen(CandidateScreen):
    """One practice star after another; the answer follows each ruling, and what the star was stands at the end."""

    CSS_PATH = "candidate.tcss"

    def __init__(self, reviewer: Reviewer | None = None) -> None:
        """Begin with the first star.

        Args:
            reviewer: whose handle stands in the corner; nothing is recorded under it.
        """
        self.practice = PracticeSession(reviewer)
        super().__init__(self.practice, next(iter(self.practice.stars)))

    def open(self, name: str, check: str = "", keep_message: bool = False) -> None:
        """Turn to a star and say that it is for practice."""
        super().open(name, check, keep_message)
        self.walk.is_lesson = True
        names = list(self.practice.stars)
        if not keep_message:
            title = self.practice.star(name).title
            self.walk.message = WELCOME.format(place=names.index(name) + 1, count=len(names), title=title)
            self.draw()

    def note_recorded(self, utc: str) -> None:
        """Nothing was saved, so that nothing is said to be."""

    async def go_on(self, walk: Walk, view: CandidateView, check: str, ruling: str) -> None:
        """Say the answer; go on to the next check, and at the end of a star say what it was."""
        walk.take(Loaded(walk.loaded.candidate, view, walk.loaded.bands))
        walk.story = tuple(self.practice.story(walk.name))
        following = check if ruling == "withdrawn" or view.done else next_to_rule(view, check) or check
        walk.go(following)
        walk.message = "Withdrawn." if ruling == "withdrawn" else self.answer_words(walk.name, check, ruling)
        if view.done and ruling != "withdrawn":
            walk.message += f"\n{self.practice.star(walk.name).told} {self.further()}"
        self.draw()
        self.be_ready()
        self.show_curve(walk, walk.check, 0)

    def answer_words(self, name: str, check: str, ruling: str) -> str:
        """The answer to one check beside what was ruled, and its reason."""
        answer = self.practice.answer(name, check)
        verdict = "So rules a practised eye too" if answer.ruling == ruling else (
            f"A practised eye rules: {RULING_WORDS[answer.ruling]}"
        )
        found = self.walk.evidence.get(check)
        fits_but = found is not None and found.adequate and answer.ruling == "short"
        meaning = f" It fits, yet falls short: {RULING_MEANINGS['short']}." if fits_but else ""
        return f"{CHECK_TITLES[check]}, you: {RULING_WORDS[ruling]}. {verdict}. {answer.why}{meaning}"

    def further(self) -> str:
        """How to go on once a star is done."""
        return "m: the next practice star." if self.practice.claim_next() else ALL_DONE

    def leave(self) -> None:
        """Back to the queue, or out where there is none beneath."""
        if len(self.app.screen_stack) > 1:
            self.dismiss(None)
        else:
            self.app.exit()
