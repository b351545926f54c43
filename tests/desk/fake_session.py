"""A queue in memory with the face of a session, small and known."""

from __future__ import annotations

import threading
from array import array
from contextlib import contextmanager
from dataclasses import replace
from types import SimpleNamespace

import numpy as np

from tests.desk.made import FIXED_UTC, PIVOT_UM, make_candidate, make_evidence, make_fit
from tui.errors import UnknownNameError
from tui.model import CHECKS, Band, Reviewer, Ruling, Settings
from tui.workflow.records import CandidateView, Filter, QueueRow, RulingLine, StoryLine


def own_rulings(own: dict[str, Ruling], number: int) -> list[RulingLine]:
    """The reader's own lines of the log; a first, sealed one on a split that the fake queue starts with."""
    lines = []
    if number % 20 == 2:
        note = "Neighbour at 3 arcsec is too faint by far.\nK shows nothing."
        lines.append(RulingLine("o1", "blend", "heron", "r-heron", "short", note, "2026-03-01T10:00:00.000000Z", False,
                                "blend" not in own, ""))  # fmt: skip
    for check, made in own.items():
        lines.append(RulingLine(made.id, check, "heron", "r-heron", made.ruling, made.note, made.utc, made.seen_others,
                                True, ""))  # fmt: skip
    return lines


def other_rulings() -> list[RulingLine]:
    """What two colleagues ruled on a blend."""
    return [
        RulingLine("o2", "blend", "curlew", "r-curlew", "explains", "[/] the beam holds \x1b[31mtwo\x1b[0m, see W1",
                   "2026-03-02T11:00:00.000000Z", False, True, ""),
        RulingLine("o3", "blend", "plover", "r-plover", "unclear", "", "2026-03-02T12:00:00.000000Z", False, True,
                   "W3 was measured anew"),
    ]  # fmt: skip


class FakeSession:
    """A queue in memory with the face of `tui.workflow.session.Session`; clones share the queue."""

    read_only = False
    hook = None  # told of a long wait

    def __init__(self, names, handle: str | None = "heron") -> None:
        self.path = "/somewhere/saltmarsh.db"
        self.reviewer = Reviewer("r-heron", handle, FIXED_UTC) if handle else None
        self.settings = Settings()
        self.names = list(names)
        self.version = 1
        self.own: dict[tuple[str, str], Ruling] = {}
        self.other: dict[str, list[RulingLine]] = {}
        self.log: list[Ruling] = []
        self.claims: set[str] = set()
        self.later: set[str] = set()
        self.looking: dict[str, list[str]] = {}
        self.drafts: dict[tuple[str, str], str] = {}
        self.place: tuple[str, str] | None = None
        self.fail: Exception | None = None
        self.tallied = None
        self.ordered_in: list[int] = []
        self.asked = threading.local()  # by each thread: whether its answer is still wanted

    # --- life ---

    def clone(self) -> FakeSession:
        return self

    def on_wait(self, hook) -> None:
        self.hook = hook

    def close(self) -> None:
        pass

    def __enter__(self):
        return self

    def __exit__(self, *exc_info) -> None:
        pass

    def forget(self) -> None:
        """As if nobody had ruled, looked or written yet."""
        for kept in (self.own, self.log, self.claims, self.later, self.drafts):
            kept.clear()
        self.place = None

    def data_version(self) -> int:
        return self.version

    @contextmanager
    def while_wanted(self, is_wanted):
        self.asked.is_wanted = is_wanted
        yield

    # --- the queue ---

    def order(self, sort="oddness", descending=True, where=None, limit=None):
        if self.fail:
            raise self.fail
        self.ordered_in.append(threading.get_ident())
        where = where or Filter()
        rows = [row for row in self.rows(range(len(self.names))) if self.lets_through(row, where)]
        keys = {"oddness": lambda row: row.oddness, "name": lambda row: row.name, "ruled": lambda row: row.ruled,
                "outcome": lambda row: row.outcome}  # fmt: skip
        rows.sort(key=keys[sort], reverse=descending)
        return array("q", [row.id for row in rows[:limit]])

    def lets_through(self, row: QueueRow, where: Filter) -> bool:
        if where.unresolved and row.states[where.unresolved] not in {"open", "split", "todo"}:
            return False
        if where.names is not None and row.name not in where.names:
            return False
        return row.needs_me or not where.needs_me

    def rows(self, ids):
        return [self.row(i) for i in ids]

    def row(self, i: int) -> QueueRow:
        name = self.names[i]
        view = self.view(name)
        own = sum((name, check) in self.own for check in CHECKS)
        band, pull = ("W3", 8.2 - 0.1 * i) if i % 4 else ("Gaia_BP", -6.1 + 0.05 * i)
        to_rule = sum(state != "nodata" for state in view.states.values())
        stale = frozenset(view.stale)
        return QueueRow(i, name, 9.1 - 0.12 * i, band, pull, view.states, stale, view.outcome, own, to_rule,
                        view.needs_me, view.done, view.seal_open)  # fmt: skip

    def counts(self):
        rows = self.rows(range(len(self.names)))
        counted = {"all": len(rows), "needs_me": sum(row.needs_me for row in rows)}
        counted["mine"] = len({name for name, _ in self.own})
        for check in CHECKS:
            counted[f"unresolved:{check}"] = sum(row.states[check] in {"open", "split", "todo"} for row in rows)
        return counted

    def find(self, text, substring=False, limit=-1):
        wanted = text.casefold()
        hits = [i for i, name in enumerate(self.names)
                if (wanted in name.casefold() if substring else name.casefold().startswith(wanted))]  # fmt: skip
        return array("q", hits if limit < 0 else hits[:limit])

    def id_of(self, name):
        if name not in self.names:
            raise UnknownNameError("candidate", name)
        return self.names.index(name)

    def name_of(self, candidate_id):
        return self.names[candidate_id]

    def next_for_me(self, skip=()):
        for row in self.rows(range(len(self.names))):
            if row.needs_me and row.name not in self.claims and row.name not in skip:
                return row.name
        return None

    def claim_next(self, skip=()):
        name = self.next_for_me(skip)
        if name is not None:
            self.claims.add(name)
        return name

    def claim(self, name):
        self.claims.add(name)
        return True

    def others_looking(self, name):
        return self.looking.get(name, [])

    def release_all(self):
        self.claims.clear()

    def put_off(self, name):
        self.later.add(name)

    def take_up(self, name):
        self.later.discard(name)

    def release(self, name):
        self.claims.discard(name)

    # --- one candidate ---

    def candidate(self, name):
        return make_candidate(name, self.id_of(name))

    def view(self, name):
        i = self.id_of(name)
        own = {check: self.own[name, check] for check in CHECKS if (name, check) in self.own}
        done = i % 10 == 2 or any(ruling.ruling == "explains" for ruling in own.values()) or len(own) == len(CHECKS)
        states = {check: own[check].ruling if check in own else "todo" for check in CHECKS}
        if i % 6 == 3:
            states["extinction"] = "nodata"
        outcome, reason = "sealed", ""
        if done:
            states |= {"star": "short", "blend": "split" if i % 20 == 2 else "open", "dust": "explains"}
            outcome, reason = ("pending", "split:blend") if i % 20 == 2 else ("explained", "")
        stale = {"blend": "W3 was measured anew: its pull moved from 1.2 to 3.4 sigma"} if i % 17 == 5 else {}
        needs = not done or i % 20 == 2
        drafts = {check: text for (of, check), text in self.drafts.items() if of == name and text}
        to_rule = tuple(check for check in CHECKS if check not in own and states[check] != "nodata")
        others = (self.other.get(name) or (other_rulings() if i % 20 == 2 else [])) if done else []
        cause = "dust" if outcome == "explained" else ""
        return CandidateView(name, states, stale, outcome, reason, done, done, needs, own, others, drafts,
                             cause=cause, to_rule=to_rule, own_history=own_rulings(own, i))  # fmt: skip

    def evidence(self, name, kinds=None):
        return self.stored_evidence(name)

    def stored_evidence(self, name):
        i = self.id_of(name)
        return {} if i % 23 == 7 else make_evidence(i)

    def cutouts(self, name):
        return []

    def dip_curves(self, name):
        return []

    def look_alikes(self, name, star=None):
        return None

    def curve(self, name, check, fit_index=0):
        wave = np.geomspace(0.3, 30, 200)
        total = wave**-3 / np.expm1(14387.77 / (wave * 5600.0))
        return SimpleNamespace(wave_um=wave, total_jy=total, components={"star": total * 0.9, "dust": total * 0.1})

    def probe(self, name, check, fixed, dropped=(), model=None):
        found = make_fit(model or "star + dust", self.id_of(name), 2.0)
        held = {key: replace(found.params[key], value=value) for key, value in fixed.items() if key in found.params}
        return replace(found, params={**found.params, **held}), self.curve(name, check)

    def band_info(self):
        return {band: Band(band, wave, "Vega", 1000.0, 0.02, "any", np.array([0.9, 1.1]) * wave, np.ones(2))
                for band, wave in PIVOT_UM.items()}  # fmt: skip

    # --- rulings ---

    def rule(self, name, check, ruling, note="", evidence_digest=None):
        if self.fail:
            raise self.fail
        view = self.view(name)
        made = Ruling(name, check, self.reviewer.id, ruling, note, evidence_digest or "", view.seal_open,
                      utc=FIXED_UTC, id=f"id-{len(self.log)}")  # fmt: skip
        self.log.append(made)
        if ruling == "withdrawn":
            self.own.pop((name, check), None)
        else:
            self.own[name, check] = made
        self.drafts.pop((name, check), None)
        return made

    def withdraw(self, name, check, note=""):
        return self.rule(name, check, "withdrawn", note)

    def draft(self, name, check):
        return self.drafts.get((name, check), "")

    def save_draft(self, name, check, text):
        self.drafts[name, check] = text

    def position(self):
        return self.place

    def save_position(self, name, check):
        self.place = (name, check)

    def story(self, name):
        return [
            StoryLine("2026-03-01T10:00:00.000000Z", "loaded", "archive", "", "10 bands and 5 facts"),
            StoryLine("2026-03-02T11:30:00.000000Z", "ruled", "heron", "star", "falls short: [/] \x1b[31m W3 is odd"),
            StoryLine("2026-03-03T09:15:00.000000Z", "corrected", "archive", "", "W3 measured anew", True),
        ]

    def tally(self):
        return self.tallied
