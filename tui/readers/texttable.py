"""CSV, TSV and ECSV: rows cut by the csv module, the head of an ECSV file read by astropy.

A row with too few or too many cells is refused alone; astropy's own reader would give up the whole file.
"""

from __future__ import annotations

import csv
import io
import itertools
import re
import warnings
from collections.abc import Iterator
from pathlib import Path

import numpy as np

from tui.errors import TableError
from tui.readers.records import Column, RawTable, Refused

LONGEST_HEAD = 2_000_000  # characters of an ECSV head
MOST_COLUMNS = 5_000
BLOCK_ROWS = 20_000  # rows cut before their cells are packed
TEXT = np.dtypes.StringDType()
ECSV_HEAD = re.compile(r"#\s*%ECSV\b")
UNIT_IN_NAME = re.compile(r"^(?P<name>[^\[\]]*\S)\s*\[(?P<unit>[^\[\]]+)\]$")


def read_text(path: str) -> RawTable:
    """The one table of a text file.

    Raises:
        TableError: it is not UTF-8, holds NUL bytes, has no head, or its quotes do not close.
    """
    text = _decoded(path)
    comments, body = _split_comments(text)
    if ECSV_HEAD.match(text.lstrip("\n")):
        delimiter, units = _ecsv_head(path, comments)
    else:
        delimiter, units = _delimiter(path, body), {}
    cut = _Cutter(path, body, delimiter)
    return RawTable(path, _columns(cut, units), np.array(cut.numbers, dtype=np.int64), tuple(cut.refused))


def _decoded(path: str) -> str:
    raw = Path(path).read_bytes()
    if raw.startswith((b"\xff\xfe", b"\xfe\xff")):
        raise TableError(path, "the text is UTF-16: save it as UTF-8.")
    if (at := raw.find(b"\0")) >= 0:
        line = raw.count(b"\n", 0, at) + 1
        raise TableError(
            path, f"line {line} holds a NUL byte: this is no text table (VOTable, FITS, ECSV, CSV or TSV)."
        )
    try:
        return raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = raw.count(b"\n", 0, error.start) + 1
        raise TableError(path, f"line {line} is not UTF-8 text: save the file as UTF-8.") from error


def _split_comments(text: str) -> tuple[list[str], str]:
    """The comment lines before the head, and the rest."""
    start, comments = 0, []
    while start < len(text) and (text.startswith("#", start) or text.startswith(("\n", "\r"), start)):
        end = text.find("\n", start)
        end = len(text) if end < 0 else end + 1
        comments.append(text[start:end].rstrip("\r\n"))
        start = end
    return comments, text[start:]


def _delimiter(path: str, body: str) -> str:
    """Comma, tab or semicolon: the one that cuts the head into most cells."""
    head = body.split("\n", 1)[0]
    if not head.strip():
        raise TableError(path, "there is no line of column names.")
    return max(",\t;", key=head.count)


def _ecsv_head(path: str, comments: list[str]) -> tuple[str, dict[str, str]]:
    """The delimiter and the units of an ECSV head."""
    from astropy.table import meta

    lines = [line.removeprefix("#").removeprefix(" ") for line in comments if line]
    yaml_lines = [line for line in lines[1:] if line != "---"]
    if sum(map(len, lines)) > LONGEST_HEAD:
        raise TableError(path, "the ECSV head is longer than any honest table needs.")
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            head = meta.get_header_from_yaml(yaml_lines)
        fields = [(_plain(field["name"]), _plain(field.get("unit") or "")) for field in head["datatype"]]
        delimiter = _plain(head.get("delimiter", " "))
    except Exception as error:  # the YAML reader raises what it likes; it loads plain values only
        raise TableError(path, "the ECSV head is damaged: it must name every column and its datatype.") from error
    if delimiter not in (" ", ","):
        raise TableError(path, "an ECSV table is cut by blanks or commas, this one is not.")
    return delimiter, dict(fields)


def _plain(value: object) -> str:
    """A YAML value as text; a collection, which may be of any size once written out, is none.

    Raises:
        TypeError: it is a collection.
    """
    if isinstance(value, (list, tuple, dict, set)):
        raise TypeError(type(value).__name__)
    return str(value)


class _Cutter:
    """Cuts a text into columns, some rows at a time: cells packed by numpy take a third of what Python's texts do."""

    def __init__(self, path: str, body: str, delimiter: str) -> None:
        self.path = path
        blanks = delimiter == " "
        self.reader = csv.reader(io.StringIO(body, newline=""), delimiter=delimiter, skipinitialspace=blanks)
        self.numbers: list[int] = []
        self.refused: list[Refused] = []
        try:
            self.head = [name.strip() for name in next(self.reader, [])]
            while blanks and self.head and not self.head[-1]:
                self.head.pop()
            self.cells = self._cut() if 0 < len(self.head) <= MOST_COLUMNS and any(self.head) else []
        except csv.Error as error:
            why = (
                f"a cell is longer than {csv.field_size_limit()} characters"
                if "field limit" in str(error)
                else "the rows cannot be cut into cells"
            )
            where = f"near line {self.reader.line_num}"
            raise TableError(path, f"{where} {why}: look for a quote that does not close.") from error
        if not self.cells:
            raise TableError(path, f"there are {len(self.head)} column names: no table was recognised.")

    def _cut(self) -> list[np.ndarray]:
        """One array of texts a column."""
        packed: list[list[np.ndarray]] = [[np.array([], dtype=TEXT)] for _ in self.head]
        rows = self._fitting_rows()
        while block := list(itertools.islice(rows, BLOCK_ROWS)):
            for parts, texts in zip(packed, zip(*block, strict=True), strict=True):
                parts.append(np.array(texts, dtype=TEXT))
        return [np.concatenate(parts) for parts in packed]

    def _fitting_rows(self) -> Iterator[list[str]]:
        """Rows as long as the head; the others are refused."""
        width, number = len(self.head), 0
        for row in self.reader:
            if not row:
                continue
            number += 1
            if len(row) > width and not any(row[width:]):
                row = row[:width]  # blanks or delimiters at the end of the line
            if len(row) == width:
                self.numbers.append(number)
                yield row
            elif any(row):
                reason = f"the row has {len(row)} cells, the head {width}"
                self.refused.append(Refused(self.path, number, "name", reason))


def _columns(cut: _Cutter, units: dict[str, str]) -> dict[str, Column]:
    columns: dict[str, Column] = {}
    for name, texts in zip(cut.head, cut.cells, strict=True):
        unit = units.get(name, "")
        if not units and (match := UNIT_IN_NAME.match(name)):
            name, unit = match["name"], match["unit"]
        if name in columns:
            raise TableError(cut.path, f"two columns are called {name!a}: rename one.")
        if name:
            columns[name] = Column(name, texts, None, unit)
    return columns
