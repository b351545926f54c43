"""Write the vetted list as ECSV, FITS, VOTable or CSV: whole or not at all."""

from __future__ import annotations

import contextlib
import csv
import json
import os
import tempfile
from collections.abc import Callable, Iterator, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any, TextIO

import numpy as np

from tui.errors import InputError, TableError
from tui.workflow.export_row import INT_NULL, Cells
from tui.workflow.file_errors import named
from tui.workflow.safe_text import safe

if TYPE_CHECKING:
    from astropy.table import Table

RISKY_STARTS = ("=", "+", "-", "@", "\t", "\r", "\n", "\uff1d", "\uff0b", "\uff0d", "\uff20")
INERT = "'"
INERT_REMARK = (
    "a text cell that begins with = + - @, a tab or a line end would be run by a spreadsheet: "
    f"it has {INERT} put before it"
)
UTF8_REMARK = "text columns are UTF-8 bytes"


def write_list(path: str, cells: Cells, meta: Mapping[str, Any], *, force: bool) -> None:
    """Write one file in the format that its ending names.

    Args:
        meta: JSON values.
    Raises:
        InputError: an ending of no known format, or the file exists and `force` is false.
    """
    writer = writer_for(path)
    with named(path), replacing(path, force) as place:
        writer(place, cells, meta)


def writer_for(path: str) -> Callable[..., None]:
    """The writer of a path's ending. InputError naming the endings there are."""
    writers = {".ecsv": write_ecsv, ".fits": write_fits, ".vot": write_votable, ".csv": write_csv}
    ending = Path(path).suffix.lower()
    if ending not in writers:
        raise InputError(f"{path}: the ending says the format; use one of {' '.join(writers)}.")
    return writers[ending]


def refuse_existing(path: str, force: bool) -> None:
    """InputError where writing would replace a file unasked."""
    if not force and os.path.lexists(path):
        raise InputError(f"{path} exists already. Add --force to replace it, or choose another name.")


@contextlib.contextmanager
def replacing(path: str, force: bool) -> Iterator[str]:
    """A scratch path beside `path` that takes its place when the block ends well, and vanishes when it does not."""
    refuse_existing(path, force)
    target = Path(path)
    if not target.parent.is_dir():
        raise TableError(path, f"there is no folder {target.parent}.")
    try:
        handle, scratch = tempfile.mkstemp(prefix=f".{target.name[:60]}.", suffix=target.suffix, dir=target.parent)
    except OSError as error:
        raise OSError(error.errno, error.strerror, path) from error
    os.close(handle)
    try:
        yield scratch
        settle(scratch, path, force)
    finally:
        with contextlib.suppress(FileNotFoundError):
            os.unlink(scratch)


def settle(scratch: str, path: str, force: bool) -> None:
    """Put the finished file in place, on the disk before it is named, with the permissions of any new file."""
    with open(scratch, "rb") as written:
        os.fsync(written.fileno())
    mask = os.umask(0)
    os.umask(mask)
    os.chmod(scratch, 0o666 & ~mask)
    if not force:
        claim_name(path)
    os.replace(scratch, path)


def claim_name(path: str) -> None:
    """Make `path` ours as an empty file. InputError where someone else made it meanwhile."""
    try:
        os.close(os.open(path, os.O_CREAT | os.O_EXCL | os.O_WRONLY, 0o666))
    except FileExistsError:
        refuse_existing(path, force=False)


def as_table(cells: Cells, meta: Mapping[str, Any], clean: Callable[[str], str] = str) -> Table:
    """The list as an astropy table with units, descriptions, UCDs and masks; texts go through `clean`."""
    from astropy.table import Column, MaskedColumn, Table

    made = Table(meta=dict(meta))
    for column in cells.columns:
        values, mask = cells.column(column, clean)
        about = {"name": column.name, "unit": column.unit or None, "description": column.description}
        one = MaskedColumn(values, mask=mask, **about) if mask.any() else Column(values, **about)
        if mask.any() and column.kind is int:
            one.fill_value = INT_NULL
        one.meta["ucd"] = column.ucd
        made.add_column(one, copy=False)
    return made


def write_ecsv(place: str, cells: Cells, meta: Mapping[str, Any]) -> None:
    """Enhanced character-separated values, comma between cells."""
    as_table(cells, meta).write(place, format="ascii.ecsv", delimiter=",", overwrite=True)


def write_votable(place: str, cells: Cells, meta: Mapping[str, Any]) -> None:
    """VOTable with a UCD, unit and description on each field; the metadata as INFO elements."""
    from astropy.io.votable import from_table
    from astropy.io.votable.tree import Info

    document = from_table(as_table(cells, {}, clean=safe))  # XML cannot hold control characters
    resource = document.resources[0]
    resource.description = safe(meta.get("caution", ""))
    for name, text in meta_lines(meta):
        resource.infos.append(Info(name=name, value=safe(text)))
    document.to_xml(place)


def write_fits(place: str, cells: Cells, meta: Mapping[str, Any]) -> None:
    """A FITS binary table: units, descriptions as TCOMMn, UCDs as TUCDn, the metadata as HISTORY lines."""
    from astropy.io import fits

    made = as_table(cells, {})
    for name in made.colnames:
        if made[name].dtype.kind == "U":
            made[name] = encoded(made[name])
    table = fits.table_to_hdu(made)
    table.name = "VETTED"
    for number, column in enumerate(cells.columns, start=1):
        table.header[f"TCOMM{number}"] = column.description
        table.header[f"TUCD{number}"] = column.ucd
    for name, text in (*meta_lines(meta), ("text", UTF8_REMARK)):
        table.header.add_history(ascii_text(f"{name}: {text}"))
    fits.HDUList([fits.PrimaryHDU(), table]).writeto(place, overwrite=True)


def encoded(column: Any) -> Any:
    """A text column as UTF-8 bytes, for FITS holds no other text; its mask is kept."""
    from astropy.table import MaskedColumn

    raw = np.char.encode(np.asarray(column.filled("") if hasattr(column, "filled") else column, dtype=np.str_), "utf-8")
    return MaskedColumn(raw, mask=getattr(column, "mask", None), name=column.name, description=column.description)


def ascii_text(text: str) -> str:
    """Text for a FITS header, which holds printable ASCII alone; the rest is escaped."""
    return safe(text).encode("ascii", "backslashreplace").decode("ascii")


def write_csv(place: str, cells: Cells, meta: Mapping[str, Any]) -> None:
    """Comma-separated values under lines that begin with #; numbers keep every digit, empty where masked."""
    with open(place, "w", encoding="utf-8", newline="") as stream:
        write_csv_head(stream, cells, meta)
        rows = csv.writer(stream, lineterminator="\n")
        rows.writerow([column.name for column in cells.columns])
        for values in cells.rows():
            rows.writerow([csv_cell(value) for value in values])


def write_csv_head(stream: TextIO, cells: Cells, meta: Mapping[str, Any]) -> None:
    """The metadata, and unit and meaning of each column, as lines that begin with #."""
    for name, text in (*meta_lines(meta), ("text", INERT_REMARK)):
        stream.write(f"# {name}: {safe(text)}\n")
    for column in cells.columns:
        unit = f" [{column.unit}]" if column.unit else ""
        stream.write(f"# column {column.name}{unit}: {column.description}\n")


def csv_cell(value: Any) -> str:
    """A cell: every digit of a number, a text that no spreadsheet runs.

    >>> csv_cell(0.1), csv_cell(-3), csv_cell(None), csv_cell("=1+1")
    ('0.1', '-3', '', "'=1+1")
    """
    if value is None:
        return ""
    if isinstance(value, str):
        return INERT + value if value.startswith(RISKY_STARTS) else value
    return repr(float(value)) if isinstance(value, (float, np.floating)) else str(int(value))


def meta_lines(meta: Mapping[str, Any]) -> list[tuple[str, str]]:
    """The metadata as name and text; what is not text is written as JSON."""
    texts = (value if isinstance(value, str) else json.dumps(value, ensure_ascii=True) for value in meta.values())
    return list(zip(meta, texts, strict=True))
