"""Makes the tally of a queue from what the store hands to the team."""

from __future__ import annotations

import math
import sqlite3
from collections import Counter
from collections.abc import Iterable, Iterator, Mapping, Sequence
from datetime import datetime

from tui.consensus.controls import ControlRates, control_rates
from tui.consensus.history import first_sealed
from tui.errors import UnknownNameError
from tui.model import CHECK_TITLES, CHECKS, OUTCOMES, Reviewer, Ruling, Settings
from tui.store.records import TeamRow
from tui.workflow.tally_record import STATES_SHOWN, Line, ReviewerLine, Tally, alpha_words, percent, trust_sentences

__all__ = ["STATES_SHOWN", "Line", "ReviewerLine", "Tally", "alpha_words", "percent", "tally", "trust_sentences"]

QUIET_DAYS = 5.0  # without a ruling while the queue needs people; our choice
NAMED = 5000  # names kept on one line
SEED = 20  # of the resampling behind the intervals: the same rulings give the same tally
PAGE = 5000  # rows looked up at once
DAY_S = 86_400.0


def tally(
    connection: sqlite3.Connection, settings: Settings, *, now: str, truth: Mapping[str, str] | None = None
) -> Tally:
    """The team's tally of a queue.

    Args:
        now: UTC, as in the log; days of quiet are counted to it.
        truth: control -> nature (`workflow.controls.read_truth`); controls are then left out of all counts, and
            each reviewer's rates on them are given.
    """
    import numpy as np

    from tui.consensus.agreed import team_agreement
    from tui.consensus.meaning import meaning
    from tui.store import reviewers as joined
    from tui.store import rulings
    from tui.store.views import team_standing

    truth = truth or {}
    team = joined.reviewers(connection)
    counts = Counts()
    for row in team_standing(connection):
        counts.add(row, row.name in truth)
    counts.add_alike()
    log = rulings.log_by_candidate(connection)
    first = [ruling for rows in log.values() for ruling in first_sealed(rows).values()]
    owing, done, further = who_is_asked(connection, team, counts)
    people = reviewer_lines(team, log, done, now, control_rates(first, truth) if truth else {})
    outcomes = {outcome: counts.line(outcome, outcome) for outcome in OUTCOMES}
    waiting = counts.of["needs"]
    return Tally(
        utc=now,
        quorum=settings.quorum,
        agree_share=settings.agree_share,
        candidates=counts.candidates,
        controls=counts.controls,
        settled=counts.line("settled", "settled"),
        under_way=counts.line("under_way", "under way"),
        untouched=counts.line("untouched", "untouched"),
        progress={
            check: {state: counts.line(f"{state}:{check}", state_words(state, check)) for state in STATES_SHOWN}
            for check in CHECKS
        },
        holds=hold_lines(counts, owing, further, people, waiting),
        outcomes=outcomes,
        parted=counts.line("parted", "explained, though by different checks"),
        reviewers=people,
        agreement=team_agreement(
            first, cited_adequate(connection, first), [one.id for one in team], np.random.default_rng(SEED), truth
        ),
        q_values=survivor_q(connection, settings.n_searched, outcomes["unexplained"].names),
        meaning=meaning(settings.n_searched, counts.of["unexplained"], counts.of["pending"], waiting),
    )


class Counts:
    """Candidates by what the tally counts them under, one pass over the queue."""

    def __init__(self) -> None:
        self.candidates = self.controls = 0
        self.of: Counter[str] = Counter()
        self.names: dict[str, list[str]] = {}
        self.splits: dict[int, TeamRow] = {}  # id -> pending candidate with a split
        self.fullest: dict[int, TeamRow] = {}  # id -> pending, needing people, with somebody done
        self.alike: dict[str, tuple[TeamRow, list[str]]] = {}  # reasons -> first untouched candidate with them, names
        self.alike_count: Counter[str] = Counter()

    def add(self, row: TeamRow, is_control: bool) -> None:
        """Count one candidate, unless it is a control."""
        if is_control:
            self.controls += 1
        elif row.touched:
            self.add_keys(row, 1, [row.name])
        else:  # nearly all of a long queue: told apart by nothing but their reasons
            self.alike_count[row.pending_reason] += 1
            names = self.alike.setdefault(row.pending_reason, (row, []))[1]
            if len(names) < NAMED:
                names.append(row.name)

    def add_alike(self) -> None:
        """Count the untouched candidates, which `add` only collected."""
        for reasons, (row, names) in self.alike.items():
            self.add_keys(row, self.alike_count[reasons], names)

    def add_keys(self, row: TeamRow, many: int, names: list[str]) -> None:
        """Count candidates that are all like `row`."""
        self.candidates += many
        for key in self.keys_of(row):
            self.of[key] += many
            held = self.names.setdefault(key, [])
            held += names[: NAMED - len(held)]

    def keys_of(self, row: TeamRow) -> Iterator[str]:
        """All that one candidate counts under."""
        yield row.outcome
        if row.outcome != "pending":
            yield "settled"
            if row.cause == "parted":
                yield "parted"
        else:
            yield "under_way" if row.touched else "untouched"
            yield from self.pending_keys(row)
        for check in CHECKS:
            counted = row.counts[check]
            is_ruled = counted.explains + counted.short + counted.unclear > 0
            state = row.states[check]
            yield f"{'none' if state == 'open' and not is_ruled else state}:{check}"
            if counted.stale:
                yield f"stale:{check}"
        if any(row.counts[check].stale for check in CHECKS):
            yield "stale"

    def pending_keys(self, row: TeamRow) -> Iterator[str]:
        """Whether a pending candidate needs people, and which are to be asked after."""
        reasons = row.pending_reason.split(";")
        if all(reason.startswith("nodata:") for reason in reasons):
            yield "nodata"
            return
        yield "needs"
        if any(reason.startswith("split:") for reason in reasons):
            yield "split"
            self.splits[row.id] = row
        if row.done:
            self.fullest[row.id] = row

    def line(self, key: str, words: str) -> Line:
        """The line of a key."""
        return line_of(key, self.of[key], words, self.names.get(key, ()))


def line_of(key: str, count: int, words: str, names: Iterable[str]) -> Line:
    """A line that reads `COUNT words`."""
    return Line(key, f"{count} {words}", count, tuple(names))


def state_words(state: str, check: str) -> str:
    """What one cell of the progress counts."""
    words = {"none": "not ruled by anyone", "short": "falls short", "nodata": "no data", "stale": "with stale rulings"}
    return f"{words.get(state, state)}: {CHECK_TITLES[check]}"


def who_is_asked(
    connection: sqlite3.Connection, team: Sequence[Reviewer], counts: Counts
) -> tuple[dict[str, list[str]], dict[str, int], list[str]]:
    """Whom the queue waits for.

    Returns:
        handle -> candidates whose split that reviewer, done with them, has still to rule again; reviewer id -> number
        of candidates done; candidates with which all who joined are done and for which nobody of them is asked.
    """
    from tui.store.views import view_counts, view_rows

    owing: dict[str, list[str]] = {}
    waiting = {key: row for key, row in counts.fullest.items() if row.done >= len(team)}
    asked: set[int] = set()
    for one in team:
        for row in paged(view_rows, connection, one.id, sorted(counts.splits.keys() | waiting.keys())):
            if row.needs_me:
                asked.add(row.id)
                if row.done:
                    owing.setdefault(one.handle, []).append(row.name)
    done = {one.id: view_counts(connection, one.id)["done"] for one in team}
    return owing, done, [row.name for key, row in sorted(waiting.items()) if key not in asked]


def paged(view_rows, connection: sqlite3.Connection, reviewer_id: str | None, ids: Sequence[int]) -> Iterable:
    """`view_rows` of many ids, some at a time."""
    for start in range(0, len(ids), PAGE):
        yield from view_rows(connection, reviewer_id, ids[start : start + PAGE])


def hold_lines(
    counts: Counts, owing: Mapping[str, list[str]], further: Sequence[str], people: Sequence[ReviewerLine], waiting: int
) -> tuple[Line, ...]:
    """What holds the queue up, the most pressing first; only what there is."""
    held = [
        counts.line("split", "split"),
        *(line_of(f"again:{who}", len(names), f"for {who} to rule again", names) for who, names in owing.items()),
        line_of("further", len(further), "for a further reviewer (all who joined are done)", further[:NAMED]),
        counts.line("stale", "with stale rulings"),
        counts.line("nodata", "lacking only data"),
    ]
    quiet = [
        Line(f"quiet:{one.handle}", f"{one.handle} quiet for {one.quiet_days:.0f} days", 0)
        for one in people
        if waiting and one.quiet_days is not None and one.quiet_days >= QUIET_DAYS
    ]
    return (*(line for line in held if line.count), *quiet)


def reviewer_lines(
    team: Sequence[Reviewer],
    log: Mapping[str, Sequence[Ruling]],
    done: Mapping[str, int],
    now: str,
    controls: Mapping[str, ControlRates],
) -> tuple[ReviewerLine, ...]:
    """One line a reviewer."""
    rulings: Counter[str] = Counter()
    candidates: Counter[str] = Counter()
    last: dict[str, str] = {}
    for rows in log.values():
        candidates.update({row.reviewer_id for row in rows})
        for row in rows:
            rulings[row.reviewer_id] += 1
            last[row.reviewer_id] = max(row.utc, last.get(row.reviewer_id, ""))
    return tuple(
        ReviewerLine(
            id=one.id,
            handle=one.handle,
            rulings=rulings[one.id],
            candidates=candidates[one.id],
            done=done[one.id],
            last_utc=last.get(one.id, ""),
            quiet_days=days_between(last[one.id], now) if one.id in last else None,
            controls=controls.get(one.id),
        )
        for one in team
    )


def days_between(earlier: str, later: str) -> float:
    """Days from one UTC of the log to another; 0 where clocks differ and it would be less."""
    return max((datetime.fromisoformat(later) - datetime.fromisoformat(earlier)).total_seconds() / DAY_S, 0.0)


def cited_adequate(connection: sqlite3.Connection, first: Iterable[Ruling]) -> dict[str, bool | None]:
    """Digest -> `adequate` of the evidence that these rulings cite, where the queue holds it."""
    from tui.store.evidence import evidence_by_digest

    found: dict[str, bool | None] = {}
    for digest in {ruling.evidence_digest for ruling in first if ruling.evidence_digest}:
        try:
            found[digest] = evidence_by_digest(connection, digest).adequate
        except UnknownNameError:
            continue  # cited in another copy, and never gathered with it: no lean to follow
    return found


def survivor_q(connection: sqlite3.Connection, n_searched: int | None, survivors: Sequence[str]) -> dict[str, float]:
    """Survivor -> q, from the oddness of the whole queue; empty where the number searched is unknown or too small."""
    import numpy as np

    from tui.consensus.survey import q_values
    from tui.store.views import view_order, view_rows

    ids = view_order(connection, None) if n_searched is not None and survivors else []
    if n_searched is None or n_searched < len(ids) or not survivors:
        return {}
    rows = [(row.name, row.oddness) for row in paged(view_rows, connection, None, ids)]
    chance = np.array([chance_of(sigma) for _, sigma in rows])
    q = dict(zip((name for name, _ in rows), q_values(chance, n_searched).tolist(), strict=True))
    return {name: q[name] for name in survivors if math.isfinite(q[name])}


def chance_of(oddness: float) -> float:
    """The one-sided p of an oddness in sigma; NaN stays NaN."""
    return 0.5 * math.erfc(oddness / math.sqrt(2))
