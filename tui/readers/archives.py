"""What a public catalogue calls its columns: one small table a catalogue, in tui/data/archives/.

The head of such a table states, after `# source:`, `# from:`, `# changed:` and `# units:`:

`# label:`       the source label its measurements get
`# order:`       which catalogue takes a column that two could claim: the lower number
`# mark:`        columns that tell the catalogue: alternatives by commas, `a+b` where both must be there
`# null error:`  `detection`, or `limit at N`: what a magnitude or flux without an error is in this catalogue

The rows: `role,target,column,also,unit,how`. `column` is the archive's own name, `also` others that lie about (VizieR).

| role            | target       | how |
| --------------- | ------------ | --- |
| mag, flux       | band         |  |
| error, snr      | band         |  |
| over_error      | band         | value divided by its error |
| counts          | band         | `zero Z`: one count is a source of magnitude Z |
| counts_error    | band         |  |
| limit           | bands        | `U at 1.645`: these letters, one a band, mark an upper limit at that many sigma |
| detection       | bands        | `Z`: these letters, one a band, mark a detection of unknown error, no limit |
| upper           | band         | `at 3`: an upper limit at that many sigma, in use where the value is empty |
| flag            | bands        | `split`: one letter a band; else the whole text goes to each |
| epoch           | bands        | `MJD` or `JD`: put before the number |
| fact            | a fact       | `with C`: only where column C is there; `MJD`, `JD`: turned into a Julian year |
| name            |              | `prefix P`: names the candidate where no column `name` is |
| ignored         |              | known, of no use here: not listed as unknown |
"""

from __future__ import annotations

import csv
from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from tui.errors import InputError

ROLES = (
    "mag",
    "flux",
    "error",
    "snr",
    "over_error",
    "counts",
    "counts_error",
    "limit",
    "detection",
    "upper",
    "flag",
    "epoch",
    "fact",
    "name",
    "ignored",
)
FIELDS = ("role", "target", "column", "also", "unit", "how")
HEAD_KEYS = ("source", "from", "changed", "units", "label", "order", "mark", "null error")


@dataclass(frozen=True, slots=True)
class Entry:
    """One row of an archive table."""

    role: str
    targets: tuple[str, ...]  # bands, or one fact
    columns: tuple[str, ...]  # the archive's own name first
    unit: str = ""
    how: str = ""

    def option(self, word: str) -> str:
        """What follows `word` in `how`, "" where it does not begin so."""
        return self.how.removeprefix(word).strip() if self.how.startswith(word) else ""


@dataclass(frozen=True, slots=True)
class Archive:
    """A public catalogue as its table describes it."""

    label: str
    order: int
    marks: tuple[tuple[str, ...], ...]  # any of these sets of columns tells the catalogue
    null_error: float | None  # a null error means a limit at so many sigma; None: a detection without error
    entries: tuple[Entry, ...]

    @property
    def column_names(self) -> frozenset[str]:
        """Every column name this archive knows, those that are only conditions included."""
        conditions = {entry.option("with") for entry in self.entries} - {""}
        return frozenset(name for entry in self.entries for name in entry.columns) | conditions


def parse_archives(texts: Mapping[str, str]) -> tuple[Archive, ...]:
    """Archive tables by file name -> archives, in the order in which they claim columns.

    Raises:
        InputError: a table does not say what it must; the message names the file and the line.
    """
    return tuple(sorted((parse_archive(name, text) for name, text in texts.items()), key=lambda archive: archive.order))


def parse_archive(name: str, text: str) -> Archive:
    """One archive table.

    Raises:
        InputError: as `parse_archives`.
    """
    lines = text.splitlines()
    head = _head(name, lines)
    rows = csv.DictReader(line for line in lines if line and not line.startswith("#"))
    if tuple(rows.fieldnames or ()) != FIELDS:
        raise InputError(f"{name}: the columns must be {','.join(FIELDS)}.")
    entries = tuple(_entry(name, row) for row in rows)
    marks = tuple(tuple(mark.strip().split("+")) for mark in head["mark"].split(","))
    known = {column for entry in entries for column in entry.columns}
    for column in (column for mark in marks for column in mark):
        if column not in known:
            raise InputError(f"{name}: the mark {column} is in no row.")
    return Archive(head["label"], int(head["order"]), marks, _null_error(name, head["null error"]), entries)


def _head(name: str, lines: Iterable[str]) -> dict[str, str]:
    head: dict[str, str] = {}
    for line in lines:
        key, colon, value = line.removeprefix("#").partition(":")
        if line.startswith("#") and colon and key.strip() in HEAD_KEYS:
            head[key.strip()] = value.strip()
    missing = [key for key in HEAD_KEYS if not head.get(key)]
    if missing or not head["order"].isdigit():
        raise InputError(
            f"{name}: the head lacks a line {', '.join(f'# {key}:' for key in missing) or '# order: NUMBER'}."
        )
    return head


def _null_error(name: str, text: str) -> float | None:
    if text == "detection":
        return None
    try:
        return float(text.removeprefix("limit at "))
    except ValueError:
        raise InputError(f"{name}: null error is `detection` or `limit at N`, not {text!r}.") from None


def _entry(name: str, row: Mapping[str, str | None]) -> Entry:
    if None in row or None in row.values() or row["role"] not in ROLES or not row["column"]:
        raise InputError(
            f"{name}: the row {','.join(str(cell) for cell in row.values())} is none of {', '.join(ROLES)}."
        )
    columns = (row["column"].strip(), *(row["also"] or "").split())
    return Entry(
        str(row["role"]), tuple((row["target"] or "").split()), columns, str(row["unit"]), str(row["how"]).strip()
    )
