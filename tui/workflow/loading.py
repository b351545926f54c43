"""Create or extend a queue from tables: what can be taken is taken, the rest is listed."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import closing
from dataclasses import dataclass, field, fields
from pathlib import Path
from typing import TYPE_CHECKING

from tui.errors import StoreError
from tui.store.candidates import candidate_count, save_candidates
from tui.store.connect import open_queue, read_header
from tui.store.records import LoadCounts, LoadRecord
from tui.workflow.basis import keep_bands, read_basis
from tui.workflow.clock import utc_now
from tui.workflow.counting import counted
from tui.workflow.file_errors import named
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
    found: int = 0  # candidates, side tables' entries and pictures that could be read, new or not
    is_unmade: bool = False  # nothing could be taken, and the queue that this load had begun was taken away again

    def add(self, counts: LoadCounts) -> None:
        """Add the counts of one table."""
        for one in fields(counts):
            self.counts[one.name] += getattr(counts, one.name)

    def sentence(self) -> str:
        """One line for a person."""
        same = self.counts["same"]
        new = [counted(self.counts[name], word) for name, word in WORDS.items() if self.counts[name]]
        known = f"{counted(same, 'measurements')} {'was' if same == 1 else 'were'} known" if same else ""
        if self.is_unmade:
            return f"{self.path} was not made: there is nothing to put into it."
        if not new and not self.found:
            return f"{self.path}: " + ("nothing could be taken." if self.refused else "nothing was found to load.")
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
    is_new = not os.path.lexists(path)
    try:
        load_all(path, tables, columns, source, sidecars, done, report)
    finally:
        done.is_unmade = is_new and took_away_empty(path)
    return done


def load_all(
    path: str,
    tables: Sequence[str],
    columns: str | None,
    source: str | None,
    sidecars: Sidecars | None,
    done: Loaded,
    report: Report | None,
) -> None:
    """Load tables, then what hangs on candidates, into a queue that is made where there is none."""
    with closing(open_queue(path, create=bool(tables))) as connection:
        for table in tables:
            load_table(connection, table, columns, source, done, report)
        if sidecars and sidecars != Sidecars():
            from tui.workflow.side_tables import load_sidecars

            load_sidecars(connection, sidecars, columns, source, done)


def took_away_empty(path: str) -> bool:
    """Take away a queue file that a load has made and put nothing into; whether it did."""
    if not os.path.lexists(path):
        return False
    if os.path.getsize(path):  # a full disk leaves one without a byte, or without a table
        try:
            header = read_header(path)
            if header is None or (header.user_version and holds_candidates(path)):
                return False
        except StoreError:
            return False
    for name in (path, f"{path}-wal", f"{path}-shm", f"{path}-journal"):
        Path(name).unlink(missing_ok=True)
    return True


def side_paths(sidecars: Sidecars | None) -> tuple[str, ...]:
    """Paths of the side tables."""
    return (*sidecars.dips, *sidecars.neighbours, *sidecars.spectra) if sidecars else ()


def probe_file(path: str) -> None:
    """OSError where a file cannot be opened for reading."""
    with open(path, "rb"):
        return


def holds_candidates(path: str) -> bool:
    """Whether there is anything in a queue to work on."""
    with closing(open_queue(path, write=False)) as connection:
        return candidate_count(connection) > 0


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
    before = done.found + len(done.refused)
    records = records_of(connection, parts, done, report)
    done.add(save_candidates(connection, records, utc_now()))
    if done.found + len(done.refused) == before:
        done.remarks.append(f"{table}: the table has no rows.")


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
        done.found += len(part.candidates)
        if report:
            report(read, read)


def remarks_of(part: TableContents) -> list[str]:
    """Unknown columns, listed once, and what the reader wants said."""
    unknown = [f"Columns not known and not loaded: {', '.join(part.unknown_columns)}."] if part.unknown_columns else []
    return [*unknown, *part.cautions]


def write_refused(path: str, refused: Iterable[Refused | str]) -> None:
    """List what was refused in a file, one line each. OSError that names the file where it cannot be written."""
    with named(path), open(path, "w", encoding="utf-8", newline="\n") as stream:
        stream.writelines(f"{safe(one)}\n" for one in refused)
