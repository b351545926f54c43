"""What hangs on a candidate beside its measurements: neighbours, dips, a spectrum, cutouts; and attachments.

A table gives a candidate's neighbours (or dips) from one source as a set; another set from the same
source takes its place, and the older stays on file. Sets of several sources stand side by side.
"""

from __future__ import annotations

import hashlib
import json
import math
import sqlite3
import zlib
from collections.abc import Iterable, Mapping, Sequence
from typing import Any

from tui.errors import InputError, StoreError, UnknownNameError
from tui.model import Candidate, Dip, FloatArray, Neighbour, Spectrum, canonical_json
from tui.store.connect import immediate
from tui.store.loads import Loads
from tui.store.measurements import finite, short_digest
from tui.store.names import id_of
from tui.store.records import Attachment, Cutout

BySource = Mapping[str, tuple[str, str, list[tuple[Any, ...]]]]  # source -> (utc, digest, rows) of its newest set
MAX_PIXELS = 1_000_000  # of a cutout; a larger picture is no cutout
SET_TABLES = ("neighbour", "dip", "spectrum")
READ = {
    "neighbour": "separation_arcsec, position_angle_deg, fluxes_jy, label",
    "dip": "event, band, depth, depth_error, epoch",
    "spectrum": "wave_um, flux_jy, error_jy",
}


def neighbour_rows(neighbours: Sequence[Neighbour]) -> list[tuple[Any, ...]]:
    """The columns of each neighbour; InputError where a separation is no number."""
    if not all(math.isfinite(one.separation_arcsec) for one in neighbours):
        raise InputError("A neighbour's separation is not a finite number; leave it out.")
    return [
        (float(one.separation_arcsec), finite(one.position_angle_deg), canonical_json(one.fluxes_jy), one.source)
        for one in neighbours
    ]


def dip_rows(dips: Sequence[Dip]) -> list[tuple[Any, ...]]:
    """The columns of each dip; InputError where a depth is no number."""
    if not all(math.isfinite(dip.depth) for dip in dips):
        raise InputError("A dip's depth is not a finite number; leave it out.")
    return [(dip.event, dip.band, float(dip.depth), finite(dip.depth_error), dip.epoch) for dip in dips]


def spectrum_rows(spectrum: Spectrum | None) -> list[tuple[Any, ...]]:
    """The three columns of a spectrum, each array as little-endian float64."""
    if spectrum is None:
        return []
    return [tuple(packed(column) for column in (spectrum.wave_um, spectrum.flux_jy, spectrum.error_jy))]


def packed(values: FloatArray) -> bytes:
    """An array as little-endian float64."""
    import numpy as np  # here and below: candidates are listed before it is there

    return np.ascontiguousarray(values, dtype="<f8").tobytes()


def unpacked(content: bytes) -> FloatArray:
    """What `packed` wrote."""
    import numpy as np

    return np.frombuffer(content, dtype="<f8").astype(np.float64)


def set_digest(rows: Sequence[tuple[Any, ...]]) -> str:
    """The digest of one set; blobs enter by their own."""
    return short_digest(
        [[hashlib.sha256(item).hexdigest() if isinstance(item, bytes) else item for item in row] for row in rows]
    )


def side_sets(candidate: Candidate) -> dict[str, list[tuple[Any, ...]]]:
    """Table -> rows, for those that the candidate has."""
    sets = {
        "neighbour": neighbour_rows(candidate.neighbours),
        "dip": dip_rows(candidate.dips),
        "spectrum": spectrum_rows(candidate.spectrum),
    }
    return {table: rows for table, rows in sets.items() if rows}


def add_set(
    connection: sqlite3.Connection,
    table: str,
    candidate_id: int,
    source: str,
    loads: Loads,
    rows: list[tuple[Any, ...]],
) -> bool:
    """Add one set unless it is on file; whether it was added."""
    key = (candidate_id, source, set_digest(rows))
    query = f"SELECT 1 FROM {table} WHERE candidate_id = ? AND source = ? AND digest = ? LIMIT 1"
    if connection.execute(query, key).fetchone():
        return False
    place = [] if table == "spectrum" else ["position"]
    columns = ", ".join(["candidate_id", "source", "digest", "load_id", *place, READ[table]])
    load_id = loads.id_at(0)
    filled = [(*key, load_id, *([number] if place else []), *row) for number, row in enumerate(rows)]
    marks = ", ".join("?" * len(filled[0]))
    connection.executemany(f"INSERT INTO {table} ({columns}) VALUES ({marks})", filled)
    return True


def all_sets(connection: sqlite3.Connection, table: str, ids: Sequence[int]) -> dict[int, BySource]:
    """Candidate id -> source -> (utc, digest, rows) of the newest set."""
    order = "rowid" if table == "spectrum" else "position"
    query = (
        f"SELECT candidate_id, {table}.source, digest, load.utc, {READ[table]} FROM {table} "
        f"JOIN load ON load.id = load_id WHERE candidate_id IN ({', '.join('?' * len(ids))}) "
        f"ORDER BY candidate_id, {table}.source, digest, load.utc, {table}.{order}"
    )
    sets: dict[tuple[int, str, str], tuple[str, list[tuple[Any, ...]]]] = {}
    for candidate_id, source, digest, utc, *row in connection.execute(query, ids).fetchall():
        first_utc, rows = sets.setdefault((candidate_id, source, digest), (utc, []))
        if utc == first_utc:  # the same set from another load is the same set
            rows.append(tuple(row))
    newest: dict[int, dict[str, tuple[str, str, list[tuple[Any, ...]]]]] = {}
    for (candidate_id, source, digest), (utc, rows) in sets.items():
        by_source = newest.setdefault(candidate_id, {})
        if source not in by_source or (utc, digest) > by_source[source][:2]:
            by_source[source] = (utc, digest, rows)
    return newest


def neighbours_from(by_source: BySource) -> tuple[Neighbour, ...]:
    """The neighbours of every source, sources in order."""
    return tuple(
        Neighbour(separation, math.nan if angle is None else angle, fluxes_from(fluxes), label)
        for source in sorted(by_source)
        for separation, angle, fluxes, label in by_source[source][2]
    )


def fluxes_from(text: str) -> dict[str, float]:
    """Band -> flux, where null is NaN."""
    return {band: math.nan if flux is None else float(flux) for band, flux in json.loads(text).items()}


def dips_from(by_source: BySource) -> tuple[Dip, ...]:
    """The dips of every source, sources in order."""
    return tuple(
        Dip(event, band, depth, math.nan if error is None else error, epoch)
        for source in sorted(by_source)
        for event, band, depth, error, epoch in by_source[source][2]
    )


def spectrum_from(by_source: BySource) -> Spectrum | None:
    """The newest spectrum of all sources; a candidate carries one."""
    if not by_source:
        return None
    wave, flux, error = max(by_source.values(), key=lambda one: one[:2])[2][0]
    return Spectrum(unpacked(wave), unpacked(flux), unpacked(error))


def save_cutout(connection: sqlite3.Connection, name: str, cutout: Cutout, utc: str) -> bool:
    """Add a picture of a candidate; False where the same one is on file.

    Raises:
        UnknownNameError: no such candidate.
        InputError: not a picture of height x width, or larger than a cutout may be.
    """
    import numpy as np

    image = np.asarray(cutout.image, dtype="<f4")
    if image.ndim != 2 or not 0 < image.size <= MAX_PIXELS:
        raise InputError(f"A cutout has two axes and up to {MAX_PIXELS} pixels; this one is {image.shape}.")
    content = image.tobytes()
    row = (*image.shape, finite(cutout.arcsec_per_pixel), canonical_json(cutout.facts))
    with immediate(connection):
        candidate_id = id_of(connection, name)
        key = (candidate_id, cutout.band, cutout.source, set_digest([(content, *row)]))
        same = "SELECT 1 FROM cutout WHERE candidate_id = ? AND band = ? AND source = ? AND digest = ?"
        if connection.execute(same, key).fetchone():
            return False
        connection.execute(
            "INSERT INTO cutout (candidate_id, band, source, digest, load_id, height, width, arcsec_per_pixel, facts, "
            "image) VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?)",
            (*key, Loads(connection, utc).id_at(0), *row, zlib.compress(content, 6)),
        )
    return True


def cutouts(connection: sqlite3.Connection, name: str) -> list[Cutout]:
    """A candidate's pictures, the newest of each band and source, in order of band."""
    query = (
        "SELECT band, source, height, width, arcsec_per_pixel, facts, image FROM cutout "
        "JOIN load ON load.id = load_id WHERE candidate_id = ? ORDER BY load.utc, digest"
    )
    newest: dict[tuple[str, str], Cutout] = {}
    rows = connection.execute(query, (id_of(connection, name),)).fetchall()
    for band, source, height, width, scale, facts, image in rows:
        newest[band, source] = Cutout(
            band, picture(image, height, width), math.nan if scale is None else scale, source, json.loads(facts)
        )
    return [newest[key] for key in sorted(newest)]


def picture(content: bytes, height: int, width: int) -> FloatArray:
    """The pixels of a stored picture; never more than its size says, whatever the bytes claim."""
    import numpy as np

    if not 0 < height * width <= MAX_PIXELS:
        raise StoreError(f"A cutout of {height} x {width} pixels is on file, which is too large to show.")
    try:
        raw = zlib.decompressobj().decompress(content, height * width * 4)
        return np.frombuffer(raw, dtype="<f4").reshape(height, width).astype(np.float64)
    except (zlib.error, ValueError) as error:
        raise StoreError("A cutout on file is damaged; load it again.") from error


def attach(connection: sqlite3.Connection, kind: str, name: str, content: bytes) -> str:
    """Keep a file in the queue by its content; its digest."""
    digest = hashlib.sha256(content).hexdigest()
    with immediate(connection):
        if not connection.execute("SELECT 1 FROM attachment WHERE digest = ?", (digest,)).fetchone():
            connection.execute("INSERT INTO attachment VALUES (?, ?, ?, ?)", (digest, kind, name, content))
    return digest


def attachment(connection: sqlite3.Connection, digest: str) -> Attachment:
    """The file of that digest; UnknownNameError if the queue carries none."""
    query = "SELECT kind, name, digest, content FROM attachment WHERE digest = ?"
    row = connection.execute(query, (digest,)).fetchone()
    if row is None:
        raise UnknownNameError("attachment", digest)
    return Attachment(*row)


def attachments(connection: sqlite3.Connection, kind: str) -> Iterable[Attachment]:
    """All files of one kind, by name and digest."""
    query = "SELECT kind, name, digest, content FROM attachment WHERE kind = ? ORDER BY name, digest"
    return [Attachment(*row) for row in connection.execute(query, (kind,)).fetchall()]
