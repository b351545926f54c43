"""Load what hangs on candidates already in the queue: dips, neighbours, spectra, cutouts."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

from tui.model import Band, Candidate
from tui.store.candidates import ids_of, save_candidates
from tui.store.records import LoadRecord
from tui.workflow.basis import read_basis
from tui.workflow.clock import utc_now
from tui.workflow.vocabulary import Vocabulary, packaged_vocabulary

if TYPE_CHECKING:
    from tui.readers.records import SideContents
    from tui.readers.windows import Windows
    from tui.workflow.loading import Loaded, Sidecars

FIELDS = ("dips", "neighbours", "spectra")
ON_CANDIDATE = {"dips": "dips", "neighbours": "neighbours", "spectra": "spectrum"}


def load_sidecars(
    connection: sqlite3.Connection, sidecars: Sidecars, columns: str | None, source: str | None, done: Loaded
) -> None:
    """Load every side table; what names no candidate of the queue is refused.

    Raises:
        TableError: a side table cannot be read at all.
    """
    bands = {**packaged_vocabulary().bands, **read_basis(connection).user_bands}
    windows, dips = windows_apart(sidecars.dips, bands, columns)
    for kind in FIELDS:
        for path in dips if kind == "dips" else getattr(sidecars, kind):
            found = read_side(kind, path, bands, columns, source, windows)
            records = side_records(connection, kind, path, found, source, done)
            done.add(save_candidates(connection, records, utc_now()))
    done.refused += [*windows.refused, *windows.unreached()]
    if sidecars.cutouts:
        from tui.workflow.pictures import load_cutouts

        load_cutouts(connection, sidecars.cutouts, bands, done)


def windows_apart(
    paths: tuple[str, ...], bands: Mapping[str, Band], columns: str | None
) -> tuple[Windows, list[str]]:
    """The event windows among the tables of dips, whatever their order, and the tables of dips that are left."""
    from tui.readers.windows import Windows, read_windows

    if len(paths) < 2:  # windows alone give no depth: such a table is read, and refused, as one of dips
        return Windows(), list(paths)
    return read_windows(paths, bands, packaged_vocabulary().aliases, columns=columns)


def read_side(
    kind: str,
    path: str,
    bands: Mapping[str, Band],
    columns: str | None,
    source: str | None,
    windows: Windows | None = None,
) -> SideContents:
    """What the reader makes of one side table."""
    from tui.readers import sides

    known: Vocabulary = packaged_vocabulary()
    if kind == "dips":
        return sides.read_dips(path, bands, known.aliases, columns=columns, windows=windows)
    if kind == "neighbours":
        return sides.read_neighbours(
            path, bands, known.aliases, known.facts, known.archives, columns=columns, source=source
        )
    return sides.read_spectra(path, columns=columns)


def side_records(
    connection: sqlite3.Connection, kind: str, path: str, found: SideContents, source: str | None, done: Loaded
) -> Iterator[LoadRecord]:
    """Records to save; refusals and remarks go to `done`."""
    label = source or Path(path).stem
    done.refused += found.refused
    if found.unknown_columns:
        done.remarks.append(f"{path}: columns not known and not loaded: {', '.join(found.unknown_columns)}.")
    done.remarks += found.cautions
    done.found += len(found.rows)
    if not found.rows and not found.refused:
        done.remarks.append(f"{path}: the table has no rows.")
    known = ids_of(connection, found.rows)
    for name, rows in found.rows.items():
        if name in known:
            part: dict[str, Any] = {ON_CANDIDATE[kind]: rows}
            yield LoadRecord(Candidate(name, **part), label)
        else:
            done.refused.append(f"{path}: no candidate {name!r} is in the queue; load its table first.")
