"""VOTable: read by astropy, once the file is seen to ask for nothing outside itself.

A VOTable may name a stream elsewhere and define entities that grow without end; neither is ever followed.
"""

from __future__ import annotations

import mmap
import re
import warnings
from pathlib import Path
from typing import Any

import numpy as np

from tui.errors import TableError
from tui.readers.records import Column, RawTable

PLACE = re.compile(r"(?:^|:)(\d+):\d+:")
FOREIGN = (
    (re.compile(rb"<!ENTITY"), "defines entities, which no table needs"),
    (
        re.compile(rb"<(?:[\w.-]+:)?STREAM\b[^>]*\bhref\b"),
        "keeps its rows in another file or on another machine: save it in one file",
    ),
    (re.compile(rb"\x00"), "holds NUL bytes: save it as UTF-8"),
)


def read_votable(path: str) -> RawTable:
    """The first table with rows.

    Raises:
        TableError: it is no VOTable, is damaged, or asks for something outside itself.
    """
    from astropy.io.votable import parse

    _refuse_foreign(path)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        try:
            tables = [table for table in parse(path, verify="ignore").iter_tables() if table.fields]
        except Exception as error:  # the XML and VOTable readers raise many kinds
            raise TableError(path, f"the VOTable is damaged{_place(error)}.") from error
    filled = [table for table in tables if len(table.array)]
    if not tables:
        raise TableError(path, "the VOTable holds no table.")
    table = (filled or tables)[0]
    columns, unread = _columns(path, table)
    cautions = (f"{path}: only the first of {len(filled)} tables was read",) if len(filled) > 1 else ()
    return RawTable(path, columns, np.arange(1, len(table.array) + 1), (), cautions, unread)


def _refuse_foreign(path: str) -> None:
    with Path(path).open("rb") as file, mmap.mmap(file.fileno(), 0, access=mmap.ACCESS_READ) as text:
        for pattern, reason in FOREIGN:
            if pattern.search(text):
                raise TableError(path, f"the VOTable {reason}.")


def _place(error: Exception) -> str:
    """Where the reader stopped, which its complaint begins with: "FILE:LINE:COLUMN: ..." or "LINE:COLUMN: ..."."""
    found = PLACE.search(str(error))
    return f" at line {found[1]}" if found else ""


def _columns(path: str, table: Any) -> tuple[dict[str, Column], dict[str, str]]:
    """Columns of plain cells, and what the others hold."""
    columns: dict[str, Column] = {}
    unread: dict[str, str] = {}
    for field, key in zip(table.fields, table.array.dtype.names, strict=True):
        name = field.name or field.ID
        if name in columns:
            raise TableError(path, f"two columns are called {name!a}: rename one.")
        cells = table.array[key]
        column = _column(name, cells, str(field.unit) if field.unit is not None else "")
        if column is not None:
            columns[name] = column
        else:
            unread[name] = "complex numbers" if cells.dtype.kind == "c" else "arrays"
    return columns, unread


def _column(name: str, cells: Any, unit: str) -> Column | None:
    """One column; None for arrays in cells."""
    values = np.ma.getdata(cells)
    mask = np.ma.getmaskarray(cells)
    if values.ndim != 1 or mask.ndim != 1:
        return None
    if values.dtype.kind in "OSU":
        if any(isinstance(value, (np.ndarray, list, tuple)) for value in values[:50]):
            return None
        texts = [_text(value) for value in values.tolist()]
        return Column(
            name, ["" if hidden else text for text, hidden in zip(texts, mask.tolist(), strict=True)], None, unit
        )
    if values.dtype.kind not in "biuf":
        return None
    if values.dtype.kind == "f":
        mask = mask | np.isnan(values)
    return Column(name, np.array(values), mask, unit)


def _text(value: object) -> str:
    if isinstance(value, bytes):
        return value.decode("utf-8", "replace")
    return "" if value is None else str(value)
