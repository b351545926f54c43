"""The tally as a record: is it done, can it be trusted, what is left, what it means.

It is the team's: it looks past every seal. Whoever shows it to one reviewer passes it through `Tally.seen_by`, after
which it names only candidates whose seal is open to them and says how many it does not name; counts stay the team's.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

from tui.consensus.controls import ControlRates
from tui.model import CHECK_TITLES, CHECKS, OUTCOMES, plain

if TYPE_CHECKING:
    from tui.consensus.agreed import Agreed, TeamAgreement
    from tui.consensus.meaning import Meaning

STATES_SHOWN = ("none", "open", "split", "explains", "short", "nodata", "stale")
# none: nobody ruled on it yet; stale: some current ruling no longer counts, whatever the state


@dataclass(frozen=True, slots=True)
class Line:
    """A count, and the candidates it counts."""

    key: str  # "unexplained", "split:dust", "further" ...
    text: str  # as shown: "3 unexplained"
    count: int
    names: tuple[str, ...] = ()  # in order of loading; of a long list the beginning
    unnamed: int = 0  # in the list, but sealed to the reader it is shown to

    def seen_by(self, is_open: frozenset[str]) -> Line:
        """The same count, naming only these candidates."""
        names = tuple(name for name in self.names if name in is_open)
        return replace(self, names=names, unnamed=self.unnamed + len(self.names) - len(names))

    def as_dict(self) -> dict[str, Any]:
        """For JSON."""
        return {"count": self.count, "text": self.text, "names": list(self.names), "unnamed": self.unnamed}


@dataclass(frozen=True, slots=True)
class ReviewerLine:
    """What one reviewer has done. No ranking: in the order of handles."""

    id: str
    handle: str
    rulings: int  # rows of the log, withdrawals included
    candidates: int  # ruled on
    done: int
    last_utc: str  # of the last ruling; empty before the first
    quiet_days: float | None  # since then
    controls: ControlRates | None = None  # where the truth file was given


@dataclass(frozen=True, slots=True)
class Tally:
    """The team's standing at one moment."""

    utc: str
    quorum: int
    agree_share: float
    candidates: int  # controls left out, where the truth file was given
    controls: int  # how many those are
    settled: Line
    under_way: Line
    untouched: Line
    progress: Mapping[str, Mapping[str, Line]]  # check -> one of STATES_SHOWN -> line
    holds: tuple[Line, ...]  # what holds it up
    outcomes: Mapping[str, Line]
    parted: Line  # of the explained
    reviewers: tuple[ReviewerLine, ...]
    agreement: TeamAgreement
    q_values: Mapping[str, float]  # survivor -> false discovery rate; empty where n_searched is unknown
    meaning: Meaning
    is_teams: bool = True  # False once seen_by has taken names out

    @property
    def survivors(self) -> Line:
        """The unexplained candidates."""
        return self.outcomes["unexplained"]

    @property
    def unnamed(self) -> int:
        """Survivors that are sealed to the reader it is shown to."""
        return self.survivors.unnamed

    def lines(self) -> list[Line]:
        """Every line that counts candidates, in the order of reading."""
        cells = [self.progress[check][state] for check in CHECKS for state in STATES_SHOWN]
        return [
            *(self.settled, self.under_way, self.untouched), *cells, *self.holds,
            *(self.outcomes[outcome] for outcome in OUTCOMES), self.parted,
        ]  # fmt: skip

    def seen_by(self, is_open: Iterable[str]) -> Tally:
        """What a reviewer may be shown: names only where the seal is open to them.

        Args:
            is_open: names of those candidates.
        """
        names = frozenset(is_open)
        progress = {
            check: {state: line.seen_by(names) for state, line in row.items()} for check, row in self.progress.items()
        }
        return replace(
            self,
            settled=self.settled.seen_by(names),
            under_way=self.under_way.seen_by(names),
            untouched=self.untouched.seen_by(names),
            progress=progress,
            holds=tuple(line.seen_by(names) for line in self.holds),
            outcomes={outcome: line.seen_by(names) for outcome, line in self.outcomes.items()},
            parted=self.parted.seen_by(names),
            q_values={name: q for name, q in self.q_values.items() if name in names},
            is_teams=False,
        )

    def sentences(self) -> list[str]:
        """The tally in a few plain sentences, naming no candidate."""
        said = [f"{self.settled.text} of {self.candidates}, {self.under_way.text}, {self.untouched.text}."]
        if self.holds:
            said.append("What holds it up: " + ", ".join(line.text for line in self.holds) + ".")
        said += trust_sentences(self.agreement)
        said.append(f"{self.survivors.text} of {self.settled.count} settled.")
        if self.unnamed:
            said.append(f"{self.unnamed} of them are still sealed to you and not named.")
        return said + list(self.meaning.sentences)

    def as_dict(self) -> dict[str, Any]:
        """For JSON: stable names, counts and names by line, undefined numbers as null."""
        return plain(
            {
                "utc": self.utc,
                "quorum": self.quorum,
                "agree_share": self.agree_share,
                "candidates": self.candidates,
                "controls": self.controls,
                "settled": self.settled.as_dict(),
                "under_way": self.under_way.as_dict(),
                "untouched": self.untouched.as_dict(),
                "progress": {
                    check: {state: line.count for state, line in row.items()} for check, row in self.progress.items()
                },
                "holds": {line.key: line.as_dict() for line in self.holds},
                "outcomes": {outcome: line.as_dict() for outcome, line in self.outcomes.items()},
                "parted": self.parted.as_dict(),
                "reviewers": [reviewer_dict(one) for one in self.reviewers],
                "agreement": agreement_dict(self.agreement, {one.id: one.handle for one in self.reviewers}),
                "survivors": {"names": list(self.survivors.names), "q": dict(self.q_values)},
                "meaning": {
                    "n_searched": self.meaning.n_searched,
                    "unexplained": self.meaning.survivors,
                    "pending": self.meaning.pending,
                    "upper_limit": self.meaning.limit,
                    "confidence": self.meaning.confidence,
                    "sided": 1,
                    "sentences": list(self.meaning.sentences),
                },
            }
        )


def trust_sentences(agreement: TeamAgreement) -> list[str]:
    """Raw agreement first, then beyond chance, then the weakest check and the program's lean."""
    overall = agreement.overall
    if overall.raw is None:
        return ["No two first, sealed rulings on one check yet: nothing to compare."]
    same = f"The same ruling in {percent(overall.raw)} of {overall.pairs} pairs of first, sealed rulings"
    said = [f"{same}; {alpha_words(overall)}."]
    if overall.caution:
        said.append(overall.caution)
    if agreement.weakest:
        check = agreement.weakest
        said.append(f"Weakest: {CHECK_TITLES[check]}, {alpha_words(agreement.checks[check])}.")
    if agreement.lean.value is not None:
        lean = agreement.lean
        said.append(f"The program's lean was followed in {percent(lean.value)} of {lean.trials} sure rulings.")
    return said


def percent(share: float) -> str:
    """A share in whole percent."""
    return f"{100 * share:.0f} %"


def alpha_words(agreed: Agreed) -> str:
    """`alpha 0.71 (95 %: 0.58 to 0.82)`, or that it is undefined."""
    if agreed.alpha is None:
        return "alpha undefined"
    if agreed.interval is None:
        return f"alpha {agreed.alpha:.2f} (no interval: too few)"
    low, high = agreed.interval
    return f"alpha {agreed.alpha:.2f} (95 %: {low:.2f} to {high:.2f})"


def agreement_dict(agreement: TeamAgreement, handles: Mapping[str, str]) -> dict[str, Any]:
    """For JSON; reviewers by handle."""
    return {
        "overall": agreed_dict(agreement.overall),
        "checks": {check: agreed_dict(one) for check, one in agreement.checks.items()},
        "weakest": agreement.weakest or None,
        "pairs": [
            {
                "reviewers": [handles[pair.one], handles[pair.two]], "rated": pair.rated, "raw": pair.raw,
                "kappa": pair.kappa, "interval": pair.interval,
            }
            for pair in agreement.pairs
        ],
        "lean_followed": agreement.lean.as_dict(),
        "lean_followed_by_check": {check: rate.as_dict() for check, rate in agreement.lean_by_check.items()},
        "error_rates": {
            handles[one.reviewer_id]: {
                truth: {
                    response: {"value": value, "low": low, "high": high}
                    for response, (value, low, high) in responses.items()
                }
                for truth, responses in one.rates.items()
            }
            for one in agreement.error_rates
        },
        "error_rates_note": agreement.error_rates_note,
    }  # fmt: skip


def agreed_dict(agreed: Agreed) -> dict[str, Any]:
    """For JSON."""
    return {
        "rulings": agreed.rulings, "rated": agreed.rated, "pairs": agreed.pairs, "raw": agreed.raw,
        "alpha": agreed.alpha, "interval": agreed.interval, "fleiss": agreed.fleiss, "caution": agreed.caution,
    }  # fmt: skip


def reviewer_dict(line: ReviewerLine) -> dict[str, Any]:
    """For JSON."""
    shown = {
        "handle": line.handle, "rulings": line.rulings, "candidates": line.candidates, "done": line.done,
        "last_utc": line.last_utc or None, "quiet_days": line.quiet_days,
    }  # fmt: skip
    if line.controls is not None:
        shown["controls"] = {"hit": line.controls.hit.as_dict(), "false": line.controls.false.as_dict()}
    return shown
