"""Candidates and what was measured of them: loading, which only adds, and reading today's state.

Facts come from sources (tables), each with versions; today's facts are the newest version of every
source laid over one another, the newest last. The input digest of a candidate covers all that fits
read of it and is kept beside its name.
"""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterable, Iterator, Mapping, Sequence
from itertools import islice
from typing import Any

from tui.errors import UnknownNameError
from tui.model import Candidate, plain
from tui.store import deriving, sides
from tui.store.connect import immediate
from tui.store.loads import Loads
from tui.store.measurements import (
    Row,
    Series,
    all_series,
    insert_measurements,
    measured,
    measurement_values,
    short_digest,
)
from tui.store.names import id_of, normal_name
from tui.store.records import LoadCounts, LoadRecord

CHUNK = 500  # records a transaction: a ruling never waits long for a load
PAGE = 500  # ids a query


def save_candidates(connection: sqlite3.Connection, records: Iterable[LoadRecord], utc: str) -> LoadCounts:
    """Add what is new in `records`; nothing is ever replaced, and the same records again add nothing.

    Neighbours (and dips) of one candidate from one source come in one record, as one set. A
    transaction holds some hundred records, so that an interrupted load leaves whole ones behind and
    can be repeated.

    Args:
        utc: the time of loading, as text; moved on by microseconds where the file has later ones.
    Raises:
        InputError: a name or a number that no reader should have let through; earlier records stay.
    """
    totals = dict.fromkeys(LoadCounts.__dataclass_fields__, 0)
    loads = Loads(connection, utc)
    records = iter(records)
    while chunk := list(islice(records, CHUNK)):
        with immediate(connection):
            known = len(loads.ids)
            try:
                save_chunk(connection, chunk, loads, totals)
            except BaseException:
                del loads.ids[known:]
                raise
    return LoadCounts(**totals)


def save_chunk(
    connection: sqlite3.Connection, chunk: Sequence[LoadRecord], loads: Loads, totals: dict[str, int]
) -> None:
    """Add some records, then bring digests and derived rows of the touched candidates up to date."""
    names = [normal_name(record.candidate.name) for record in chunk]
    known = ids_of(connection, set(names))
    series = series_of(connection, list(known.values()))
    changed: set[int] = set()
    for name, record in zip(names, chunk, strict=True):
        is_new = name not in known
        if is_new:
            known[name] = connection.execute("INSERT INTO candidate (name) VALUES (?)", (name,)).lastrowid
            deriving.insert_queue_row(connection, known[name], name)
            totals["candidates"] += 1
        candidate_id = known[name]
        added = add_facts(connection, candidate_id, record, loads, is_new)
        totals["versions"] += added and not is_new
        sides_added = add_sides(connection, candidate_id, record, loads)
        totals["side_tables"] += sides_added
        past = series.setdefault(candidate_id, Series())
        new = add_measurements(connection, candidate_id, record, past, loads, totals)
        if is_new or added or sides_added or new:
            changed.add(candidate_id)
    refresh_inputs(connection, sorted(changed), series)


def add_facts(
    connection: sqlite3.Connection, candidate_id: int, record: LoadRecord, loads: Loads, is_new: bool
) -> bool:
    """Add the facts as a version unless they are on file; whether they were added."""
    facts = {key: value for key, value in plain(record.candidate.facts).items() if value is not None}
    if not facts and not is_new:
        return False
    key = (candidate_id, record.source, short_digest([record.source, facts]))
    query = "SELECT 1 FROM candidate_version WHERE candidate_id = ? AND source = ? AND digest = ?"
    if connection.execute(query, key).fetchone():
        return False
    text = json.dumps(facts, sort_keys=True, separators=(",", ":"))
    connection.execute(
        "INSERT INTO candidate_version (candidate_id, source, digest, load_id, facts) VALUES (?, ?, ?, ?, ?)",
        (*key, loads.id_at(0), text),
    )
    return True


def add_sides(connection: sqlite3.Connection, candidate_id: int, record: LoadRecord, loads: Loads) -> int:
    """Add the record's neighbours, dips and spectrum; how many sets were new."""
    return sum(
        sides.add_set(connection, table, candidate_id, record.source, loads, rows)
        for table, rows in sides.side_sets(record.candidate).items()
    )


def add_measurements(
    connection: sqlite3.Connection,
    candidate_id: int,
    record: LoadRecord,
    series: Series,
    loads: Loads,
    totals: dict[str, int],
) -> int:
    """Add the record's measurements that are new; how many were."""
    rows = []
    for measurement in record.candidate.measurements:
        values = measurement_values(measurement)
        digest = values[3]
        what = measured(measurement)
        verdict = series.verdict(measurement, digest, what)
        counted = {"new": "measurements", "correction": "corrections", "repeat": "repeats", "same": "same"}[verdict]
        totals[counted] += 1
        if verdict == "same":
            continue
        load_id = loads.id_at(0)
        past = series.newest.get((measurement.band, measurement.source, measurement.epoch))
        if past is not None and past.load_id in loads.ids:  # two versions in one load: the later line is the newer
            load_id = loads.id_at(loads.ids.index(past.load_id) + 1)
        series.add(Row(loads.utc, load_id, digest, measurement), what)
        rows.append((candidate_id, load_id, *values))
    insert_measurements(connection, rows)
    return len(rows)


def refresh_inputs(
    connection: sqlite3.Connection, ids: Sequence[int], series: Mapping[int, Series] | None = None
) -> None:
    """Write the current version and the input digest of some candidates, from all rows on file.

    Args:
        series: the measurements of all of them, where they are at hand; else they are read.
    """
    for page in pages(ids):
        states = input_states(connection, page, series)
        rows = [(versions[-1][2] if versions else "", digest, key) for key, versions, digest in states]
        connection.executemany("UPDATE candidate SET current_version = ?, input_digest = ? WHERE id = ?", rows)


def input_states(
    connection: sqlite3.Connection, ids: Sequence[int], series: Mapping[int, Series] | None = None
) -> Iterator[tuple[int, list[tuple], str]]:
    """(id, versions of facts in order, input digest) of some candidates."""
    versions = versions_of(connection, ids)
    series = all_series(connection, ids) if series is None else series
    sets = {table: sides.all_sets(connection, table, ids) for table in sides.SET_TABLES}
    for candidate_id in ids:
        today = series[candidate_id].current() if candidate_id in series else []
        content: dict[str, Any] = {
            "facts": merged_facts(versions.get(candidate_id, [])),
            "measurements": [row.digest for row in today],
        }
        for table, found in sets.items():
            by_source = found.get(candidate_id, {})
            content[table] = [[source, by_source[source][1]] for source in sorted(by_source)]
        yield candidate_id, versions.get(candidate_id, []), short_digest(content)


def versions_of(connection: sqlite3.Connection, ids: Sequence[int]) -> dict[int, list[tuple[str, str, str, str]]]:
    """Candidate id -> (utc, source, digest, facts) of the newest version of each source, oldest first."""
    query = (
        "SELECT candidate_id, MIN(load.utc) AS first, source, digest, facts FROM candidate_version "
        f"JOIN load ON load.id = load_id WHERE candidate_id IN ({', '.join('?' * len(ids))}) "
        "GROUP BY candidate_id, source, digest ORDER BY first, source, digest"
    )
    newest: dict[int, dict[str, tuple[str, str, str, str]]] = {}
    for candidate_id, *version in connection.execute(query, ids).fetchall():
        by_source = newest.setdefault(candidate_id, {})
        by_source.pop(version[1], None)
        by_source[version[1]] = tuple(version)
    return {candidate_id: list(by_source.values()) for candidate_id, by_source in newest.items()}


def merged_facts(versions: Sequence[tuple[str, str, str, str]]) -> dict[str, Any]:
    """Facts of all sources, later over earlier."""
    facts: dict[str, Any] = {}
    for _, _, _, text in versions:
        facts.update(json.loads(text))
    return facts


def ids_of(connection: sqlite3.Connection, names: Iterable[str]) -> dict[str, int]:
    """Name -> id of those that are in the file."""
    found: dict[str, int] = {}
    for page in pages(list(names)):
        query = f"SELECT name, id FROM candidate WHERE name IN ({', '.join('?' * len(page))})"
        found.update(connection.execute(query, page).fetchall())
    return found


def series_of(connection: sqlite3.Connection, ids: Sequence[int]) -> dict[int, Series]:
    """The measurements of any number of candidates."""
    found: dict[int, Series] = {}
    for page in pages(ids):
        found.update(all_series(connection, page))
    return found


def pages(items: Sequence[Any]) -> Iterator[Sequence[Any]]:
    """Runs of at most `PAGE` items."""
    for start in range(0, len(items), PAGE):
        yield items[start : start + PAGE]


def candidate_id(connection: sqlite3.Connection, name: str) -> int:
    """The id of a candidate in this file; UnknownNameError if it holds none of that name."""
    return id_of(connection, name)


def candidate_name(connection: sqlite3.Connection, candidate_id: int) -> str:
    """The name of a candidate of this file, by its id."""
    row = connection.execute("SELECT name FROM candidate WHERE id = ?", (candidate_id,)).fetchone()
    if row is None:
        raise UnknownNameError("candidate", str(candidate_id))
    return row[0]


def candidate_names(connection: sqlite3.Connection) -> list[str]:
    """All names, in order of loading."""
    return [row[0] for row in connection.execute("SELECT name FROM candidate ORDER BY id").fetchall()]


def candidate_count(connection: sqlite3.Connection) -> int:
    """How many candidates there are."""
    return connection.execute("SELECT COUNT(*) FROM candidate").fetchone()[0]


def name_pages(connection: sqlite3.Connection, size: int = 1000) -> Iterator[list[str]]:
    """All names in runs of `size`, in order of loading, holding one run in memory; for passes over a large queue."""
    last = 0
    query = "SELECT id, name FROM candidate WHERE id > ? ORDER BY id LIMIT ?"
    while rows := connection.execute(query, (last, size)).fetchall():
        last = rows[-1][0]
        yield [name for _, name in rows]


def get_candidate(connection: sqlite3.Connection, name: str) -> Candidate:
    """Today's state of one candidate; UnknownNameError if there is none of that name."""
    return get_candidates(connection, [id_of(connection, name)])[0]


def get_candidates(connection: sqlite3.Connection, which: Sequence[str] | Sequence[int]) -> list[Candidate]:
    """Today's state of several candidates, by names or by ids, in the order asked; few queries.

    Raises:
        UnknownNameError: one of them is not in the file.
    """
    ids = [one if isinstance(one, int) else id_of(connection, one) for one in which]
    found: dict[int, Candidate] = {}
    for page in pages(list(dict.fromkeys(ids))):
        found.update(read_page(connection, page))
    return [found[one] if one in found else found.setdefault(one, missing(connection, one)) for one in ids]


def missing(connection: sqlite3.Connection, candidate_id: int) -> Candidate:
    """Raises UnknownNameError for an id that the file lacks."""
    return Candidate(candidate_name(connection, candidate_id))


def read_page(connection: sqlite3.Connection, ids: Sequence[int]) -> Mapping[int, Candidate]:
    """Some hundred candidates by id; one query a table."""
    names = connection.execute(
        f"SELECT id, name FROM candidate WHERE id IN ({', '.join('?' * len(ids))})", ids
    ).fetchall()
    versions = versions_of(connection, ids)
    series = all_series(connection, ids)
    sets = {table: sides.all_sets(connection, table, ids) for table in sides.SET_TABLES}
    return {
        key: Candidate(
            name=name,
            measurements=tuple(row.measurement for row in series[key].current()) if key in series else (),
            facts=merged_facts(versions.get(key, [])),
            neighbours=sides.neighbours_from(sets["neighbour"].get(key, {})),
            dips=sides.dips_from(sets["dip"].get(key, {})),
            spectrum=sides.spectrum_from(sets["spectrum"].get(key, {})),
        )
        for key, name in names
    }


def candidate_digests(connection: sqlite3.Connection, names: Sequence[str]) -> dict[str, str]:
    """Name -> digest of all that fits read of the candidate; names that the file lacks are absent."""
    found: dict[str, str] = {}
    for page in pages(list(names)):
        query = f"SELECT name, input_digest FROM candidate WHERE name IN ({', '.join('?' * len(page))})"
        found.update(connection.execute(query, page).fetchall())
    return found
