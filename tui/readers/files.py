"""Opens one file, by what lies in it and not by its name, as a raw table."""

from __future__ import annotations

import os
import stat
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

from tui.errors import TableError, reason_of
from tui.readers.cells import truths
from tui.readers.collector import collector_at_rest
from tui.readers.fitstable import read_fits
from tui.readers.records import RawTable
from tui.readers.texttable import read_text
from tui.readers.votable import read_votable

HEAD_BYTES = 4096
OTHERS = {
    b"\x1f\x8b": "is compressed with gzip: unpack it first (gunzip)",
    b"BZh": "is compressed with bzip2: unpack it first (bunzip2)",
    b"\xfd7zXZ": "is compressed with xz: unpack it first (unxz)",
    b"PK\x03\x04": "is a zip archive or a spreadsheet: save the table as CSV, ECSV, FITS or VOTable",
    b"SQLite format 3": "is an SQLite file, not a table; to take in another queue use gather",
    b"PAR1": "is Parquet: save the table as FITS, VOTable, ECSV or CSV",
    b"\x89HDF": "is HDF5: save the table as FITS, VOTable, ECSV or CSV",
    b"%PDF": "is a PDF: save the table as CSV, ECSV, FITS or VOTable",
}


def open_table(path: str | os.PathLike[str]) -> RawTable:
    """All columns of the first table in a file of any known form.

    Raises:
        TableError: the file cannot be opened, is of no known form, is damaged or hostile.
    """
    shown = os.fspath(path)
    head = _head(shown)
    for magic, reason in OTHERS.items():
        if head.startswith(magic):
            raise TableError(shown, f"the file {reason}.")
    try:
        with collector_at_rest():
            return with_masks(_reader(head)(shown))
    except MemoryError as error:
        raise TableError(shown, "the table needs more memory than there is: split it.") from error
    except OSError as error:
        raise TableError(shown, f"the file cannot be read: {reason_of(error)}.") from error


def _reader(head: bytes) -> Callable[[str], RawTable]:
    if head.startswith(b"SIMPLE  ="):
        return read_fits
    begins = head.removeprefix(b"\xef\xbb\xbf").lstrip()
    return read_votable if begins.startswith((b"<?xml", b"<VOTABLE", b"<!--", b"<!DOCTYPE")) else read_text


def with_masks(table: RawTable) -> RawTable:
    """The table with astropy's `X.mask` columns, where there are some, made the masks of the columns `X`."""
    columns = dict(table.columns)
    for name in table.columns:
        base = name.removesuffix(".mask")
        if base != name and base in columns:
            hidden, bad = truths(columns.pop(name))
            if bad:
                raise TableError(table.path, f"column {name} must hold true or false only.")
            own = columns[base].mask
            columns[base] = replace(columns[base], mask=hidden if own is None else hidden | own)
    return replace(table, columns=columns)


def _head(shown: str) -> bytes:
    try:
        mode = os.stat(shown).st_mode
        if not stat.S_ISREG(mode):
            what = "a directory" if stat.S_ISDIR(mode) else "no regular file"
            raise TableError(shown, f"this is {what}: name a table (VOTable, FITS, ECSV, CSV, TSV).")
        with Path(shown).open("rb") as file:
            head = file.read(HEAD_BYTES)
    except (OSError, ValueError) as error:
        if isinstance(error, TableError):
            raise
        raise TableError(shown, f"the file cannot be opened: {reason_of(error)}.") from error
    if not head.strip():
        raise TableError(shown, "the file is empty.")
    return head
