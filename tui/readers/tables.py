"""A candidate table of any kind, read as a whole or in parts."""

from __future__ import annotations

import os
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import replace

from tui.model import Band
from tui.readers.archives import Archive
from tui.readers.collector import collector_at_rest
from tui.readers.columnmap import read_column_map
from tui.readers.files import open_table
from tui.readers.long import LongReader, long_columns
from tui.readers.native import hint, native_columns
from tui.readers.recognise import Words, recognise
from tui.readers.records import FactRow, RawTable, Refused, TableContents
from tui.readers.wide import WideReader

PART_ROWS = 20_000  # rows of a wide table made into candidates at once
SHOWN_COLUMNS = 40  # unknown columns for which a likely name is looked up


def read_table(
    path: str | os.PathLike[str],
    bands: Mapping[str, Band],
    aliases: Mapping[str, str],
    facts: Mapping[str, FactRow],
    archives: Sequence[Archive],
    *,
    columns: str | os.PathLike[str] | None = None,
    source: str | None = None,
) -> TableContents:
    """All candidates of a table.

    Args:
        path: a VOTable, FITS, ECSV, CSV or TSV file, told by what lies in it.
        bands, aliases, facts: as tui/data/load.py gives them.
        archives: as `parse_archives` gives them.
        columns: path of a column map (TOML).
        source: label of the measurements, in place of the catalogue's name or the file's stem.
    Raises:
        TableError: the file or the column map cannot be read at all; the message names it and the mend.
    """
    parts = list(read_parts(path, bands, aliases, facts, archives, columns=columns, source=source))
    last = parts[-1]
    candidates = [candidate for part in parts for candidate in part.candidates]
    refused = [entry for part in parts for entry in part.refused]
    return TableContents(candidates, refused, last.unknown_columns, last.cautions, last.source, last.user_bands)


def without_arrays(table: RawTable, words: Words) -> RawTable:
    """The table, with what holds no plain cells said: refused where it is wanted by its name, else as a caution."""
    known = {name for archive in words.archives for name in archive.column_names} | set(words.facts)
    refused, cautions = list(table.refused), list(table.cautions)
    for name, held in table.unread.items():
        mend = f"the column holds {held}: give one plain number or text a row"
        if name in known or native_columns([name], words.bands, words.aliases, ""):
            refused.append(Refused(table.path, 0, name, mend))
        else:
            cautions.append(f"{table.path}: column {name} holds {held} and is not read")
    return replace(table, refused=tuple(refused), cautions=tuple(cautions))


def read_parts(
    path: str | os.PathLike[str],
    bands: Mapping[str, Band],
    aliases: Mapping[str, str],
    facts: Mapping[str, FactRow],
    archives: Sequence[Archive],
    *,
    columns: str | os.PathLike[str] | None = None,
    source: str | None = None,
    size: int = PART_ROWS,
) -> Iterator[TableContents]:
    """As `read_table`, some `size` rows at a time, so that a million rows need not be held at once.

    Each part holds its own candidates and refusals; unknown columns and cautions come with the last.
    A long table is one part.
    """
    column_map = read_column_map(columns)
    words = Words({**bands, **column_map.bands}, aliases, facts, archives, column_map, source or "")
    table = without_arrays(open_table(path), words)
    label = words.label(table.path)
    if (long := long_columns(table, words)) is not None:
        reader = LongReader(table, long, words)
        with collector_at_rest():
            found = reader.candidates()
        yield TableContents(found, reader.refused, reader.unknown, reader.cautions, label, column_map.bands)
        return
    plan = recognise(table, words)
    wide = WideReader(table, plan)
    if not plan.bands and (plan.unknown or not plan.facts):  # a table of facts alone is what it is
        wide.cautions.append(f"{table.path}: no column of any band was recognised")
    for part in wide.parts(size):
        refused, wide.refused = sorted(wide.refused, key=lambda entry: entry.row), []
        yield TableContents(part, refused, [], [], label, column_map.bands)
    known = [f"{band}_mag" for band in words.bands] + list(facts)
    likely = [(name, hint(name, known)) for name in plan.unknown[:SHOWN_COLUMNS]]
    hints = [f"{name} is not read; {near} would be" for name, near in likely if near]
    yield TableContents(
        [], wide.refused, list(plan.unknown), [*wide.closing_cautions(), *hints], label, column_map.bands
    )
