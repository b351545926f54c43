"""One reader, or one reviewer, at one queue: everything the desk and the commands do with an open queue."""

from __future__ import annotations

import os
import sqlite3
from array import array
from collections.abc import Callable, Iterable, Mapping, Sequence
from contextlib import AbstractContextManager
from itertools import count
from typing import TYPE_CHECKING

from tui.errors import HandleError, StoreError, UnknownNameError
from tui.model import CHECKS, KINDS, Band, Candidate, Evidence, Fit, Reviewer, Ruling, Settings
from tui.store import candidates, claims, connect, drafts, evidence, reviewers, rulings, views
from tui.store.stopping import while_wanted
from tui.workflow.basis import read_basis
from tui.workflow.clock import utc_now
from tui.workflow.records import CandidateView, Cutout, Filter, QueueRow, StoryLine

if TYPE_CHECKING:
    from tui.checks import Curve
    from tui.workflow.dip_curves import DipCurve
    from tui.workflow.lookalikes import LookAlikeFinder, LookAlikes
    from tui.workflow.tally_record import Tally

_numbers = count()
READ_ONLY = "read only: nothing can be ruled or kept"
JOIN_HINT = "Join first: plainlight join QUEUE HANDLE."


class Session:
    """An open queue, seen with the eyes of one reviewer or, without a handle, of nobody.

    Not to be shared between threads: each takes its own with `clone()`. Reading never reveals what the seal
    covers: every view asks the store as `reviewer`.
    """

    def __init__(
        self,
        path: str,
        connection: sqlite3.Connection,
        reviewer: Reviewer | None,
        write: bool,
        read_only: bool = False,
    ) -> None:
        self.path = path
        self.reviewer = reviewer
        self.connection = connection
        self.write = write
        self.read_only = read_only  # the file may not be written here: nothing can be ruled or kept
        self.basis = read_basis(connection)
        self._read_at = connect.data_version(connection)
        self._number = next(_numbers)
        self._alike: dict[str, LookAlikeFinder] = {}  # the one finder, once asked for; shared with the clones

    # --- opening and closing ---

    @classmethod
    def open(cls, path: str, handle: str | None = None, *, write: bool = True) -> Session:
        """Open an existing queue; `handle` must have joined it.

        A file that may only be read is opened for reading, and the session is `read_only`: evidence is computed
        and not kept, nothing is claimed, and a ruling is refused.

        Raises:
            HandleError: nobody joined under `handle`.
            StoreError: no such file, no queue, newer than the program, or on a network filesystem.
        """
        read_only = write and os.path.exists(path) and not connect.is_writable(path)
        write = write and not read_only
        connection = connect.open_queue(path, write=write)
        try:
            reviewer = reviewer_named(connection, handle) if handle else None
            return cls(path, connection, reviewer, write, read_only)
        except BaseException:
            connection.close()
            raise

    def clone(self) -> Session:
        """The same reader on a connection of its own, for another thread.

        Raises:
            StoreError: the queue was moved, deleted or replaced since it was opened.
        """
        connect.refuse_moved(self.connection)
        connection = connect.open_queue(self.path, write=self.write)
        connection.on_wait = getattr(self.connection, "on_wait", None)
        other = Session(self.path, connection, self.reviewer, self.write, self.read_only)
        other._alike = self._alike
        return other

    def on_wait(self, hook: Callable[[str], None] | None) -> None:
        """Have `hook` told, in the waiting thread, when a wait for another program lasts more than two seconds.

        Clones made afterwards tell it too. The text is a sentence without its full stop.
        """
        connect.listen(hook, self.connection)

    def close(self) -> None:
        """Close the connection; the session is of no use afterwards."""
        self.connection.close()

    def __enter__(self) -> Session:
        return self

    def __exit__(self, *exc_info: object) -> None:
        self.close()

    def data_version(self) -> int:
        """A number that changes when another connection has written to the queue."""
        return connect.data_version(self.connection)

    def follow_settings(self) -> None:
        """Read the basis anew if another connection has written since it was read."""
        version = self.data_version()
        if version != self._read_at:
            self.basis, self._read_at = read_basis(self.connection), version

    @property
    def settings(self) -> Settings:
        """The settings as last read."""
        return self.basis.settings

    @property
    def reader_id(self) -> str | None:
        """The reviewer's id, or None for a reader without a handle."""
        return self.reviewer.id if self.reviewer else None

    # --- the queue ---

    def while_wanted(self, is_wanted: Callable[[], bool]) -> AbstractContextManager[None]:
        """Within it a long question that nobody waits for any more ends early, with StoreError."""
        return while_wanted(self.connection, is_wanted)

    def order(
        self, sort: str = "oddness", descending: bool = True, where: Filter | None = None, limit: int | None = None
    ) -> array[int]:
        """Ids of the candidates that `where` lets through, in order, as this reader may know it; the first `limit`."""
        return views.view_order(
            self.connection, self.reader_id, sort=sort, descending=descending, where=where or Filter(), limit=limit
        )

    def rows(self, ids: Sequence[int]) -> list[QueueRow]:
        """One row for each id, in the order asked."""
        return views.view_rows(self.connection, self.reader_id, ids)

    def counts(self) -> dict[str, int]:
        """How many candidates each filter would show this reader."""
        return views.view_counts(self.connection, self.reader_id)

    def reviewers(self) -> list[Reviewer]:
        """Everyone who joined, by handle."""
        return reviewers.reviewers(self.connection)

    def find(self, text: str, substring: bool = False, limit: int = -1) -> array[int]:
        """Ids of the candidates whose name starts with `text` (the first `limit`; -1: all), or that hold it."""
        if substring:
            return views.find_substring(self.connection, text)
        return views.find_prefix(self.connection, text, limit)

    def id_of(self, name: str) -> int:
        """The id of a candidate in this file. UnknownNameError if there is none of that name."""
        return candidates.candidate_id(self.connection, name)

    def name_of(self, candidate_id: int) -> str:
        """The name of a candidate of this file."""
        return candidates.candidate_name(self.connection, candidate_id)

    def next_for_me(self, skip: Iterable[str] = ()) -> str | None:
        """The candidate that needs this reviewer most and is on nobody's screen; None when nothing does."""
        return views.next_for(self.connection, self.needed_reviewer().id, utc_now(), frozenset(skip))

    def claim_next(self, skip: Iterable[str] = ()) -> str | None:
        """The same, and claimed at once, so that two people never get one candidate."""
        if self.read_only:
            return self.next_for_me(skip)
        return claims.claim_next(self.connection, self.needed_reviewer().id, utc_now(), frozenset(skip))

    def claim(self, name: str) -> bool:
        """Say that this reviewer is looking at `name`, for 15 minutes; whether nobody else is."""
        if self.read_only:
            return True
        return claims.claim(self.connection, name, self.needed_reviewer().id, utc_now())

    def release(self, name: str) -> None:
        """Say that this reviewer no longer looks at `name`."""
        if not self.read_only:
            claims.release(self.connection, name, self.needed_reviewer().id)

    def release_all(self) -> None:
        """Say that this reviewer looks at nothing any more."""
        if not self.read_only:
            claims.release_all(self.connection, self.needed_reviewer().id)

    def others_looking(self, name: str) -> list[str]:
        """Handles of the others who are looking at a candidate now."""
        return claims.others_looking(self.connection, name, self.reader_id, utc_now())

    def put_off(self, name: str) -> None:
        """Come back to a candidate later: it is offered after all others."""
        claims.put_off(self.connection, self.needed_reviewer().id, name)

    def take_up(self, name: str) -> None:
        """Undo `put_off`."""
        claims.take_up(self.connection, self.needed_reviewer().id, name)

    def put_off_names(self) -> list[str]:
        """What this reviewer put off, by name."""
        return claims.put_off_names(self.connection, self.needed_reviewer().id)

    # --- one candidate ---

    def candidate(self, name: str) -> Candidate:
        """What was measured of a candidate."""
        return candidates.get_candidate(self.connection, name)

    def cutouts(self, name: str) -> list[Cutout]:
        """A candidate's pictures, by band; the first row of an image is its lowest."""
        from tui.store.sides import cutouts

        return cutouts(self.connection, name)

    def view(self, name: str) -> CandidateView:
        """Where a candidate stands, as far as this reader may know."""
        return views.standing_for(self.connection, self.reader_id, name)

    def stored_evidence(self, name: str) -> dict[str, Evidence]:
        """The evidence kept in the queue, which may be outdated; computes nothing."""
        return evidence.current_evidence(self.connection, name)

    def evidence(self, name: str, kinds: Sequence[str] = KINDS) -> dict[str, Evidence]:
        """Today's evidence: what lacks or is outdated is computed and stored first."""
        from tui.workflow import assessing

        self.follow_settings()
        return assessing.evidence_for(self.connection, name, kinds, self.basis, store=self.write)

    def curve(self, name: str, check: str, fit_index: int = 0) -> Curve | None:
        """The spectrum of one of a check's fits, by component; None where the check fitted nothing."""
        from tui.workflow import probing

        return probing.fit_curve(self.candidate(name), self.evidence(name, (check,))[check], fit_index, self.basis)

    def probe(
        self,
        name: str,
        check: str,
        fixed: Mapping[str, float],
        dropped: Iterable[str] = (),
        model: str | None = None,
    ) -> tuple[Fit, Curve]:
        """A fit of `check`, of one model where it is named, with some parameters fixed and bands dropped, and its curve."""
        from tui.workflow import probing

        return probing.probe(self.candidate(name), check, fixed, frozenset(dropped), self.basis, model)

    def dip_curves(self, name: str) -> list[DipCurve]:
        """Depth against wavelength of every model fitted to the candidate's dips."""
        from tui.workflow.dip_curves import dip_curves

        dips = self.evidence(name, ("dips",)).get("dips")
        return dip_curves(self.candidate(name), dips, self.settings.law, self.band_info())

    def look_alikes(self, name: str, star: Evidence | None = None) -> LookAlikes | None:
        """Candidates of this queue whose pulls share a pattern with this one's; None where it has no pulls.

        Slow the first time on a long queue (some 2 s at 100,000 candidates); what was read is kept for all clones.

        Args:
            star: today's star evidence of the candidate; None: as `evidence` gives it.
        """
        from tui.workflow.lookalikes import LookAlikeFinder

        star = star or self.evidence(name, ("star",)).get("star")
        finder = self._alike.setdefault("finder", LookAlikeFinder())
        place = candidates.candidate_id(self.connection, name)
        seen = (self._number, self.data_version(), self.connection.total_changes)
        own = (place, candidates.candidate_name(self.connection, place))
        return finder.find(self.connection, seen, own, star, self.band_info())

    def candidate_count(self) -> int:
        """How many candidates the queue has."""
        return candidates.candidate_count(self.connection)

    def band_info(self) -> Mapping[str, Band]:
        """Every band by name: pivot wavelength, beam, saturation and so on."""
        return self.basis.bands()

    # --- rulings ---

    def rule(
        self, name: str, check: str, ruling: str, note: str = "", evidence_digest: str | None = None
    ) -> Ruling:
        """Record this reviewer's ruling; it is in the file when this returns.

        Args:
            evidence_digest: of the evidence on screen; None computes lacking evidence first and cites that.
        Raises:
            UnknownNameError: no such candidate, check or ruling.
            StoreError: refused by the rules of the log, or the file may only be read, or it is no longer there.
        """
        reviewer = self.needed_reviewer()
        if self.read_only:
            raise StoreError(f"{self.path} is {READ_ONLY}. Copy it to a folder you may write to, and gather the copy.")
        if evidence_digest is None:
            evidence_digest = self.digest_to_cite(name, check) if ruling != "withdrawn" else ""
        made = Ruling(
            candidate=name,
            check=check,
            reviewer_id=reviewer.id,
            ruling=ruling,
            note=note,
            evidence_digest=evidence_digest,
            utc=utc_now(),
        )
        return rulings.append_ruling(self.connection, made)

    def digest_to_cite(self, name: str, check: str) -> str:
        """Digest of today's evidence on a check, computed first where it lacks."""
        if check not in CHECKS:
            raise UnknownNameError("check", check, f"The checks are {', '.join(CHECKS)}.")
        found = self.evidence(name, (check,)).get(check)
        return found.digest if found else ""

    def withdraw(self, name: str, check: str, note: str = "") -> Ruling:
        """Take back this reviewer's ruling on `check`. StoreError when there is none to take back."""
        return self.rule(name, check, "withdrawn", note)

    def draft(self, name: str, check: str) -> str:
        """The note this reviewer was typing on `check`, or ''."""
        return drafts.draft(self.connection, self.needed_reviewer().id, name, check)

    def save_draft(self, name: str, check: str, text: str) -> None:
        """Keep a note that is being typed; '' forgets it."""
        if not self.read_only:
            drafts.save_draft(self.connection, self.needed_reviewer().id, name, check, text)

    def position(self) -> tuple[str, str] | None:
        """Candidate and check this reviewer was last at."""
        return drafts.position(self.connection, self.needed_reviewer().id)

    def save_position(self, name: str, check: str) -> None:
        """Keep where this reviewer is, to resume there."""
        if not self.read_only:
            drafts.save_position(self.connection, self.needed_reviewer().id, name, check)

    def story(self, name: str) -> list[StoryLine]:
        """What happened to a candidate, in time order, as far as this reader may know."""
        return views.story(self.connection, self.reader_id, name)

    def tally(self, now: str | None = None) -> Tally:
        """The team's standing, naming only candidates whose seal is open to this reader.

        Args:
            now: UTC to which days of quiet are counted; None: this moment.
        """
        from tui.store.team import open_to
        from tui.workflow import tallying

        found = tallying.tally(self.connection, self.settings, now=now or utc_now())
        return found.seen_by(open_to(self.connection, self.reviewer.id) if self.reviewer else ())

    def has_ruled(self) -> bool:
        """Whether this reviewer ever ruled anything in this queue."""
        return bool(self.reviewer) and self.counts()["mine"] > 0

    def receipt(self) -> str:
        """What this reviewer takes away on leaving; `plainlight audit --receipt` checks it later.

        Raises:
            StoreError: the queue was moved, deleted or replaced while open, so that no receipt would hold.
        """
        from tui.store.audit import receipt

        connect.refuse_moved(self.connection, "no receipt is given for what nobody would find again")
        return receipt(self.connection, self.needed_reviewer().id)

    def needed_reviewer(self) -> Reviewer:
        """The reviewer; HandleError for a reader without a handle."""
        if self.reviewer is None:
            raise HandleError("", f"This needs a handle. {JOIN_HINT}")
        return self.reviewer


def reviewer_named(connection: sqlite3.Connection, handle: str) -> Reviewer:
    """The reviewer who joined under `handle`; HandleError, saying how to join, if nobody did."""
    found = reviewers.reviewer_by_handle(connection, handle)
    if found is None:
        raise HandleError(handle, f"Nobody joined this queue as {handle!r}. {JOIN_HINT}")
    return found
