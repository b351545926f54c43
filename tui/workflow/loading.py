"""Create or extend a queue from tables: what can be taken is taken, the rest is listed."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import closing
from dataclasses import dataclass, field, fields
from typing import TYPE_CHECKING

from tui.store.candidates import save_candidates
from tui.store.connect import open_queue
from tui.store.records import LoadCounts, LoadRecord
from tui.workflow.basis import keep_bands, read_basis
from tui.workflow.clock import utc_now
from tui.workflow.safe_text import safe
from tui.workflow.vocabulary import packaged_vocabulary

if TYPE_CHECKING:
    import sqlite3

    from tui.readers.records import Refused, TableContents

Report = Callable[[int, int], None]
WORDS = {
    "candidates": "new candidates",
    "versions": "candidates with other facts",
    "measurements": "measurements",
    "corrections": "corrected measurements",
    "repeats": "repeated measurements",
    "side_tables": "sets of neighbours, dips or spectra",
    "cutouts": "cutouts",
}


@dataclass(frozen=True, slots=True)
class Sidecars:
    """Paths of what hangs on candidates that are in the queue already."""

    dips: tuple[str, ...] = ()
    neighbours: tuple[str, ...] = ()
    spectra: tuple[str, ...] = ()
    cutouts: str | None = None  # a folder


@dataclass(slots=True)
class Loaded:
    """What one load did."""

    path: str
    counts: dict[str, int] = field(default_factory=lambda: dict.fromkeys((*WORDS, "same"), 0))
    refused: list[Refused | str] = field(default_factory=list)
    remarks: list[str] = field(default_factory=list)

    def add(self, counts: LoadCounts) -> None:
        """Add the counts of one table."""
        for one in fields(counts):
            self.counts[one.name] += getattr(counts, one.name)

    def sentence(self) -> str:
        """One line for a person."""
        new = [f"{self.counts[name]} {word}" for name, word in WORDS.items() if self.counts[name]]
        known = f"{self.counts['same']} measurements were known" if self.counts["same"] else ""
        if not new:
            return f"{self.path}: nothing new" + (f"; {known}." if known else ".")
        return f"{self.path}: {', '.join(new)}." + (f" {known.capitalize()}." if known else "")


def load(
    path: str,
    tables: Sequence[str],
    *,
    columns: str | None = None,
    source: str | None = None,
    sidecars: Sidecars | None = None,
    report: Report | None = None,
) -> Loaded:
    """Load tables into a queue, made if there is none; the same again adds nothing.

    Every table is opened before the queue is made, so that a wrong path leaves nothing behind.

    Args:
        columns: path of a column map.
        source: label of the measurements, in place of the catalogue's name.
        report: called with candidates read and candidates known of.
    Raises:
        TableError: a table cannot be read at all; tables before it stay loaded.
        StoreError: the queue cannot be opened or written.
    """
    for table in (*tables, *side_paths(sidecars)):
        probe_file(table)
    done = Loaded(path)
    with closing(open_queue(path, create=bool(tables))) as connection:
        for table in tables:
            load_table(connection, table, columns, source, done, report)
        if sidecars and sidecars != Sidecars():
            from tui.workflow.side_tables import load_sidecars

            load_sidecars(connection, sidecars, columns, source, done)
    return done


def side_paths(sidecars: Sidecars | None) -> tuple[str, ...]:
    """Paths of the side tables."""
    return (*sidecars.dips, *sidecars.neighbours, *sidecars.spectra) if sidecars else ()


def probe_file(path: str) -> None:
    """OSError where a file cannot be opened for reading."""
    with open(path, "rb"):
        return


def load_table(
    connection: sqlite3.Connection,
    table: str,
    columns: str | None,
    source: str | None,
    done: Loaded,
    report: Report | None,
) -> None:
    """Load one table, part by part."""
    parts = table_parts(connection, table, columns, source)
    records = records_of(connection, parts, done, report)
    done.add(save_candidates(connection, records, utc_now()))


def table_parts(
    connection: sqlite3.Connection, table: str, columns: str | None, source: str | None
) -> Iterator[TableContents]:
    """What the reader makes of a table, with the queue's own bands known to it."""
    from tui.readers.tables import read_parts

    known = packaged_vocabulary()
    bands = {**known.bands, **read_basis(connection).user_bands}
    return read_parts(table, bands, known.aliases, known.facts, known.archives, columns=columns, source=source)


def records_of(
    connection: sqlite3.Connection, parts: Iterable[TableContents], done: Loaded, report: Report | None
) -> Iterator[LoadRecord]:
    """Records to save; refusals and remarks go to `done` as they are met."""
    read = 0
    for part in parts:
        if part.user_bands:
            keep_bands(connection, part.user_bands)
        for candidate in part.candidates:
            yield LoadRecord(candidate, part.source)
        done.refused += part.refused
        done.remarks += remarks_of(part)
        read += len(part.candidates)
        if report:
            report(read, read)


def remarks_of(part: TableContents) -> list[str]:
    """Unknown columns, listed once, and what the reader wants said."""
    unknown = [f"Columns not known and not loaded: {', '.join(part.unknown_columns)}."] if part.unknown_columns else []
    return [*unknown, *part.cautions]


def write_refused(path: str, refused: Iterable[Refused | str]) -> None:
    """List what was refused in a file, one line each."""
    with open(path, "w", encoding="utf-8", newline="\n") as stream:
        stream.writelines(f"{safe(one)}\n" for one in refused)
