"""CSV, TSV and ECSV: rows cut by the csv module, the head of an ECSV file read by astropy.

A row with too few or too many cells is refused alone; astropy's own reader would give up the whole file.
"""

from __future__ import annotations

import csv
import io
import re
import warnings
from pathlib import Path

import numpy as np

from tui.errors import TableError
from tui.readers.records import Column, RawTable, Refused

LONGEST_HEAD = 2_000_000  # characters of an ECSV head
MOST_COLUMNS = 5_000
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
    head, rows, numbers, refused = _rows(path, body, delimiter)
    return RawTable(path, _columns(path, head, rows, units), np.array(numbers, dtype=np.int64), tuple(refused))


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
        raise TableError(path, f"the ECSV head cannot be read ({type(error).__name__}).") from error
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


def _rows(path: str, body: str, delimiter: str) -> tuple[list[str], list[list[str]], list[int], list[Refused]]:
    """The head, the rows that fit it, their numbers, and those that do not."""
    reader = csv.reader(
        io.StringIO(body, newline=""), delimiter=delimiter, skipinitialspace=delimiter == " ", strict=False
    )
    rows: list[list[str]] = []
    numbers: list[int] = []
    refused: list[Refused] = []
    number = 0
    try:
        head = [name.strip() for name in next(reader, [])]
        while delimiter == " " and head and not head[-1]:
            head.pop()
        width = len(head)
        for row in reader:
            if not row:
                continue
            number += 1
            if len(row) > width and not any(row[width:]):
                row = row[:width]  # blanks or delimiters at the end of the line
            if len(row) == width:
                rows.append(row)
                numbers.append(number)
            elif any(row):
                reason = f"the row has {len(row)} cells, the head {width}"
                refused.append(Refused(path, number, "name", reason))
    except csv.Error as error:
        raise TableError(path, f"near line {reader.line_num} the rows cannot be cut into cells ({error}).") from error
    return head, rows, numbers, refused


def _columns(path: str, head: list[str], rows: list[list[str]], units: dict[str, str]) -> dict[str, Column]:
    if not any(head) or len(head) > MOST_COLUMNS:
        raise TableError(path, f"there are {len(head)} column names: no table was recognised.")
    cells = list(zip(*rows, strict=True)) if rows else [()] * len(head)
    columns: dict[str, Column] = {}
    for name, texts in zip(head, cells, strict=True):
        unit = units.get(name, "")
        if not units and (match := UNIT_IN_NAME.match(name)):
            name, unit = match["name"], match["unit"]
        if name in columns:
            raise TableError(path, f"two columns are called {name!a}: rename one.")
        if name:
            columns[name] = Column(name, texts, None, unit)
    return columns
