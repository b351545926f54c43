"""The vetted list: for each star what was tried, what the fits gave and who ruled what; the team's, past every seal."""

from __future__ import annotations

import sqlite3
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import closing
from dataclasses import asdict, dataclass
from itertools import islice
from typing import Any

from tui import __version__
from tui.model import Settings, plain
from tui.store.candidates import candidate_count, get_candidates
from tui.store.connect import open_queue, snapshot
from tui.store.deriving import oddness_of
from tui.store.evidence import current_evidence_of
from tui.store.records import TeamRow
from tui.store.reviewers import reviewers
from tui.store.settings import read_settings
from tui.store.team import team_standing
from tui.workflow.clock import utc_now
from tui.workflow.controls import read_truth
from tui.workflow.counting import counted
from tui.workflow.export_columns import columns
from tui.workflow.export_files import refuse_existing, write_list, writer_for
from tui.workflow.export_row import Cells, VettedRow

PAGE = 250  # candidates in memory at once
UNRESOLVED = ("open", "split")
CAUTION = (
    "Unexplained means only that these checks fell short with these data and models; it is no detection. Independent "
    "data at higher resolution come next. Sources that shine in lines (nebulae, emission-line stars, quasars) are "
    "natural and outside the thermal mixture. The numbers are no better than the photosphere source and the floors. "
    "An adequate fit is not an explanation: free parameters absorb much."
)
Report = Callable[[int, int], None]


@dataclass(frozen=True, slots=True)
class Selection:
    """Which candidates to write."""

    outcome: str | None = None
    unresolved: str | None = None  # a check that is open or split
    controls: str | None = None  # path of a truth file, whose names are left out

    def takes(self, row: TeamRow, controls: Mapping[str, str]) -> bool:
        """Whether a candidate belongs in the list."""
        if row.name in controls or (self.outcome and row.outcome != self.outcome):
            return False
        return not self.unresolved or row.states.get(self.unresolved) in UNRESOLVED


@dataclass(frozen=True, slots=True)
class Exported:
    """What was written."""

    path: str
    rows: int
    without_evidence: int

    def sentence(self) -> str:
        """One line for a person."""
        text = f"Wrote {counted(self.rows, 'candidates')} to {self.path}."
        if self.without_evidence:
            have = "has" if self.without_evidence == 1 else "have"
            text += f" {self.without_evidence} of them {have} no evidence yet; plainlight assess computes it."
        return text


def export(
    path: str, out: str, selection: Selection | None = None, *, force: bool = False, report: Report | None = None
) -> Exported:
    """Write the vetted list to `out`, in the format that its ending names, whole or not at all.

    Raises:
        InputError: the ending is of no known format, or `out` exists and `force` is false.
        TableError: the truth file of the controls cannot be read.
        StoreError: the queue cannot be opened.
    """
    selection = selection or Selection()
    writer_for(out)
    refuse_existing(out, force)
    controls = read_truth(selection.controls) if selection.controls else {}
    with closing(open_queue(path, write=False)) as connection, snapshot(connection):
        settings = read_settings(connection)
        cells, bare = Cells(columns()), 0
        for row in vetted_rows(connection, selection, controls, settings, report):
            cells.add(row)
            bare += not row.evidence
        meta = metadata(connection, selection, controls, settings)
    write_list(out, cells, meta, force=force)
    return Exported(out, len(cells), bare)


def vetted_rows(
    connection: sqlite3.Connection,
    selection: Selection,
    controls: Mapping[str, str],
    settings: Settings,
    report: Report | None = None,
) -> Iterator[VettedRow]:
    """The rows of the list, in order of loading, a page in memory at a time."""
    total, done = candidate_count(connection), 0
    chosen = (row for row in team_standing(connection) if selection.takes(row, controls))
    while page := list(islice(chosen, PAGE)):
        yield from page_rows(connection, page, settings)
        done += len(page)
        if report:
            report(done, total)


def page_rows(connection: sqlite3.Connection, page: Sequence[TeamRow], settings: Settings) -> Iterator[VettedRow]:
    """Some candidates with their facts and evidence."""
    evidence = current_evidence_of(connection, [row.name for row in page])
    candidates = get_candidates(connection, [row.id for row in page])
    for row, candidate in zip(page, candidates, strict=True):
        found = evidence[row.name]
        sigma, band, pull = oddness_of(found.get("star"))
        yield VettedRow(
            name=row.name,
            facts=candidate.facts,
            outcome=row.outcome,
            pending_reason=row.pending_reason,
            states=row.states,
            counts={check: asdict(count) for check, count in row.counts.items()},
            revised={check: count.revised for check, count in row.counts.items()},
            stale={check: count.stale for check, count in row.counts.items()},
            evidence=found,
            oddness={"sigma": sigma, "band": band, "pull": pull} if sigma is not None else {},
            photosphere=settings.photosphere if found else "",
            law=settings.law if found else "",
            held_r_v=None if settings.r_v == "free" else float(settings.r_v),
        )


def metadata(
    connection: sqlite3.Connection, selection: Selection, controls: Mapping[str, str], settings: Settings
) -> dict[str, Any]:
    """What a reader of the list needs to know of how it was made: JSON values."""
    from tui.checks import VERSIONS
    from tui.store.audit import queue_digest

    return {
        "program": f"plainlight {__version__}",
        "date": utc_now(),
        "code_versions": dict(VERSIONS),
        "queue_digest": queue_digest(connection),
        "settings": plain(asdict(settings)),
        "thresholds": {name: getattr(settings, name) for name in ("quorum", "agree_share", "p_min", "ruwe_max")},
        "reviewers": [one.handle for one in reviewers(connection)],
        "agreement": agreement(connection, settings, controls),
        "selection": {
            "outcome": selection.outcome,
            "unresolved": selection.unresolved,
            "controls_left_out": bool(selection.controls),
        },
        "caution": CAUTION,
    }


def agreement(connection: sqlite3.Connection, settings: Settings, controls: Mapping[str, str]) -> dict[str, Any]:
    """How far reviewers agreed in first, sealed rulings, as the tally has it."""
    from tui.workflow.tallying import tally

    found = tally(connection, settings, now=utc_now(), truth=controls).as_dict()["agreement"]
    return {name: plain(found[name]) for name in ("overall", "checks", "lean_followed")}
