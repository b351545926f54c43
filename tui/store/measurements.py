"""Which of the measurements on file are today's, and what a further one is to them.

Rows are only added. Of the rows with one band, source and epoch the newest is the measurement, the
others its past versions. The same band, epoch, value and error under another source is the same
measurement, whoever came first; any other source or epoch is a repeat, and all repeats are today's.
"""

from __future__ import annotations

import hashlib
import json
import math
import sqlite3
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

from tui.errors import InputError
from tui.model import Measurement

COLUMNS = (
    "band, source, epoch, digest, value, value_error, unit, flux_jy, error_jy, is_limit, nsigma, flags, exclude, note"
)
SAME_STEPS = 1e9  # of flux and error: other units, same measurement, differ by rounding in the last bits only
SORTED = json.JSONEncoder(sort_keys=True)
COMPACT = json.JSONEncoder(sort_keys=True, separators=(",", ":"), allow_nan=False)


@dataclass(frozen=True, slots=True)
class Row:
    """One row of the table `measurement`."""

    utc: str  # of its load
    load_id: int
    digest: str
    measurement: Measurement

    @property
    def key(self) -> tuple[str, str, str]:
        """What one measurement and all its versions share."""
        return self.measurement.band, self.measurement.source, self.measurement.epoch


class Series:
    """All rows of one candidate; `verdict` says what a further measurement would be, `current` which are today's."""

    def __init__(self, rows: Iterable[Row] = ()) -> None:
        self.newest: dict[tuple[str, str, str], Row] = {}
        self.bands: set[str] = set()
        self.digests: set[str] = set()
        self.owners: dict[tuple[Any, ...], str] = {}  # what was measured -> the source that had it first
        for row in sorted(rows, key=lambda row: (row.utc, row.measurement.source, row.digest)):
            what = measured(row.measurement)
            if self.verdict(row.measurement, row.digest, what) != "same":
                self.add(row, what)

    def verdict(self, measurement: Measurement, digest: str, what: tuple[Any, ...]) -> str:
        """What it is to the rows there: `same`, `correction`, `repeat` or `new`; `what` is `measured` of it."""
        owner = self.owners.get(what, measurement.source)
        if digest in self.digests or owner != measurement.source:
            return "same"
        if (measurement.band, measurement.source, measurement.epoch) in self.newest:
            return "correction"
        return "repeat" if measurement.band in self.bands else "new"

    def add(self, row: Row, what: tuple[Any, ...]) -> None:
        """Take in a row that is not the same as an earlier one."""
        self.newest[row.key] = row
        self.bands.add(row.measurement.band)
        self.digests.add(row.digest)
        self.owners.setdefault(what, row.measurement.source)

    def current(self) -> list[Row]:
        """Today's measurements, by band, source and epoch."""
        return [self.newest[key] for key in sorted(self.newest)]


def measured(measurement: Measurement) -> tuple[Any, ...]:
    """What makes two measurements the same one under two labels."""
    return (
        measurement.band,
        measurement.epoch,
        rounded(measurement.flux_jy),
        rounded(measurement.error_jy),
        bool(measurement.limit),
    )


def rounded(value: float) -> tuple[int, int] | None:
    """A number to the precision that tells measurements apart; NaN is equal to NaN here."""
    if not math.isfinite(value):
        return None
    mantissa, exponent = math.frexp(value)
    return round(mantissa * SAME_STEPS), exponent


def measurement_values(measurement: Measurement) -> tuple[Any, ...]:
    """The values of `COLUMNS`, the digest among them; NaN becomes NULL.

    Raises:
        InputError: a flux that is not finite, or a band without a name.
    """
    if not math.isfinite(measurement.flux_jy):
        raise InputError(f"The flux in {measurement.band or 'a band'} is not a finite number; leave it out.")
    if not measurement.band:
        raise InputError("A measurement needs a band; this one has none.")
    flags = SORTED.encode({str(key): str(text) for key, text in measurement.flags.items()})
    rest = (
        finite(measurement.value),
        finite(measurement.value_error),
        measurement.unit,
        finite(measurement.flux_jy),
        finite(measurement.error_jy),
        int(measurement.limit),
        float(measurement.nsigma),
        flags,
        int(measurement.exclude),
        measurement.note,
    )
    key = (measurement.band, measurement.source, measurement.epoch)
    return (*key, short_digest([*key, *rest]), *rest)


def finite(value: float) -> float | None:
    """A number, a zero without sign, or None where it is NaN or infinite.

    >>> finite(-0.0), finite(math.nan), finite(-2)
    (0.0, None, -2.0)
    """
    return float(value) + 0.0 if math.isfinite(value) else None


def short_digest(value: Any) -> str:
    """The first 128 bits of the SHA-256 of a value's JSON text, 32 hex digits."""
    return hashlib.sha256(COMPACT.encode(value).encode("ascii")).hexdigest()[:32]


def from_row(row: Sequence[Any]) -> Row:
    """One row of `SELECT load.utc, load_id, COLUMNS`."""
    utc, load_id, band, source, epoch, digest, value, value_error, unit, flux_jy, error_jy, *rest = row
    is_limit, nsigma, flags, exclude, note = rest
    measurement = Measurement(
        band=band,
        flux_jy=flux_jy,
        error_jy=math.nan if error_jy is None else error_jy,
        limit=bool(is_limit),
        nsigma=nsigma,
        source=source,
        epoch=epoch,
        flags=json.loads(flags) if flags != "{}" else {},
        exclude=bool(exclude),
        value=math.nan if value is None else value,
        value_error=math.nan if value_error is None else value_error,
        unit=unit,
        note=note,
    )
    return Row(utc, load_id, digest, measurement)


def all_series(connection: sqlite3.Connection, ids: Sequence[int]) -> dict[int, Series]:
    """The rows of several candidates, in one query."""
    rows: dict[int, list[Row]] = {}
    marks = ", ".join("?" * len(ids))
    query = (
        f"SELECT candidate_id, load.utc, load_id, {COLUMNS} FROM measurement JOIN load ON load.id = load_id "
        f"WHERE candidate_id IN ({marks})"
    )
    for candidate_id, *row in connection.execute(query, ids).fetchall():
        rows.setdefault(candidate_id, []).append(from_row(row))
    return {candidate_id: Series(found) for candidate_id, found in rows.items()}


def insert_measurements(connection: sqlite3.Connection, rows: Sequence[tuple[Any, ...]]) -> None:
    """Add rows of (candidate_id, load_id, *values of COLUMNS)."""
    connection.executemany(
        f"INSERT INTO measurement (candidate_id, load_id, {COLUMNS}) VALUES (?, ?{', ?' * 14})", rows
    )
