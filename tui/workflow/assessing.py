"""Compute evidence: only what lacks or is outdated, many candidates at a time, one chunk in memory at a time."""

from __future__ import annotations

import sqlite3
from collections import defaultdict
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from contextlib import closing
from dataclasses import dataclass, replace

from tui.errors import UnknownNameError
from tui.model import KINDS, Evidence
from tui.store import evidence as kept
from tui.store.candidates import candidate_digests, candidate_id, candidate_name, get_candidates, name_pages
from tui.store.connect import open_queue
from tui.workflow.basis import Basis, read_basis
from tui.workflow.compact import compact
from tui.workflow.digests import Recipe, recipes
from tui.workflow.processes import in_processes, spare_processes

CHUNK = 1024  # candidates computed at once: enough for the matrix products, small enough for memory
FEW = 2048  # below this starting processes costs more than it saves
Report = Callable[[int, int], None]
Task = tuple[tuple[str, ...], tuple[str, ...]]  # names, kinds that all of them lack
Made = list[tuple[str, Evidence]]


@dataclass(frozen=True, slots=True)
class Assessed:
    """What one assessment did."""

    candidates: int  # for which something was computed
    evidence: int  # pieces computed

    def sentence(self) -> str:
        """One line for a person."""
        if not self.candidates:
            return "All evidence is there and up to date."
        return f"Computed {self.evidence} pieces of evidence for {self.candidates} candidates."


def recipes_for(kinds: Iterable[str], basis: Basis) -> dict[str, Recipe]:
    """What each kind of evidence would be made with today. UnknownNameError for no such kind."""
    from tui.checks import VERSIONS

    wanted = tuple(kinds)
    for kind in wanted:
        if kind not in KINDS:
            raise UnknownNameError("kind of evidence", kind, f"There are {', '.join(KINDS)}.")
    available = tuple(kind for kind in wanted if kind in VERSIONS)
    return recipes(available, VERSIONS, basis.settings, basis.templates_digest())


def evidence_for(
    connection: sqlite3.Connection, name: str, kinds: Sequence[str], basis: Basis, *, store: bool = True
) -> dict[str, Evidence]:
    """Today's evidence of one candidate; what lacks or is outdated is computed and, with `store`, kept.

    Raises:
        UnknownNameError: no such candidate or kind.
    """
    made_with = recipes_for(kinds, basis)
    name = candidate_name(connection, candidate_id(connection, name))  # as the queue spells it
    input_digest = candidate_digests(connection, [name])[name]
    current = kept.current_evidence(connection, name)
    wanted = {kind: recipe.digest_of(input_digest) for kind, recipe in made_with.items()}
    found = {kind: current[kind] for kind in wanted if kind in current and current[kind].digest == wanted[kind]}
    lacking = tuple(kind for kind in wanted if kind not in found)
    if lacking:
        rows = compute(connection, (name,), lacking, basis, made_with)
        if store:
            kept.save_evidence(connection, rows)
        found |= {made.kind: made for _, made in rows}
    return {kind: found[kind] for kind in KINDS if kind in found}


def compute(
    connection: sqlite3.Connection,
    names: Sequence[str],
    kinds: tuple[str, ...],
    basis: Basis,
    made_with: Mapping[str, Recipe],
) -> Made:
    """Evidence of some kinds for some candidates, with its digest; nothing is stored.

    Digests are read before the candidates: were one loaded anew in between, its evidence would read outdated, and
    never current when it is not.
    """
    from tui.checks import assess_all
    from tui.workflow.spectral_grids import groups

    digests = candidate_digests(connection, names)
    return [
        (candidate.name, replace(compact(made), digest=made_with[kind].digest_of(digests[candidate.name])))
        for some, templates in groups(get_candidates(connection, names), basis)
        for candidate, by_kind in zip(
            some, assess_all(some, templates, basis.settings, kinds, basis.tables()), strict=True
        )
        for kind, made in by_kind.items()
    ]


def assess_queue(
    path: str, *, kinds: Iterable[str] = KINDS, jobs: int | None = None, report: Report | None = None
) -> Assessed:
    """Bring the evidence of a whole queue up to date; each chunk is saved when it is done.

    Args:
        jobs: processes; None: one for a short queue, else as many as there are processors.
        report: called with candidates done and candidates to do.
    Raises:
        StoreError: the queue cannot be opened or written.
        WorkerError: a process died.
    """
    with closing(open_queue(path)) as connection:
        basis = read_basis(connection)
        made_with = recipes_for(kinds, basis)
        total = lacking_count(connection, made_with)
        jobs = jobs or (spare_processes() if total > FEW else 1)
        candidates = pieces = 0
        for rows in results_of(path, connection, jobs, basis, made_with):
            kept.save_evidence(connection, rows)
            candidates, pieces = candidates + len({name for name, _ in rows}), pieces + len(rows)
            if report:
                report(candidates, total)
    return Assessed(candidates, pieces)


def results_of(
    path: str, connection: sqlite3.Connection, jobs: int, basis: Basis, made_with: Mapping[str, Recipe]
) -> Iterator[Made]:
    """Evidence for all that lacks some, chunk by chunk, computed here or in processes of their own."""
    if jobs == 1:
        for names, kinds in tasks(connection, made_with):
            yield compute(connection, names, kinds, basis, made_with)
        return
    basis.templates()  # so that the processes find them in the cache, and do not each build them
    yield from in_processes(work, tasks(connection, made_with), jobs, prepare, (path, basis, dict(made_with)))


def lacking_in(
    connection: sqlite3.Connection, names: Sequence[str], made_with: Mapping[str, Recipe]
) -> dict[str, tuple[str, ...]]:
    """Name -> the kinds of evidence that it lacks or that are outdated; complete ones are absent."""
    digests = candidate_digests(connection, names)
    wanted = {
        name: {kind: recipe.digest_of(digest) for kind, recipe in made_with.items()} for name, digest in digests.items()
    }
    return kept.outdated(connection, wanted)


def lacking_count(connection: sqlite3.Connection, made_with: Mapping[str, Recipe]) -> int:
    """How many candidates lack some evidence."""
    return sum(len(lacking_in(connection, names, made_with)) for names in name_pages(connection))


def tasks(connection: sqlite3.Connection, made_with: Mapping[str, Recipe]) -> Iterator[Task]:
    """What there is to compute: at most `CHUNK` candidates at a time, all of which lack the same kinds."""
    for names in name_pages(connection, CHUNK):
        by_kinds: dict[tuple[str, ...], list[str]] = defaultdict(list)
        for name, kinds in lacking_in(connection, names, made_with).items():
            by_kinds[kinds].append(name)
        for kinds, alike in by_kinds.items():
            yield tuple(alike), kinds


_bench: dict[str, tuple] = {}  # what one process works with; filled once by `prepare`


def prepare(path: str, basis: Basis, made_with: Mapping[str, Recipe]) -> None:
    """Make a process of its own ready: its connection, its grids."""
    basis.templates()
    _bench["with"] = (open_queue(path, write=False), basis, made_with)


def work(task: Task) -> Made:
    """Compute one task in a process of its own."""
    connection, basis, made_with = _bench["with"]
    names, kinds = task
    return compute(connection, names, kinds, basis, made_with)
