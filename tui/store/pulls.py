"""What look-alikes are found by, for a whole queue at once: every candidate's pulls from the star alone.

The evidence's JSON is taken apart by SQLite, which is ten times as fast as reading each text.
"""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from itertools import chain
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tui.store.candidates import pages

RUN = 4000  # texts read at a time
BEST_PULLS = "$.fits[0][7]"  # of a text that the codec wrote: the pulls of the best fit


@dataclass(frozen=True, slots=True, eq=False)
class StarPulls:
    """The pulls of every candidate that has star evidence."""

    ids: NDArray[np.int64]  # shape (N,), ascending
    bands: tuple[str, ...]
    pulls: NDArray[np.float32]  # shape (N, B), NaN where a band is missing


def pulls_mark(connection: sqlite3.Connection) -> tuple[Any, ...]:
    """Something that changes whenever star evidence does; found from an index, without reading the evidence."""
    counted = "SELECT COUNT(*), SUM(id), MAX(id) FROM evidence WHERE is_current = 1 AND kind = 'star'"
    last = connection.execute("SELECT digest FROM evidence ORDER BY id DESC LIMIT 1").fetchone()  # an id may come again
    return (*connection.execute(counted).fetchone(), *(last or ()))


class Columns(dict):
    """Band -> column, a new one for each band met."""

    def __missing__(self, band: str) -> int:
        self[band] = len(self)
        return self[band]


def star_pulls(connection: sqlite3.Connection) -> StarPulls:
    """The pulls of the best star-only fit of every candidate."""
    columns = Columns()
    ids: list[NDArray[np.int64]] = []
    cells: list[tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.float32]]] = []
    begun = 0
    for keys, found in runs(connection):
        ids.append(keys)
        sizes = np.fromiter(map(len, found), dtype=np.int64, count=len(found))
        count = int(sizes.sum())
        column = np.fromiter(map(columns.__getitem__, chain.from_iterable(found)), dtype=np.int64, count=count)
        value = np.fromiter(chain.from_iterable(map(dict.values, found)), dtype=np.float32, count=count)
        cells.append((np.repeat(begun + np.arange(len(found)), sizes), column, value))
        begun += len(found)
    pulls = np.full((begun, len(columns)), np.nan, dtype=np.float32)
    for rows, column, value in cells:
        pulls[rows, column] = value
    return StarPulls(np.concatenate(ids) if ids else np.zeros(0, dtype=np.int64), tuple(columns), pulls)


def runs(connection: sqlite3.Connection) -> Iterator[tuple[NDArray[np.int64], list[dict[str, float]]]]:
    """Ids and pulls by band, some thousand candidates at a time, so that nothing large is held."""
    cursor = connection.execute(
        f"SELECT candidate_id, json_extract(content, '{BEST_PULLS}') FROM evidence "
        "WHERE is_current = 1 AND kind = 'star' ORDER BY candidate_id"
    )
    while rows := cursor.fetchmany(RUN):
        text = ",".join([pulls or "{}" for _, pulls in rows]).replace(":null", ":NaN")
        yield np.array([key for key, _ in rows], dtype=np.int64), json.loads(f"[{text}]")


def places_of(connection: sqlite3.Connection, ids: Sequence[int]) -> dict[int, tuple[float, float]]:
    """Candidate id -> ra and dec, degrees, as last loaded; those without are absent."""
    query = (
        "SELECT candidate_id, json_extract(facts, '$.ra'), json_extract(facts, '$.dec'), MAX(load_id) "
        "FROM candidate_version WHERE candidate_id IN ({}) AND json_extract(facts, '$.ra') IS NOT NULL "
        "AND json_extract(facts, '$.dec') IS NOT NULL GROUP BY candidate_id"
    )
    return {key: (float(ra), float(dec)) for key, ra, dec, _ in asked(connection, query, ids)}


def fluxes_of(connection: sqlite3.Connection, ids: Sequence[int], band: str) -> dict[int, tuple[float, str]]:
    """Candidate id -> flux density, Jy, and epoch as given of its newest detection in one band."""
    query = (
        "SELECT candidate_id, flux_jy, epoch, MAX(load_id) FROM measurement WHERE candidate_id IN ({}) AND band = ? "
        "AND is_limit = 0 AND exclude = 0 GROUP BY candidate_id"
    )
    return {key: (flux, epoch) for key, flux, epoch, _ in asked(connection, query, ids, band)}


def names_of(connection: sqlite3.Connection, ids: Sequence[int]) -> dict[int, str]:
    """Candidate id -> name."""
    return dict(asked(connection, "SELECT id, name FROM candidate WHERE id IN ({})", ids))


def asked(connection: sqlite3.Connection, query: str, ids: Iterable[int], *more: str) -> Iterator[tuple[Any, ...]]:
    """The rows of a query for many ids, a page of them at a time."""
    for page in pages([int(one) for one in ids]):
        yield from connection.execute(query.format(", ".join("?" * len(page))), (*page, *more)).fetchall()
