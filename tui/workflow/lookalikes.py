"""Look-alikes of one candidate over its whole queue: found, told apart from chance, and written down for people.

They are a fact of the queue as it is now: no digest holds them, and no check's `adequate` depends on them.
"""

from __future__ import annotations

import math
import re
import sqlite3
import threading
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from tui.model import Band, Evidence, FloatArray, plain
from tui.store.pulls import StarPulls, fluxes_of, names_of, places_of, pulls_mark, star_pulls

if TYPE_CHECKING:
    from tui.checks.lookalikes import Alike

SAMPLE = 2000  # random candidates that look-alikes are held against in magnitude, epoch and place
MOST = 500  # look-alikes, the most alike first, whose magnitude, epoch and place are read
LISTED = 50
LONG_QUEUE = 200_000  # candidates: beyond it only the desk looks for look-alikes, since it takes seconds
STATE = 20140612  # random state: the same queue gives the same answer
MJD_2000, DAYS_PER_YEAR = 51544.5, 365.25  # J2000.0; Julian year
MJD_OF_JD = 2400000.5


@dataclass(frozen=True, slots=True)
class LookAlike:
    """One candidate that looks like another."""

    name: str
    cosine: float  # of the two patterns of pulls
    pull: float  # in the band where the other's pull is largest
    mag: float  # in the other's quiet band, in the band's own system; NaN where not measured
    epoch: str  # of the measurement in the band of the largest pull, as given
    apart_deg: float  # on the sky; NaN where a position lacks


@dataclass(frozen=True, slots=True)
class LookAlikes:
    """The look-alikes of one candidate and what they mean."""

    name: str
    band: str  # of the candidate's largest pull
    mag_band: str  # of its smallest: what is odd must not choose by magnitude
    searched: int  # candidates with star evidence
    count: int
    expected: float  # by chance
    p: float  # of as many by chance
    shared: Mapping[str, float]  # quantity -> p that they lie so close together in it by chance
    points_to_calibration: bool
    sentence: str
    candidates: tuple[LookAlike, ...]  # the most alike, at most LISTED

    def as_dict(self) -> dict[str, Any]:
        """As `show --json` has it."""
        parts = {name: getattr(self, name) for name in self.__slots__ if name not in ("name", "candidates")}
        each = [{name: getattr(one, name) for name in LookAlike.__slots__} for one in self.candidates]
        return plain(parts | {"candidates": each})


class LookAlikeFinder:
    """Keeps a queue's pulls in memory for as long as no star evidence changes; threads may share one."""

    def __init__(self) -> None:
        self._lock = threading.Lock()
        self._seen: tuple[Any, ...] | None = None
        self._mark: tuple[Any, ...] | None = None
        self._pulls: StarPulls | None = None

    def pulls(self, connection: sqlite3.Connection, seen: tuple[Any, ...]) -> StarPulls:
        """The pulls as they are now.

        Args:
            seen: of one connection; changes whenever anything was written to the file. While it does not, nothing
                is asked at all.
        """
        with self._lock:
            if self._pulls is None or seen != self._seen:
                mark = pulls_mark(connection)
                if self._pulls is None or mark != self._mark:
                    self._pulls, self._mark = star_pulls(connection), mark
                self._seen = seen
            return self._pulls

    def find(
        self,
        connection: sqlite3.Connection,
        seen: tuple[Any, ...],
        candidate: tuple[int, str],
        star: Evidence | None,
        bands: Mapping[str, Band],
    ) -> LookAlikes | None:
        """Look-alikes of a candidate; None where its pulls from the star alone are unknown.

        Args:
            candidate: id and name.
            star: its star evidence of today, which need not be in the queue yet.
        """
        from tui.checks.lookalikes import look_alikes, ready, with_shared

        pulls = star.best.pulls if star and star.best else {}
        own = {band: pull for band, pull in pulls.items() if math.isfinite(pull)}
        if not own:
            return None
        ids, table = compared(self.pulls(connection, seen), candidate[0], own)
        row = int(np.searchsorted(ids, candidate[0]))
        rng = np.random.default_rng(STATE)
        found = look_alikes(row, ready(table), rng)
        near = found.rows[:MOST]
        band, quiet = (end(own, key=lambda name: abs(own[name])) for end in (max, min))
        known = np.unique(np.concatenate([near, [row], rng.choice(ids.size, min(SAMPLE, ids.size), replace=False)]))
        read = Quantities(connection, ids, known, (band, quiet), bands)
        if found.rows.size:
            found = with_shared(found, row, rng, read.by_name())
        return told(found, row, candidate[1], table[:, list(own).index(band)], read)


def compared(pulls: StarPulls, candidate_id: int, own: Mapping[str, float]) -> tuple[np.ndarray, np.ndarray]:
    """Ids and pulls (N, B) in the candidate's own bands, its own row as given; it is added where it lacks."""
    ids, table = pulls.ids, np.full((pulls.ids.size, len(own)), np.nan, dtype=np.float32)
    for column, band in enumerate(own):
        if band in pulls.bands:
            table[:, column] = pulls.pulls[:, pulls.bands.index(band)]
    row = int(np.searchsorted(ids, candidate_id))
    if row == ids.size or ids[row] != candidate_id:
        ids, table = np.insert(ids, row, candidate_id), np.insert(table, row, np.nan, axis=0)
    table[row] = list(own.values())
    return ids, table


class Quantities:
    """Magnitude, epoch and place of some rows of a queue."""

    def __init__(
        self,
        connection: sqlite3.Connection,
        ids: np.ndarray,
        known: np.ndarray,
        odd_and_quiet: tuple[str, str],
        bands: Mapping[str, Band],
    ) -> None:
        self.connection = connection
        self.ids = ids
        self.odd, self.quiet = odd_and_quiet
        wanted = ids[known].tolist()
        self.epochs = {key: epoch for key, (_, epoch) in fluxes_of(connection, wanted, self.odd).items()}
        self.fluxes = {key: flux for key, (flux, _) in fluxes_of(connection, wanted, self.quiet).items()}
        self.places = places_of(connection, wanted)
        self.zero_point_jy = bands[self.quiet].zero_point_jy if self.quiet in bands else math.nan

    def mag(self, row: int) -> float:
        """Magnitude in the quiet band; NaN where it has none."""
        flux = self.fluxes.get(int(self.ids[row]), 0.0)
        return -2.5 * math.log10(flux / self.zero_point_jy) if flux > 0 and self.zero_point_jy > 0 else math.nan

    def epoch(self, row: int) -> str:
        """Epoch in the odd band, as given."""
        return self.epochs.get(int(self.ids[row]), "")

    def by_name(self) -> dict[str, FloatArray]:
        """Quantity -> shape (N,) or (N, 3), NaN where unknown; quantities that nobody has are left out."""
        from tui.checks.lookalikes import sky_vectors

        rows = np.flatnonzero(np.isin(self.ids, np.array([*self.fluxes, *self.epochs, *self.places], dtype=np.int64)))
        found = {"magnitude": np.full(self.ids.size, np.nan), "epoch": np.full(self.ids.size, np.nan)}
        ra, dec = np.full(self.ids.size, np.nan), np.full(self.ids.size, np.nan)
        for row in rows.tolist():
            found["magnitude"][row] = self.mag(row)
            found["epoch"][row] = year_of(self.epoch(row))
            ra[row], dec[row] = self.places.get(int(self.ids[row]), (math.nan, math.nan))
        found["place"] = sky_vectors(ra, dec)
        return {name: values for name, values in found.items() if np.isfinite(values).any()}

    def apart_deg(self, row: int, other: int) -> float:
        """Angle between two of them."""
        from tui.checks.lookalikes import sky_vectors

        pair = [self.places.get(int(self.ids[one])) for one in (row, other)]
        if None in pair:
            return math.nan
        first, second = sky_vectors(*np.array(pair).T)
        return float(np.degrees(np.arctan2(np.linalg.norm(np.cross(first, second)), first @ second)))


def told(found: Alike, row: int, name: str, pulls: Sequence[float], read: Quantities) -> LookAlikes:
    """What was found, with names."""
    from tui.checks.lookalikes import sentence

    listed = found.rows[:LISTED].tolist()
    names = names_of(read.connection, read.ids[listed].tolist())
    each = tuple(
        LookAlike(names[int(read.ids[other])], float(cosine), float(pulls[other]), read.mag(other), read.epoch(other),
                  read.apart_deg(row, other))
        for other, cosine in zip(listed, found.cosine, strict=False)
    )  # fmt: skip
    return LookAlikes(
        name, read.odd, read.quiet, int(read.ids.size), int(found.rows.size), found.expected, found.p,
        dict(found.shared), found.points_to_calibration, sentence(found), each,
    )  # fmt: skip


def year_of(epoch: str) -> float:
    """An epoch as given, as a Julian year: ISO date, MJD, JD or a year; NaN where it is none of these.

    >>> year_of("2000-01-01"), year_of("MJD 51544.5"), year_of("2010.5"), year_of("DR3")
    (2000.0, 2000.0, 2010.5, nan)
    """
    text = epoch.strip()
    if match := re.fullmatch(r"(\d{4})-(\d{2})-(\d{2})([T ].*)?", text):
        try:
            days = np.datetime64(text[:10], "D") - np.datetime64("2000-01-01", "D")
        except ValueError:
            return math.nan
        return 2000.0 + float(days.astype(int)) / DAYS_PER_YEAR
    if not (match := re.fullmatch(r"(MJD|JD)?\s*(\d+(?:\.\d*)?)", text)):
        return math.nan
    number = float(match[2]) - (MJD_OF_JD if match[1] == "JD" else 0.0)
    if match[1] or number > 10_000:
        return 2000.0 + (number - MJD_2000) / DAYS_PER_YEAR
    return number if 1800 < number < 2200 else math.nan
