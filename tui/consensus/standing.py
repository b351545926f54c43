"""From the log of rulings on one candidate to check states, outcome, who is done and whom it needs.

Pure: the log, today's evidence and the settings go in, a `Standing` comes out; the same set of rows gives the same
standing in whatever order copies of a queue were gathered. What the rules leave open is decided here:

- *Done* takes at least one counting ruling of one's own: where every check is `nodata`, nobody is done by having done
  nothing, and so nobody's seal opens.
- *The seal* opens for good. The log is replayed: a reviewer who was done after any of their own rulings has it open.
  How evidence stood at that moment is not in the log; a ruling that cites today's evidence was made under today's, so
  the earlier rulings must count today; one that cites older evidence was made under that, and the earlier rulings
  count. A ruling marked `seen_others` proves an open seal. What the replay cannot know (a check that was `nodata` then
  and is testable now, settings of that day), the caller hands in as `opened`: the seals it knows to be open.
- *Ruled again with the seal open*: the party's current ruling is marked `seen_others` and both sides were before them
  when they made it: among the others' current rulings, their own previous one and the new one there was an `explains`
  and a `short`. So a second ruling made before anyone dissented does not settle a later split, nobody is asked twice,
  and a party who answers is never asked again for the same ruling.
- *Needs*: "everyone who is not done" is everyone, known or yet to join. When all reviewers who joined are done and have
  ruled their splits again, and two still stand against two, or `unclear` left fewer sure rulings than the quorum, or
  one ended the walk with another explanation than the rest, nothing that they could be asked remains: such a candidate
  waits for a further reviewer (`waits_for_another` says so), and `needs` is true of any id that is not in `done`. Only
  lacking data ends it. Hence no pending candidate needs nobody unless it lacks only data, and new reviewers who agree
  always end it: `tests/consensus/test_dead_ends.py` searches all small histories and many larger ones.
- A party who never rules again holds a split open: it needs that party, and the tally says whom.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field

from tui.consensus.history import Key, Replay, in_order
from tui.consensus.stale import counts
from tui.model import CHECKS, NATURAL, SURE, Evidence, Ruling, Settings

MAJORITY = (2, 3)  # of at least three sure rulings, after all parties ruled again (design of the outcome)
SHARE_SLACK = 1e-9  # a share typed as 0.6 is not missed by 3 of 5 through rounding

__all__ = ["CheckCount", "Standing", "counts", "standing"]


@dataclass(frozen=True, slots=True)
class CheckCount:
    """How many current rulings of each sort a check has, stale ones included."""

    explains: int = 0
    short: int = 0
    unclear: int = 0
    revised: int = 0  # current rulings that differ from the same reviewer's first
    stale: int = 0  # current rulings that do not count


@dataclass(frozen=True, slots=True)
class Standing:
    """Where one candidate stands, as the whole team's log has it; nothing of it is sealed here."""

    states: Mapping[str, str]  # check -> open | split | explains | short | nodata
    outcome: str  # ordinary | explained | unexplained | pending
    cause: str = ""  # the checks settled as explains, joined by ";", or "parted"; empty unless ordinary or explained
    reasons: tuple[str, ...] = ()  # of a pending one: "split:dust", "open:star", "nodata:extinction"
    done: frozenset[str] = frozenset()  # reviewer ids, now
    opened: frozenset[str] = frozenset()  # reviewer ids whose seal is open here, for good
    owing: Mapping[str, frozenset[str]] = field(default_factory=dict)  # split check -> parties who have to rule again
    current: Mapping[Key, Ruling] = field(default_factory=dict)  # (check, reviewer id) -> current ruling
    stale: Mapping[str, str] = field(default_factory=dict)  # id of a current ruling that does not count -> reason
    counts: Mapping[str, CheckCount] = field(default_factory=dict)  # by check

    @property
    def pending_reason(self) -> str:
        """The reasons in one text: `split:dust;nodata:extinction`."""
        return ";".join(self.reasons)

    @property
    def lacks_only_data(self) -> bool:
        """Pending, and no ruling could change it."""
        return self.outcome == "pending" and all(reason.startswith("nodata:") for reason in self.reasons)

    @property
    def needs_people(self) -> bool:
        """Pending, and rulings could change it: then it needs everyone who is not done."""
        return self.outcome == "pending" and not self.lacks_only_data

    def needs(self, reviewer_id: str) -> bool:
        """Whether it needs this reviewer, who may not have ruled at all yet."""
        return self.needs_people and (reviewer_id not in self.done or bool(self.owed_by(reviewer_id)))

    def waits_for_another(self, team: Iterable[str]) -> bool:
        """Whether it needs people and none of these reviewers, so that only someone further can end it."""
        return self.needs_people and not any(self.needs(reviewer_id) for reviewer_id in team)

    def owed_by(self, reviewer_id: str) -> tuple[str, ...]:
        """Split checks that this reviewer is asked to rule again, once, with the seal open."""
        if not self.needs_people or reviewer_id not in self.done:
            return ()
        return tuple(check for check in CHECKS if reviewer_id in self.owing.get(check, ()))

    def to_rule(self, reviewer_id: str) -> tuple[str, ...]:
        """Checks that this reviewer has still to rule here, in the order of the walk."""
        if reviewer_id in self.done:
            return self.owed_by(reviewer_id)
        return tuple(
            check
            for check in CHECKS
            if self.states[check] != "nodata" and not self.has_counting(check, reviewer_id)
        )

    def has_counting(self, check: str, reviewer_id: str) -> bool:
        """Whether this reviewer has a current ruling on the check, and it counts."""
        ruling = self.current.get((check, reviewer_id))
        return ruling is not None and ruling.id not in self.stale


def standing(
    rulings: Iterable[Ruling],
    evidence: Mapping[str, Evidence],
    cited: Mapping[str, Evidence] | None = None,
    settings: Settings | None = None,
    opened: frozenset[str] = frozenset(),
) -> Standing:
    """Apply the rules to one candidate.

    Args:
        rulings: the whole log on this candidate, in any order.
        evidence: check -> today's evidence; a check without any is testable until it has some.
        cited: digest -> evidence that the rulings cite; today's need not be repeated here.
        settings: `quorum`, `agree_share`, `walk_all` are read.
        opened: reviewers whose seal is known to be open here (the `opened` of the last standing stored).
    """
    settings = settings or Settings()
    reading = _Reading(in_order(rulings), evidence, cited or {}, settings)
    states = {check: reading.state(check) for check in CHECKS}
    done = frozenset(name for name, ruled in reading.counting.items() if reading.is_done(ruled))
    outcome, cause = _outcome(states, done, reading.counting, settings)
    pending = outcome == "pending"
    return Standing(
        states=states,
        outcome=outcome,
        cause=cause,
        reasons=_reasons(states) if pending else (),
        done=done,
        opened=opened | done | reading.opened,
        owing=reading.owing(states) if pending else {},
        current=reading.current,
        stale=reading.stale,
        counts={check: reading.count(check) for check in CHECKS},
    )


class _Reading:
    """One pass over an ordered log: current rulings, which count, whose seal opened, who answered a dispute."""

    def __init__(
        self, log: list[Ruling], evidence: Mapping[str, Evidence], cited: Mapping[str, Evidence], settings: Settings
    ) -> None:
        self._evidence, self._cited, self._settings = evidence, cited, settings
        self._testable = [check for check in CHECKS if not _is_untestable(evidence.get(check))]
        self._verdicts: dict[str, str] = {}  # ruling id -> reason it is stale, or ""
        self._first: dict[Key, str] = {}
        self._answers: set[str] = set()  # ids of rulings made with both sides in view
        self.opened: set[str] = set()
        self._replay = Replay()
        for ruling in log:
            self._take(ruling)
        self.current = self._replay.current
        self.stale = {ruling.id: why for ruling in self.current.values() if (why := self._why_stale(ruling))}
        self.counting: dict[str, dict[str, Ruling]] = {}  # reviewer id -> check -> ruling that counts
        for (check, reviewer_id), ruling in self.current.items():
            if ruling.id not in self.stale:
                self.counting.setdefault(reviewer_id, {})[check] = ruling

    def _take(self, ruling: Ruling) -> None:
        if ruling.ruling != "withdrawn":
            self._first.setdefault((ruling.check, ruling.reviewer_id), ruling.ruling)
        if ruling.seen_others:
            self.opened.add(ruling.reviewer_id)
            sides = {other.ruling for (check, _), other in self._replay.current.items() if check == ruling.check}
            if sides | {ruling.ruling} >= set(SURE):
                self._answers.add(ruling.id)
        self._replay.add(ruling)
        if ruling.reviewer_id not in self.opened and self._was_done(ruling):
            self.opened.add(ruling.reviewer_id)

    def _was_done(self, last: Ruling) -> bool:
        """Was its reviewer done right after this ruling?"""
        today = self._evidence.get(last.check)
        under_todays = today is not None and today.digest == last.evidence_digest
        ruled = {
            check: ruling
            for (check, reviewer_id), ruling in self._replay.current.items()
            if reviewer_id == last.reviewer_id and not (under_todays and self._why_stale(ruling))
        }
        return self.is_done(ruled)

    def _why_stale(self, ruling: Ruling) -> str:
        if ruling.id not in self._verdicts:
            today = self._evidence.get(ruling.check)
            if today is None or (today.digest and today.digest == ruling.evidence_digest):
                self._verdicts[ruling.id] = ""
            else:
                self._verdicts[ruling.id] = counts(self._cited.get(ruling.evidence_digest), today)
        return self._verdicts[ruling.id]

    def is_done(self, ruled: Mapping[str, Ruling]) -> bool:
        if not ruled:
            return False
        if not self._settings.walk_all and any(ruling.ruling == "explains" for ruling in ruled.values()):
            return True
        return all(check in ruled for check in self._testable)

    def _sure(self, check: str) -> dict[str, Ruling]:
        return {
            reviewer_id: ruled[check]
            for reviewer_id, ruled in self.counting.items()
            if check in ruled and ruled[check].ruling in SURE
        }

    def state(self, check: str) -> str:
        if check not in self._testable:
            return "nodata"
        sure = self._sure(check).values()
        total, explains = len(sure), sum(ruling.ruling == "explains" for ruling in sure)
        if total < max(self._settings.quorum, 1):
            return "open"
        larger, side = max((explains, "explains"), (total - explains, "short"))
        if larger >= self._settings.agree_share * total - SHARE_SLACK:
            return side
        numerator, denominator = MAJORITY
        has_majority = total >= denominator and denominator * larger >= numerator * total
        return side if has_majority and all(ruling.id in self._answers for ruling in sure) else "split"

    def owing(self, states: Mapping[str, str]) -> dict[str, frozenset[str]]:
        """Split check -> its parties who have not ruled it again."""
        return {
            check: frozenset(who for who, ruling in self._sure(check).items() if ruling.id not in self._answers)
            for check in CHECKS
            if states[check] == "split"
        }

    def count(self, check: str) -> CheckCount:
        rulings = {key: ruling for key, ruling in self.current.items() if key[0] == check}
        words = [ruling.ruling for ruling in rulings.values()]
        return CheckCount(
            explains=words.count("explains"),
            short=words.count("short"),
            unclear=words.count("unclear"),
            revised=sum(self._first[key] != ruling.ruling for key, ruling in rulings.items()),
            stale=sum(ruling.id in self.stale for ruling in rulings.values()),
        )


def _is_untestable(evidence: Evidence | None) -> bool:
    return evidence is not None and evidence.adequate is None


def _outcome(
    states: Mapping[str, str], done: frozenset[str], counting: Mapping[str, Mapping[str, Ruling]], settings: Settings
) -> tuple[str, str]:
    """The first outcome that holds, and its cause."""
    if states["star"] == "explains":
        return "ordinary", "star"
    explaining = [check for check in NATURAL if states[check] == "explains"]
    if explaining:
        return "explained", ";".join(explaining)
    if all(states[check] == "short" for check in CHECKS):
        return "unexplained", ""
    holders = sum(_holds_natural(counting[reviewer_id]) for reviewer_id in done)
    if len(done) >= max(settings.quorum, 1) and holders >= settings.agree_share * len(done) - SHARE_SLACK:
        return "explained", "parted"
    return "pending", ""


def _holds_natural(ruled: Mapping[str, Ruling]) -> bool:
    return any(check in ruled and ruled[check].ruling == "explains" for check in NATURAL)


def _reasons(states: Mapping[str, str]) -> tuple[str, ...]:
    """What keeps a candidate pending: splits first, data last, each in the order of the walk."""
    told = ("split", "open", "nodata")
    return tuple(f"{state}:{check}" for state in told for check in CHECKS if states[check] == state)
