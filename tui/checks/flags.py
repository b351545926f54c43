"""Catalogue flags in plain words: what each value means for a band, and whether it can change the flux."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from tui.checks.doubts import INFORMATIVE, SUSPICION, Doubt
from tui.errors import InputError
from tui.model import Candidate

ANY_BAND = "*"
TESTS = ("is", "above", "bit", "hex")
BAND_LETTERS = {
    "W1": "w1", "W2": "w2", "W3": "w3", "W4": "w4", "J": "j", "H": "h", "Ks": "k",
    "PS1_g": "g", "PS1_r": "r", "PS1_i": "i", "PS1_z": "z", "PS1_y": "y",
}  # fmt: skip
HEX_DIGITS = frozenset("0123456789ABCDEF")
LONGEST_WORD = 25  # digits of a word of flag bits; 64 bits need 20
ANY_CASE = ("Gaia", "the table")  # catalogues whose codes are words
EMPTY_TEXTS = ("", "nan", "none", "null", "--")
BLEND_SHARES = {"bp": "Gaia_BP", "rp": "Gaia_RP"}


@dataclass(frozen=True, slots=True)
class FlagRow:
    """One value of one flag and what it means."""

    catalogue: str
    columns: tuple[str, ...]  # names the column has in different services; "?" stands for the band's letter
    bands: tuple[str, ...]
    test: str  # "is" a code, "above" a bound, has the "bit", or has it in one "hex" digit
    value: str
    meaning: str
    cause: str
    severity: str
    source: str


@dataclass(frozen=True, slots=True)
class FlagReading:
    """What one flag says of one band."""

    band: str
    column: str
    text: str
    meaning: str
    cause: str = ""
    severity: str = INFORMATIVE
    catalogue: str = ""
    source: str = ""

    def as_doubt(self) -> Doubt:
        """The reading as evidence about its band."""
        return Doubt(self.band, "flag", f"{self.catalogue} {self.column} {self.text}: {self.meaning}", self.severity)

    def as_dict(self) -> dict[str, str]:
        """As the evidence stores it."""
        return {
            "band": self.band, "column": self.column, "value": self.text, "meaning": self.meaning,
            "cause": self.cause, "severity": self.severity, "catalogue": self.catalogue,
        }  # fmt: skip


@dataclass(frozen=True, slots=True, eq=False)
class FlagTable:
    """All meanings, found by column and band."""

    rows: Mapping[tuple[str, str], tuple[FlagRow, ...]]
    bands_of: Mapping[str, tuple[str, ...]]  # column -> bands it speaks of
    said: dict[tuple[str, str, str], tuple[FlagReading, ...]] = field(default_factory=dict)  # codes read before

    def find(self, column: str, band: str) -> tuple[FlagRow, ...]:
        """Rows for a column as the catalogue names it: `w1sat` of W1 is `w?sat`."""
        own = self.rows.get((column, band)) or self.rows.get((generic_column(column, band), band), ())
        return own + self.rows.get((column, ANY_BAND), ())


def flag_table(rows: Sequence[Mapping[str, str]]) -> FlagTable:
    """The table held by the rows of the packaged table `flags`.

    Raises:
        InputError: a row has an unknown test or severity.
    """
    found: dict[tuple[str, str], list[FlagRow]] = {}
    for row in rows:
        flag = FlagRow(
            row["catalogue"], tuple(row["column"].split()), tuple(row["bands"].split()), row["test"], row["value"],
            row["meaning"], row["cause"], row["severity"], row["source"],
        )  # fmt: skip
        if flag.test not in TESTS or flag.severity not in (INFORMATIVE, SUSPICION):
            raise InputError(f"Flag {row['column']}: unknown test {flag.test!r} or severity {flag.severity!r}.")
        for column in flag.columns:
            for band in flag.bands:
                found.setdefault((column, band), []).append(flag)
    bands_of: dict[str, tuple[str, ...]] = {}
    for column, band in found:
        bands_of[column] = (*bands_of.get(column, ()), band)
    return FlagTable({key: tuple(value) for key, value in found.items()}, bands_of)


def generic_column(column: str, band: str) -> str:
    """Column name with the band's letter replaced by "?".

    >>> generic_column("w1sat", "W1"), generic_column("j_psfchi", "J"), generic_column("ph_qual", "J")
    ('w?sat', '?_psfchi', 'ph_qual')
    """
    letter = BAND_LETTERS.get(band, "")
    if letter and (column.startswith(letter + "_") or (len(letter) == 2 and column.startswith(letter))):
        return "?" + column[1:] if len(letter) == 1 else "w?" + column[2:]
    return column


def read_flag(column: str, band: str, text: Any, table: FlagTable) -> tuple[FlagReading, ...]:
    """Meanings of one flag of one band; empty where the value is missing or the column is not a flag."""
    key = (column, band, text if isinstance(text, str) else str(text))
    if key in table.said:
        return table.said[key]
    rows = table.find(column, band)
    readings = _readings(column, band, plain_text(text), rows)
    if rows and all(row.test == "is" for row in rows) and len(key[2]) <= 2:  # codes are few, numbers are not
        table.said[key] = readings
    return readings


def _readings(column: str, band: str, value: str, rows: tuple[FlagRow, ...]) -> tuple[FlagReading, ...]:
    if value.lower() in EMPTY_TEXTS or not rows:
        return ()
    said = [row for row in rows if row_holds(row, value)]
    if not said:
        return () if any(row.test != "is" for row in rows) else (_unknown(column, band, value, rows[0]),)
    if said[0].test == "above":
        said = said[:1]  # bounds are listed from the highest down
    return tuple(
        FlagReading(band, column, value, row.meaning, row.cause, row.severity, row.catalogue, row.source)
        for row in said
    )


def _unknown(column: str, band: str, text: str, row: FlagRow) -> FlagReading:
    meaning = "a value that the documentation we read does not list"
    return FlagReading(band, column, text, meaning, "unknown value", INFORMATIVE, row.catalogue, row.source)


def plain_text(value: Any) -> str:
    """A flag's value as text: whole numbers without a point, no blanks, no digits that only rounding made.

    >>> plain_text(" 2.0"), plain_text("h"), plain_text(2**63 + 1)  # no bit of a long word is lost
    ('2', 'h', '9223372036854775809')
    >>> plain_text(9 * 0.1)
    '0.9'
    """
    text = f"{value:.12g}" if isinstance(value, float) else str(value).strip()
    if text.isdecimal():
        return str(int(text)) if len(text) < LONGEST_WORD else text
    try:
        number = float(text)
    except ValueError:
        return text
    return str(int(number)) if math.isfinite(number) and number == int(number) else text


def row_holds(row: FlagRow, text: str) -> bool:
    """Whether the flag's text passes the row's test; words are taken in either case."""
    if row.test == "is":
        return text == row.value or (row.catalogue in ANY_CASE and text.lower() == row.value)
    if row.test == "bit":
        return text.isdecimal() and len(text) < LONGEST_WORD and bool(int(text) & int(row.value))
    if row.test == "hex":
        return text.upper() in HEX_DIGITS and bool(int(text, 16) & int(row.value))
    try:
        return float(text) > float(row.value)
    except ValueError:
        return False


def candidate_flags(candidate: Candidate, table: FlagTable) -> tuple[FlagReading, ...]:
    """Readings of all flags of a candidate: of its measurements and of its facts, each said once."""
    readings: dict[tuple[str, str, str], FlagReading] = {}
    for band, column, text in _flag_texts(candidate, table):
        for reading in read_flag(column, band, text, table):
            readings.setdefault((band, reading.catalogue, reading.meaning), reading)
    return tuple(readings.values())


def _flag_texts(candidate: Candidate, table: FlagTable) -> Iterable[tuple[str, str, Any]]:
    measured = {m.band for m in candidate.measurements}
    for measurement in candidate.measurements:
        for column, text in measurement.flags.items():
            yield measurement.band, column, text
    facts = {**candidate.facts, **blend_shares(candidate.facts)}
    for column, value in facts.items():
        if value is not None and column in table.bands_of:
            yield from ((band, column, value) for band in table.bands_of[column] if band in measured)


def blend_shares(facts: Mapping[str, Any]) -> dict[str, float]:
    """Shares of Gaia's BP and RP transits that are blended or contaminated, from the counts of transits."""
    shares = {}
    for letter in BLEND_SHARES:
        total = facts.get(f"phot_{letter}_n_obs")
        for word in ("blended", "contaminated"):
            count = facts.get(f"phot_{letter}_n_{word}_transits")
            if total and count is not None:
                shares[f"{letter}_{word}_share"] = round(float(count) / float(total), 3)
    return shares
