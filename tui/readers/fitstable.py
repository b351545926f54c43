"""FITS: the first table extension with rows, read by astropy once its header is held against the file's size."""

from __future__ import annotations

import os
import warnings
from typing import Any

import numpy as np

from tui.errors import TableError
from tui.readers.records import Column, RawTable

MOST_FIELDS = 5_000


def read_fits(path: str) -> RawTable:
    """The first table with rows.

    Raises:
        TableError: there is none, or the file is shorter than its headers say.
    """
    from astropy.io import fits

    size = os.path.getsize(path)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        try:
            with fits.open(path, memmap=True, lazy_load_hdus=True, ignore_missing_simple=False) as hdus:
                found, others = _first_table(path, hdus, size)
                columns, unread = _columns(path, found)
        except TableError:
            raise
        except Exception as error:  # a damaged header makes astropy raise almost anything
            raise TableError(path, f"the FITS file is damaged or cut short.") from error
    if not columns and unread:
        named = ", ".join(unread)[:80]
        raise TableError(path, f"every column holds arrays or complex numbers ({named}): give plain cells.")
    rows = len(next(iter(columns.values())).cells) if columns else 0
    cautions = (f"{path}: only the first of {others + 1} tables was read",) if others else ()
    return RawTable(path, columns, np.arange(1, rows + 1), (), cautions, unread)


def _first_table(path: str, hdus: Any, size: int) -> tuple[Any, int]:
    """The table extension to read and the count of further ones."""
    found, others = None, 0
    for hdu in hdus:
        header = hdu.header
        if (
            header.get("XTENSION", "").strip() not in ("BINTABLE", "TABLE")
            or header.get("ZIMAGE")
            or header.get("ZTABLE")
        ):
            continue
        promised = header.get("NAXIS1", 0) * header.get("NAXIS2", 0) + header.get("PCOUNT", 0)
        begins = hdu.fileinfo()["datLoc"] if hdu.fileinfo() else 0
        if promised < 0 or begins + promised > size:
            raise TableError(path, f"the header promises {promised} bytes, the file ends before them: it is cut short.")
        if header.get("TFIELDS", 0) > MOST_FIELDS:
            raise TableError(path, f"the table has {header['TFIELDS']} columns: no honest one has.")
        if header.get("NAXIS2", 0) == 0 and found is None:
            found = hdu
        elif found is None or found.header["NAXIS2"] == 0:
            found = hdu
        else:
            others += 1
    if found is None:
        raise TableError(path, "the FITS file holds no table extension.")
    return found, others


def _columns(path: str, hdu: Any) -> tuple[dict[str, Column], dict[str, str]]:
    """Columns of plain cells, and what the others hold."""
    columns: dict[str, Column] = {}
    unread: dict[str, str] = {}
    for definition in hdu.columns:
        name = definition.name.strip()
        if name in columns:
            raise TableError(path, f"two columns are called {name!a}: rename one.")
        if definition.format.lstrip("0123456789")[:1] in ("P", "Q"):
            unread[name] = "arrays"  # of their own length in each row: nothing this program reads
            continue
        cells = hdu.data[definition.name]
        column = _column(name, cells, definition)
        if column is not None:
            columns[name] = column
        else:
            unread[name] = "complex numbers" if cells.dtype.kind == "c" else "arrays"
    return columns, unread


def _column(name: str, cells: Any, definition: Any) -> Column | None:
    """One column; None for arrays in cells, which are no column of ours."""
    if isinstance(cells, np.ndarray) and cells.ndim != 1:
        return None
    unit = str(definition.unit or "")
    if cells.dtype.kind in "SU":
        return Column(name, _texts(cells), None, unit)
    values = np.array(cells)  # a copy in memory: the file may change or close
    if values.dtype.kind not in "biuf":
        return None
    values = values.astype(values.dtype.newbyteorder("="))
    null = definition.null
    mask = values == null if null not in (None, "") and values.dtype.kind in "iu" else None
    if values.dtype.kind == "f":
        mask = np.isnan(values)
    return Column(name, values, mask, unit)


def _texts(cells: Any) -> list[str]:
    values = cells.tolist()
    return [value.decode("utf-8", "replace") if isinstance(value, bytes) else str(value) for value in values]
