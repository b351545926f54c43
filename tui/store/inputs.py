"""Are the candidates and measurements on file those that were loaded? Their digests, computed again."""

from __future__ import annotations

import hashlib
import json
import sqlite3
from collections.abc import Iterator, Sequence
from typing import Any

from tui.store import sides
from tui.store.candidates import input_states, pages
from tui.store.codec import is_sound
from tui.store.measurements import COLUMNS, from_row, measurement_values, short_digest
from tui.store.names import is_time, normal_name
from tui.store.records import Fault


def input_faults(connection: sqlite3.Connection, ids: Sequence[int]) -> Iterator[Fault]:
    """Rows of some candidates whose digest is not that of their content."""
    for page in pages(ids):
        marks = ", ".join("?" * len(page))
        names = dict(connection.execute(f"SELECT id, name FROM candidate WHERE id IN ({marks})", page).fetchall())
        for name in names.values():
            if normal_name(name) != name:
                yield Fault("input", repr(name), "the name is not in the form in which names are kept (NFC).")
        for key, what in (
            *wrong_versions(connection, page),
            *wrong_measurements(connection, page),
            *wrong_sets(connection, page),
            *wrong_cutouts(connection, page),
        ):
            text = f"{what} was changed after it was loaded: its digest is not that of its content."
            yield Fault("input", names[key], text)


def wrong_versions(connection: sqlite3.Connection, ids: Sequence[int]) -> Iterator[tuple[int, str]]:
    """(candidate id, what) of facts that do not match their digest."""
    query = f"SELECT candidate_id, source, digest, facts FROM candidate_version WHERE candidate_id IN ({marks(ids)})"
    for key, source, digest, facts in connection.execute(query, ids).fetchall():
        if short_digest([source, json.loads(facts)]) != digest:
            yield key, f"a version of its facts from {source!r}"


def wrong_measurements(connection: sqlite3.Connection, ids: Sequence[int]) -> Iterator[tuple[int, str]]:
    """(candidate id, what) of measurements that do not match their digest."""
    query = f"SELECT candidate_id, '', load_id, {COLUMNS} FROM measurement WHERE candidate_id IN ({marks(ids)})"
    for key, *row in connection.execute(query, ids).fetchall():
        found = from_row(row)
        if measurement_values(found.measurement)[3] != found.digest:
            yield key, f"its measurement in {found.measurement.band} from {found.measurement.source!r}"


def wrong_sets(connection: sqlite3.Connection, ids: Sequence[int]) -> Iterator[tuple[int, str]]:
    """(candidate id, what) of sets of neighbours or dips, and of spectra, that do not match their digest."""
    for table in sides.SET_TABLES:
        order = "rowid" if table == "spectrum" else "position"
        query = (
            f"SELECT candidate_id, source, digest, load_id, {sides.READ[table]} FROM {table} "
            f"WHERE candidate_id IN ({marks(ids)}) ORDER BY candidate_id, source, digest, load_id, {order}"
        )
        sets: dict[tuple[Any, ...], list[tuple[Any, ...]]] = {}
        for *key, rest in ((*row[:4], row[4:]) for row in connection.execute(query, ids).fetchall()):
            sets.setdefault(tuple(key), []).append(rest)
        for (key, source, digest, _), rows in sets.items():
            if sides.set_digest(rows) != digest:
                yield key, f"its {table} from {source!r}"


def wrong_cutouts(connection: sqlite3.Connection, ids: Sequence[int]) -> Iterator[tuple[int, str]]:
    """(candidate id, what) of pictures that do not match their digest."""
    query = (
        "SELECT candidate_id, band, digest, height, width, arcsec_per_pixel, facts, image FROM cutout "
        f"WHERE candidate_id IN ({marks(ids)})"
    )
    for key, band, digest, height, width, scale, facts, image in connection.execute(query, ids).fetchall():
        content = sides.picture(image, height, width).astype("<f4").tobytes()
        if sides.set_digest([(content, height, width, scale, facts)]) != digest:
            yield key, f"its cutout in {band}"


def derived_inputs(connection: sqlite3.Connection, ids: Sequence[int]) -> Iterator[int]:
    """Ids of the candidates whose kept version or input digest is not what their rows give."""
    for page in pages(ids):
        query = f"SELECT id, current_version, input_digest FROM candidate WHERE id IN ({marks(page)})"
        kept = {key: (version, digest) for key, version, digest in connection.execute(query, page).fetchall()}
        for key, versions, digest in input_states(connection, page):
            if kept[key] != (versions[-1][2] if versions else "", digest):
                yield key


def wrong_attachments(connection: sqlite3.Connection) -> Iterator[Fault]:
    """Files carried by the queue whose content is not that of their digest."""
    for digest, name in connection.execute("SELECT digest, name FROM attachment").fetchall():
        content = connection.execute("SELECT content FROM attachment WHERE digest = ?", (digest,)).fetchone()[0]
        if hashlib.sha256(content).hexdigest() != digest:
            yield Fault("input", name, "this attachment was changed: its digest is not that of its content.")


def wrong_times(connection: sqlite3.Connection, schema: str = "main") -> Iterator[Fault]:
    """Times that are not in the form in which logs keep them."""
    for table, column in (("load", "utc"), ("setting", "utc"), ("reviewer", "joined_utc"), ("reviewer_rename", "utc")):
        for (utc,) in connection.execute(f"SELECT DISTINCT {column} FROM {schema}.{table}").fetchall():
            if not is_time(utc):
                yield Fault("input", table, f"{utc[:40]!r} is not a time in the form of the log.")


def wrong_evidence(connection: sqlite3.Connection) -> Iterator[Fault]:
    """Evidence that cannot be read back; its numbers are proved by computing it again, not here."""
    last = 0
    query = (
        "SELECT evidence.id, name, kind, version, digest, adequate, content FROM evidence "
        "JOIN candidate ON candidate.id = candidate_id WHERE evidence.id > ? ORDER BY evidence.id LIMIT 1000"
    )
    while rows := connection.execute(query, (last,)).fetchall():
        last = rows[-1][0]
        for _, name, kind, *rest in rows:
            if not is_sound((kind, *rest)):
                yield Fault("input", name, f"its evidence on {kind} is not as the program writes it.")


def marks(ids: Sequence[int]) -> str:
    """As many parameters as there are ids."""
    return ", ".join("?" * len(ids))
