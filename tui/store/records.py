"""The frozen records that the store hands out: rows of the queue, views of a candidate, reports.

Whatever is made for one reader keeps the seal: before a reviewer was done with a candidate for the
first time, a check reads `todo` or the reader's own ruling and the outcome reads `sealed`; for a
reader without a handle every state and outcome reads `sealed`.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from tui.consensus.standing import CheckCount
from tui.model import CHECKS, Candidate, FloatArray, Ruling

__all__ = [
    "NOT_RULED", "SEALED", "SORTS", "UNRESOLVED", "Attachment", "AuditReport", "CandidateView", "CheckCount",
    "Cutout", "Fault", "Filter", "GatherReport", "LoadCounts", "LoadRecord", "QueueRow", "RulingLine",
    "SettingLine", "StoryLine", "TeamRow",
]  # fmt: skip

SEALED = "sealed"  # what the outcome reads before the seal opens
NOT_RULED = "todo"  # what a check reads that the reader has not ruled, before the seal opens
UNRESOLVED = ("open", "split", NOT_RULED, SEALED)  # states with which a check counts as unresolved
SORTS = ("oddness", "name", "band", "pull", "outcome", "ruled", "needs", *CHECKS)


@dataclass(frozen=True, slots=True)
class LoadRecord:
    """One candidate as one table gives it; all but the name is optional."""

    candidate: Candidate
    source: str = ""  # label of the table, for facts and side tables; a measurement carries its own


@dataclass(frozen=True, slots=True)
class LoadCounts:
    """What a load added. All zero: the table had been loaded before."""

    candidates: int = 0  # new names
    versions: int = 0  # further facts of candidates already there
    measurements: int = 0  # bands not measured before
    corrections: int = 0  # new versions of a measurement (same band, source and epoch)
    repeats: int = 0  # the same band by another source or at another epoch
    same: int = 0  # known already, under this or another label
    side_tables: int = 0  # new sets of neighbours or dips, new spectra


@dataclass(frozen=True, slots=True)
class Cutout:
    """A small picture around a candidate in one band; shape (height, width)."""

    band: str
    image: FloatArray
    arcsec_per_pixel: float
    source: str = ""
    facts: Mapping[str, object] = field(default_factory=dict)  # JSON values only


@dataclass(frozen=True, slots=True)
class Attachment:
    """A file that the queue carries by content: a grid of spectra, a user's band."""

    kind: str  # "grid" | "band"
    name: str
    digest: str  # SHA-256 of the content
    content: bytes


@dataclass(frozen=True, slots=True)
class Filter:
    """Which candidates to list; every test sees only what its reader may see."""

    unresolved: str | None = None  # a check that reads open, split, todo or, without a handle, sealed
    outcome: str | None = None  # as read, so "sealed" is allowed
    needs_me: bool = False
    text: str = ""  # part of the name, case ignored
    stale: bool = False  # one of the reader's own rulings no longer counts
    mine: bool | None = None  # True: the reader ruled something on it; False: nothing yet
    done: bool | None = None
    later: bool = False  # put off by the reader
    share: tuple[int, int] | None = None  # (I, N): the I-th of N parts, the same in every copy
    names: frozenset[str] | None = None  # only these


@dataclass(frozen=True, slots=True)
class QueueRow:
    """One line of the queue as one reader may see it."""

    id: int
    name: str
    oddness: float  # Gaussian sigma; NaN before the star check was computed
    odd_band: str
    odd_pull: float
    states: dict[str, str]  # check -> todo | own ruling | team's state | nodata | sealed
    stale: frozenset[str]  # checks on which the reader's own ruling no longer counts
    outcome: str
    ruled: int  # checks on which the reader's ruling counts
    to_rule: int  # checks there are to rule: those that are not nodata
    needs_me: bool
    done: bool
    seal_open: bool


@dataclass(frozen=True, slots=True)
class RulingLine:
    """One ruling of the log with the handle of who made it; shown to others only when the seal is open."""

    id: str
    check: str
    handle: str
    reviewer_id: str
    ruling: str
    note: str
    utc: str
    seen_others: bool
    current: bool  # the reviewer's newest on this check and not withdrawn
    stale: str  # why it no longer counts; empty where it counts
    evidence_digest: str = ""


@dataclass(frozen=True, slots=True)
class CandidateView:
    """Where one candidate stands as one reader may see it."""

    name: str
    states: dict[str, str]
    stale: dict[str, str]  # check -> why the reader's own ruling no longer counts
    outcome: str
    pending_reason: str  # empty while sealed
    seal_open: bool
    done: bool
    needs_me: bool
    own: dict[str, Ruling]  # check -> the reader's current ruling
    others: list[RulingLine]  # everyone else's rulings, in time order, replaced ones too; empty while sealed
    drafts: dict[str, str]  # check -> note begun and not recorded
    id: int = 0
    cause: str = ""  # what explains it, where the outcome is explained: checks, or parted
    to_rule: tuple[str, ...] = ()  # checks that the reader has still to rule, a split to rule again among them
    own_history: list[RulingLine] = field(default_factory=list)  # in time order, replaced ones too


@dataclass(frozen=True, slots=True)
class StoryLine:
    """One thing that happened to a candidate."""

    utc: str
    what: str  # loaded | measured | corrected | neighbours | dips | spectrum | cutout | ruled | withdrawn | setting
    who: str  # handle, or the source label of a table
    check: str
    text: str
    since_mine: bool = False  # after the reader's newest ruling on this candidate


@dataclass(frozen=True, slots=True)
class TeamRow:
    """Where one candidate stands for the team: tally, export and audit only."""

    id: int
    name: str
    outcome: str
    cause: str
    pending_reason: str
    states: dict[str, str]
    counts: dict[str, CheckCount]
    done: int  # reviewers done with it
    touched: bool  # somebody ruled something


@dataclass(frozen=True, slots=True)
class SettingLine:
    """One row of the settings log."""

    name: str
    value: str
    utc: str
    by: str  # handle, or empty


@dataclass(frozen=True, slots=True)
class GatherReport:
    """What one gathering added."""

    path: str
    candidates: int = 0
    measurements: int = 0
    rulings: int = 0
    reviewers: int = 0
    settings: int = 0
    evidence: int = 0
    renamed: tuple[tuple[str, str], ...] = ()
    affected: tuple[str, ...] = ()  # candidates whose inputs changed, so that evidence must be computed again
    unrelated: bool = False  # both had candidates, and none in common


@dataclass(frozen=True, slots=True)
class Fault:
    """One thing that audit found wrong."""

    kind: str  # file | schema | reference | chain | receipt | derived | input
    place: str  # table and row, ruling id, or candidate name
    text: str


@dataclass(frozen=True, slots=True)
class AuditReport:
    """What audit looked at and found."""

    faults: tuple[Fault, ...]
    candidates: int
    measurements: int
    rulings: int
    reviewers: int
    queue_digest: str
    heads: Mapping[str, str]  # handle -> receipt text of today's chain
    repaired: int = 0  # derived rows written anew

    @property
    def sound(self) -> bool:
        """True where nothing was found wrong."""
        return not self.faults
