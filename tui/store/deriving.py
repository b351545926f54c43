"""The derived tables `standing`, `queue_row` and `reviewer_row`: what the log and the evidence amount to.

They hold nothing of their own. Whoever writes to the log or to the evidence calls `refresh` in the
same transaction; `audit` computes them again and compares. `reviewer_row` has a row only where a
reviewer ruled something (or has the seal open), with what that reviewer may read there; everywhere
else the reader's view follows from `queue_row` alone.
"""

from __future__ import annotations

import math
import sqlite3
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

from tui.consensus.seal import own_stale, seen_states
from tui.consensus.standing import Standing, standing
from tui.model import CHECKS, Evidence, Ruling, Settings
from tui.store import settings as settings_log
from tui.store.codec import evidence_from
from tui.store.names import folded, ring

QUEUE_COLUMNS = (
    *("oddness", "odd_band", "odd_pull", "untestable", *CHECKS),
    *("outcome", "cause", "pending_reason", "done", "needs", "touched"),
)
RULING_COLUMNS = (
    'candidate, "check", reviewer_id, ruling, note, evidence_digest, '
    "seen_others, replaces, utc, id, previous_hash, hash"
)
EVIDENCE_COLUMNS = "kind, version, digest, adequate, content"


@dataclass(frozen=True, slots=True)
class Kept:
    """A derived table with several rows a candidate."""

    table: str
    columns: str  # beside the candidate


KEPT = (
    Kept("standing", '"check", state, explains, short, unclear, revised, stale'),
    Kept("reviewer_row", f"reviewer_id, {', '.join(CHECKS)}, stale, ruled, done, seal_open, needs_me"),
)


@dataclass(frozen=True, slots=True)
class Derived:
    """The derived rows of one candidate."""

    queue: tuple[Any, ...]  # values of QUEUE_COLUMNS
    standing: list[tuple[Any, ...]]  # check, state, explains, short, unclear, revised, stale
    reviewers: list[tuple[Any, ...]]  # reviewer_id, five states, stale, ruled, done, seal_open, needs_me
    opened: frozenset[str]


def insert_queue_row(connection: sqlite3.Connection, candidate_id: int, name: str) -> None:
    """The row of a candidate that has neither evidence nor rulings yet."""
    connection.execute(
        "INSERT INTO queue_row (id, name, fold, ring, pending_reason) VALUES (?, ?, ?, ?, ?)",
        (candidate_id, name, folded(name), ring(name), untouched(0).pending_reason),
    )


@lru_cache(maxsize=64)
def untouched(mask: int) -> Standing:
    """The standing of a candidate without rulings, by which checks are untestable; settings do not enter."""
    return standing((), {check: Evidence(check, 0, None) for bit, check in enumerate(CHECKS) if mask >> bit & 1})


def refresh(connection: sqlite3.Connection, ids: Iterable[int], settings: Settings | None = None) -> None:
    """Write the derived rows of some candidates anew, within the caller's transaction."""
    settings = settings or settings_log.read_settings(connection)
    for candidate_id in ids:
        write(connection, candidate_id, derive(ground_of(connection, candidate_id), settings))


@dataclass(frozen=True, slots=True)
class Ground:
    """What the file says of one candidate, from which its derived rows follow."""

    evidence: dict[str, Evidence]  # kind -> today's
    rulings: list[Ruling]  # the whole log, in order of arrival
    cited: dict[str, Evidence]  # digest -> evidence that rulings cite and that is not today's
    opened: frozenset[str]  # reviewers whose seal is known to be open


def ground_of(connection: sqlite3.Connection, candidate_id: int) -> Ground:
    """Read the ground of one candidate."""
    evidence = current_of(connection, candidate_id)
    rulings = rulings_on(connection, candidate_id)
    today = {one.digest for one in evidence.values()}
    wanted = {(one.check, one.evidence_digest) for one in rulings if one.evidence_digest not in today}
    return Ground(evidence, rulings, cited_of(connection, candidate_id, wanted), opened_on(connection, candidate_id))


def stand(ground: Ground, settings: Settings) -> Standing:
    """The standing of one candidate, seal and all: for this package's own use, never handed to one reader whole."""
    checks = {check: ground.evidence[check] for check in CHECKS if check in ground.evidence}
    return standing(ground.rulings, checks, ground.cited, settings, ground.opened)


def refresh_after_evidence(
    connection: sqlite3.Connection, ids: Sequence[int], stars: Mapping[int, Evidence]
) -> None:
    """The same as `refresh` after evidence came in, faster where nobody ruled, which is nearly everywhere.

    Args:
        stars: candidate id -> star evidence that came in; the others keep their oddness.
    """
    settings = settings_log.read_settings(connection)
    masks, touched = dict.fromkeys(ids, 0), set()
    for start in range(0, len(ids), 500):
        page = list(ids[start : start + 500])
        marks = ", ".join("?" * len(page))
        query = f"SELECT id FROM queue_row WHERE touched = 1 AND id IN ({marks})"
        touched |= {row[0] for row in connection.execute(query, page).fetchall()}
        query = (
            "SELECT candidate_id, kind FROM evidence "
            f"WHERE is_current = 1 AND adequate IS NULL AND candidate_id IN ({marks})"
        )
        for candidate_id, kind in connection.execute(query, page).fetchall():
            masks[candidate_id] |= mask_of([kind]) if kind in CHECKS else 0
    query = "SELECT oddness, odd_band, odd_pull FROM queue_row WHERE id = ?"
    for candidate_id, mask in masks.items():
        if candidate_id in touched:
            write(connection, candidate_id, derive(ground_of(connection, candidate_id), settings))
            continue
        is_new = candidate_id in stars
        odd = oddness_of(stars[candidate_id]) if is_new else connection.execute(query, (candidate_id,)).fetchone()
        values = (*odd, mask, *queue_values(untouched(mask)), 0)
        write(connection, candidate_id, Derived(values, [], [], frozenset()))


def derive(ground: Ground, settings: Settings) -> Derived:
    """Compute the derived rows of one candidate."""
    mask = untestable_mask(ground.evidence)
    odd = oddness_of(ground.evidence.get("star"))
    if not ground.rulings and not ground.opened:
        return Derived((*odd, mask, *queue_values(untouched(mask)), 0), [], [], ground.opened)
    stands = stand(ground, settings)
    readers = sorted({ruling.reviewer_id for ruling in ground.rulings} | stands.opened)
    return Derived(
        (*odd, mask, *queue_values(stands), 1),
        [standing_values(stands, check) for check in CHECKS],
        [reviewer_values(stands, reader) for reader in readers],
        stands.opened,
    )


def queue_values(stands: Standing) -> tuple[Any, ...]:
    """The part of QUEUE_COLUMNS that comes from the standing, `touched` apart."""
    return (
        *(stands.states[check] for check in CHECKS),
        *(stands.outcome, stands.cause, stands.pending_reason, len(stands.done), int(stands.needs_people)),
    )


def standing_values(stands: Standing, check: str) -> tuple[Any, ...]:
    """One row of `standing`, without the candidate."""
    count = stands.counts[check]
    return (check, stands.states[check], count.explains, count.short, count.unclear, count.revised, count.stale)


def reviewer_values(stands: Standing, reviewer_id: str) -> tuple[Any, ...]:
    """One row of `reviewer_row`, without the candidate: only what that reviewer may read."""
    states = seen_states(stands, reviewer_id)
    testable = [check for check in CHECKS if stands.states[check] != "nodata"]
    return (
        reviewer_id,
        *(states[check] for check in CHECKS),
        mask_of(own_stale(stands, reviewer_id)),
        sum(stands.has_counting(check, reviewer_id) for check in testable),
        int(reviewer_id in stands.done),
        int(reviewer_id in stands.opened),
        int(stands.needs(reviewer_id)),
    )


def write(connection: sqlite3.Connection, candidate_id: int, derived: Derived) -> None:
    """Bring the derived rows of one candidate up to date, touching what differs; opened seals are kept for good."""
    query = f"SELECT {', '.join(QUEUE_COLUMNS)} FROM queue_row WHERE id = ?"
    old = connection.execute(query, (candidate_id,)).fetchone()
    changed = {
        column: value
        for column, value, was in zip(QUEUE_COLUMNS, derived.queue, old, strict=True)
        if value != was
    }
    if changed:
        sets = ", ".join(f"{column} = ?" for column in changed)
        connection.execute(f"UPDATE queue_row SET {sets} WHERE id = ?", (*changed.values(), candidate_id))
    if not derived.queue[-1]:
        return
    for kept in KEPT:
        write_rows(connection, kept, candidate_id, derived.standing if kept.table == "standing" else derived.reviewers)
    connection.executemany(
        "INSERT INTO seal_opened (reviewer_id, candidate_id) SELECT ?1, ?2 WHERE NOT EXISTS "
        "(SELECT 1 FROM seal_opened WHERE reviewer_id = ?1 AND candidate_id = ?2)",
        [(reviewer_id, candidate_id) for reviewer_id in sorted(derived.opened)],
    )


def write_rows(connection: sqlite3.Connection, kept: Kept, candidate_id: int, rows: list[tuple[Any, ...]]) -> None:
    """Bring a candidate's rows of one derived table up to date; the first column of a row tells it from the others."""
    names = kept.columns.split(", ")
    query = f"SELECT {kept.columns} FROM {kept.table} WHERE candidate_id = ?"
    old = {row[0]: row for row in connection.execute(query, (candidate_id,)).fetchall()}
    gone = old.keys() - {row[0] for row in rows}
    delete = f"DELETE FROM {kept.table} WHERE candidate_id = ? AND {names[0]} = ?"
    connection.executemany(delete, [(candidate_id, key) for key in sorted(gone)])
    marks = ", ".join("?" * (len(names) + 1))
    insert = f"INSERT OR REPLACE INTO {kept.table} (candidate_id, {kept.columns}) VALUES ({marks})"
    connection.executemany(insert, [(candidate_id, *row) for row in rows if old.get(row[0]) != row])


def current_of(connection: sqlite3.Connection, candidate_id: int) -> dict[str, Evidence]:
    """Kind -> today's evidence of one candidate."""
    query = f"SELECT {EVIDENCE_COLUMNS} FROM evidence WHERE candidate_id = ? AND is_current = 1"
    return {row[0]: evidence_from(*row) for row in connection.execute(query, (candidate_id,)).fetchall()}


def cited_of(
    connection: sqlite3.Connection, candidate_id: int, wanted: Iterable[tuple[str, str]]
) -> dict[str, Evidence]:
    """Digest -> evidence, for those (check, digest) that are on file."""
    query = f"SELECT {EVIDENCE_COLUMNS} FROM evidence WHERE candidate_id = ? AND kind = ? AND digest = ?"
    found: dict[str, Evidence] = {}
    for check, digest in sorted(wanted):
        row = connection.execute(query, (candidate_id, check, digest)).fetchone()
        if row is not None:
            found[digest] = evidence_from(*row)
    return found


def rulings_on(connection: sqlite3.Connection, candidate_id: int) -> list[Ruling]:
    """The whole log on one candidate, in order of arrival."""
    named = "(SELECT name FROM candidate WHERE id = ?)"
    query = f"SELECT {RULING_COLUMNS} FROM ruling WHERE candidate = {named} ORDER BY seq"
    return [ruling_from(row) for row in connection.execute(query, (candidate_id,)).fetchall()]


def ruling_from(row: Sequence[Any]) -> Ruling:
    """One row of RULING_COLUMNS."""
    candidate, check, reviewer_id, ruling, note, digest, seen, *rest = row
    return Ruling(candidate, check, reviewer_id, ruling, note, digest, bool(seen), *rest)


def opened_on(connection: sqlite3.Connection, candidate_id: int) -> frozenset[str]:
    """Reviewers whose seal on this candidate is known to be open."""
    query = "SELECT reviewer_id FROM seal_opened WHERE candidate_id = ?"
    return frozenset(row[0] for row in connection.execute(query, (candidate_id,)).fetchall())


def untestable_mask(evidence: dict[str, Evidence]) -> int:
    """Bits of the checks, in their order, whose evidence is untestable."""
    return mask_of(check for check in CHECKS if check in evidence and evidence[check].adequate is None)


def mask_of(checks: Iterable[str]) -> int:
    """Bits of some checks, in the order of CHECKS."""
    return sum(1 << CHECKS.index(check) for check in checks)


def checks_of(mask: int) -> tuple[str, ...]:
    """The checks whose bits are set.

    >>> checks_of(0b10001)
    ('star', 'dust')
    """
    return tuple(check for bit, check in enumerate(CHECKS) if mask >> bit & 1)


def oddness_of(star: Evidence | None) -> tuple[float | None, str, float | None]:
    """Oddness in sigma, the band of the largest pull and that pull, as the star evidence says or as they follow.

    The facts `oddness`, `odd_band`, `odd_pull` are taken where the check gives them.
    """
    if star is None or star.best is None:
        return None, "", None
    band, pull = max(star.best.pulls.items(), key=lambda item: abs(item[1]), default=("", math.nan))
    sigma = star.facts.get("oddness")
    if sigma is None:
        sigma = sigma_of(star.best.p)
    told = {name: star.facts[name] for name in ("odd_band", "odd_pull") if star.facts.get(name) is not None}
    return number(sigma), str(told.get("odd_band", band)), number(told.get("odd_pull", pull))


def sigma_of(p: float) -> float | None:
    """The one-sided Gaussian sigma of a chance probability; beyond what NormalDist holds, its asymptote.

    Source: Abramowitz & Stegun 1964, 26.2.23 and 26.2.12 (the tail of the normal distribution).

    >>> round(sigma_of(0.0013498980316301035), 9)
    3.0
    """
    from statistics import NormalDist  # brings fractions and decimals with it

    if not math.isfinite(p) or not 0 <= p <= 1:
        return None
    if p >= 1e-15:
        return 0.0 if p >= 1 else -NormalDist().inv_cdf(p)
    log_p = math.log(max(p, 5e-324))
    sigma = math.sqrt(-2 * log_p)
    for _ in range(20):  # log p = -x**2/2 - log(x sqrt(2 pi)) + log(1 - 1/x**2)
        sigma = math.sqrt(-2 * (log_p + math.log(sigma * math.sqrt(2 * math.pi)) - math.log1p(-1 / sigma**2)))
    return sigma


def number(value: Any) -> float | None:
    """A finite number, or None."""
    return float(value) if isinstance(value, (int, float)) and math.isfinite(value) else None
