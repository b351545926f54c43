"""Taking in what colleagues did in their own copies.

Everything gathered is a set that only grows: rows are told apart by their content or their random id,
and what is today's (newest version, newest ruling) follows from the rows alone. So the order of
gathering, its grouping and its repetition do not matter. The other file is never written: a private
copy of it is opened, checked, and read.
"""

from __future__ import annotations

import os
import shutil
import sqlite3
import tempfile
from collections.abc import Iterable, Iterator, Mapping
from contextlib import contextmanager

from tui.errors import HandleError, StoreError, UnknownNameError
from tui.store import deriving
from tui.store.audit import schema_faults
from tui.store.candidates import refresh_inputs
from tui.store.chains import chain_faults
from tui.store.codec import is_sound
from tui.store.connect import immediate, is_held_open, open_queue, read_header, read_only, write_copy
from tui.store.filesystem import network_type
from tui.store.inputs import input_faults, wrong_attachments, wrong_times
from tui.store.measurements import COLUMNS
from tui.store.names import later_utc
from tui.store.records import Fault, GatherReport
from tui.store.reviewers import checked_handle, handles
from tui.store.sentences import sentence
from tui.store.settings import STANDING_NAMES, newest, settings_from, touched

SAME_CANDIDATE = (
    "JOIN other.candidate AS theirs ON theirs.id = t.candidate_id JOIN candidate AS ours ON ours.name = theirs.name"
)
SAME_LOAD = (
    "JOIN other.load AS their_load ON their_load.id = t.load_id JOIN load AS our_load ON our_load.utc = their_load.utc"
)
# table -> its own columns beside candidate and load, and those of them that tell its rows apart
INPUTS: Mapping[str, tuple[str, str]] = {
    "candidate_version": ("source, digest, facts", "source, digest"),
    "measurement": (
        COLUMNS,
        "band, source, epoch, digest",
    ),
    "neighbour": (
        "source, digest, position, separation_arcsec, position_angle_deg, fluxes_jy, label",
        "source, digest, position",
    ),
    "dip": ("source, digest, position, event, band, depth, depth_error, epoch", "source, digest, position"),
    "spectrum": ("source, digest, wave_um, flux_jy, error_jy", "source, digest"),
    "cutout": (
        "band, source, digest, height, width, arcsec_per_pixel, facts, image",
        "band, source, digest",
    ),
}

UNRELATED = (
    "None of the candidates of {other} is in {queue}, so it is hardly a colleague's copy; nothing was gathered. "
    "To take it in all the same: --unrelated."
)


def gather(
    connection: sqlite3.Connection,
    other_path: str | os.PathLike[str],
    rename: Mapping[str, str] | None = None,
    *,
    unrelated: bool = True,
) -> GatherReport:
    """Take in another queue's candidates, measurements, reviewers, settings, rulings and the evidence they cite.

    Args:
        rename: handle in the other queue -> its handle here, for two people who chose the same one.
        unrelated: also take in a queue that has no candidate in common with this one.
    Raises:
        HandleError: two reviewers under one handle, and no `rename` for it.
        StoreError: the other file is no queue, newer, damaged, or its log was edited, or it is unrelated;
            nothing is taken in then.
    """
    path = os.fspath(other_path)
    if os.path.exists(path) and os.path.samefile(path, getattr(connection, "queue_path", "") or path + "/"):
        raise StoreError(f"{path} is this queue itself; there is nothing to gather.")
    with private_copy(path) as copy, attached(connection, copy), immediate(connection):
        refuse(path, wrong_times(connection, "other"))
        refuse_conflicts(connection, path)
        is_unrelated = shares_nothing(connection)
        if is_unrelated and not unrelated:
            raise StoreError(UNRELATED.format(other=path, queue=getattr(connection, "queue_path", "")))
        people = take_people(connection, path, rename or {})
        settings_before = newest(connection)
        settings_taken = take_rows(connection, "setting", "id, name, value, utc, reviewer_id", "id")
        settings = settings_from(newest(connection))
        candidates, changed, measurements = take_inputs(connection, path)
        evidence = take_cited(connection, path)
        rulings, ruled = take_rulings(connection)
        ruled |= adopt_current(connection, path) | take_seals(connection)
        settings_now = newest(connection)
        if any(settings_before.get(name) != settings_now.get(name) for name in STANDING_NAMES):
            ruled |= set(touched(connection))
        deriving.refresh(connection, sorted(changed | ruled), settings)
        return GatherReport(
            path=path,
            candidates=candidates,
            measurements=measurements,
            rulings=rulings,
            reviewers=people,
            settings=settings_taken,
            evidence=evidence,
            renamed=tuple(sorted((rename or {}).items())),
            affected=names_of(connection, sorted(changed)),
            unrelated=is_unrelated,
        )


@contextmanager
def private_copy(path: str) -> Iterator[str]:
    """A copy of a queue, up to date, with its schema and log found sound; the original is only read."""
    read_header(path)
    with tempfile.TemporaryDirectory(prefix="plainlight-") as folder:
        copy = os.path.join(folder, "other.db")
        copy_queue(path, copy)
        connection = open_queue(copy)
        try:
            faults = [*schema_faults(connection)]
            if not faults and connection.execute("PRAGMA quick_check(1)").fetchone()[0] != "ok":
                raise StoreError(f"{path} is damaged; nothing was gathered. Start again from a backup of it.")
            refuse(path, faults or chain_faults(connection))
        finally:
            connection.close()
        yield copy


def copy_queue(path: str, copy: str) -> None:
    """Copy a queue that others may be writing; on a network filesystem byte by byte, log and all."""
    if not network_type(path) or is_held_open(path):
        source = read_only(path)
        try:
            write_copy(source, copy)
            return
        except sqlite3.Error as error:
            if "unable to open" not in str(error):  # a directory that cannot be written: copy the bytes
                raise StoreError(sentence(path, error)) from error
        finally:
            source.close()
    try:
        shutil.copyfile(path, copy)
        if os.path.exists(path + "-wal"):
            shutil.copyfile(path + "-wal", copy + "-wal")
    except OSError as error:
        raise StoreError(f"{path} cannot be read: {error.strerror}.") from error


def refuse(path: str, faults: Iterable[Fault]) -> None:
    """StoreError that names the first fault, if there is any."""
    try:
        found = next(iter(faults), None)
    except RecursionError:
        found = Fault("input", "facts", "are nested too deep.")
    if found is not None:
        raise StoreError(
            f"{path} cannot be trusted, so nothing was gathered: {found.place}: {found.text} "
            f"See: plainlight audit {path}."
        )


@contextmanager
def attached(connection: sqlite3.Connection, copy: str) -> Iterator[None]:
    """The copy beside the queue on one connection, under the name `other`."""
    connection.execute("ATTACH DATABASE ? AS other", (copy,))
    try:
        yield
    finally:
        connection.execute("DETACH DATABASE other")


def shares_nothing(connection: sqlite3.Connection) -> bool:
    """Whether both queues have candidates, and none in common."""
    query = (
        "SELECT EXISTS (SELECT 1 FROM candidate) AND EXISTS (SELECT 1 FROM other.candidate) AND NOT EXISTS "
        "(SELECT 1 FROM other.candidate AS o JOIN candidate AS c ON c.name = o.name)"
    )
    return bool(connection.execute(query).fetchone()[0])


def refuse_conflicts(connection: sqlite3.Connection, path: str) -> None:
    """Refuse a file in which a row of ours carries other content: one of the two was edited or made up."""
    for table, columns in (("ruling", "hash"), ("setting", "name || value || utc"), ("reviewer", "joined_utc")):
        query = (
            f"SELECT t.id FROM {table} AS t JOIN other.{table} AS o ON o.id = t.id "
            f"WHERE {prefixed('t', columns)} <> {prefixed('o', columns)} LIMIT 1"
        )
        row = connection.execute(query).fetchone()
        if row is not None:
            raise StoreError(
                f"{path} holds a {table} {row[0]} that differs from the one here, so nothing was gathered. "
                "Audit both files."
            )


def prefixed(table: str, columns: str) -> str:
    """Column names, each of one table."""
    return " || ".join(f"{table}.{column.strip()}" for column in columns.split("||"))


def take_people(connection: sqlite3.Connection, path: str, rename: Mapping[str, str]) -> int:
    """Add reviewers and their changes of handle; refuse two people under one handle."""
    theirs = other_handles(connection)
    for old, new in rename.items():
        checked_handle(new)
        if old not in theirs.values():
            raise UnknownNameError("reviewer", old, f"Nobody in {path} has that handle; --rename {old}={new} is void.")
    people = take_rows(connection, "reviewer", "id, handle, joined_utc", "id")
    take_rows(connection, "reviewer_rename", "reviewer_id, handle, utc", "reviewer_id, handle, utc")
    for reviewer_id, handle in theirs.items():
        if handle in rename and handles(connection)[reviewer_id] != rename[handle]:
            row = (reviewer_id, rename[handle], after_all_names(connection, reviewer_id))
            connection.execute("INSERT INTO reviewer_rename VALUES (?, ?, ?)", row)
    held: dict[str, str] = {}
    for reviewer_id, handle in sorted(handles(connection).items()):
        if held.setdefault(handle, reviewer_id) != reviewer_id:
            raise HandleError(
                handle,
                f"{handle} is one person here and another in {path}; nothing was gathered. "
                f"Give theirs another handle: --rename {handle}=NEW.",
            )
    return people


def after_all_names(connection: sqlite3.Connection, reviewer_id: str) -> str:
    """A time just after the reviewer's last handle was taken: the same wherever the same change is made."""
    query = (
        "SELECT MAX(utc) FROM (SELECT utc FROM reviewer_rename WHERE reviewer_id = ?1 "
        "UNION ALL SELECT joined_utc FROM reviewer WHERE id = ?1)"
    )
    last = connection.execute(query, (reviewer_id,)).fetchone()[0]
    return later_utc(last, last)


def other_handles(connection: sqlite3.Connection) -> dict[str, str]:
    """Reviewer id -> handle, in the other queue."""
    by = dict(connection.execute("SELECT id, handle FROM other.reviewer").fetchall())
    query = "SELECT reviewer_id, handle FROM other.reviewer_rename ORDER BY utc, handle"
    by.update(connection.execute(query).fetchall())
    return by


def take_rows(connection: sqlite3.Connection, table: str, columns: str, key: str) -> int:
    """Add the other's rows of a table without local ids; how many were new."""
    same = " AND ".join(f"t.{column} = o.{column}" for column in key.split(", "))
    query = (
        f"INSERT INTO {table} ({columns}) SELECT {columns} FROM other.{table} AS o "
        f"WHERE NOT EXISTS (SELECT 1 FROM {table} AS t WHERE {same})"
    )
    return connection.execute(query).rowcount


def take_inputs(connection: sqlite3.Connection, path: str) -> tuple[int, set[int], int]:
    """Add loads, candidates and what was measured; (new candidates, changed ids, new measurements)."""
    take_rows(connection, "load", "utc", "utc")
    take_rows(connection, "attachment", "digest, kind, name, content", "digest")
    query = (
        "SELECT name FROM other.candidate AS o "
        "WHERE NOT EXISTS (SELECT 1 FROM candidate WHERE candidate.name = o.name) ORDER BY o.id"
    )
    changed: set[int] = set()
    for (name,) in connection.execute(query).fetchall():
        candidate_id = connection.execute("INSERT INTO candidate (name) VALUES (?)", (name,)).lastrowid
        deriving.insert_queue_row(connection, candidate_id, name)
        changed.add(candidate_id)
    candidates = len(changed)
    measurements = 0
    for table, (columns, key) in INPUTS.items():
        new = (
            f"FROM other.{table} AS t {SAME_CANDIDATE} {SAME_LOAD} WHERE NOT EXISTS (SELECT 1 FROM {table} AS mine "
            "WHERE mine.candidate_id = ours.id AND mine.load_id = our_load.id AND "
            + " AND ".join(f"mine.{column} = t.{column}" for column in key.split(", "))
            + ")"
        )
        changed |= {row[0] for row in connection.execute(f"SELECT DISTINCT ours.id {new}").fetchall()}
        theirs = ", ".join(f"t.{column}" for column in columns.split(", "))
        added = connection.execute(
            f"INSERT INTO {table} (candidate_id, load_id, {columns}) SELECT ours.id, our_load.id, {theirs} {new}"
        ).rowcount
        measurements += added if table == "measurement" else 0
    refuse(path, input_faults(connection, sorted(changed)))
    refuse(path, wrong_attachments(connection))
    refresh_inputs(connection, sorted(changed))
    return candidates, changed, measurements


def take_cited(connection: sqlite3.Connection, path: str) -> int:
    """Add the evidence that the other's rulings cite, as evidence of the past; how much was new."""
    cited = (
        f"FROM other.evidence AS t {SAME_CANDIDATE} WHERE EXISTS (SELECT 1 FROM other.ruling AS r "
        'WHERE r.candidate = theirs.name AND r."check" = t.kind AND r.evidence_digest = t.digest) '
        "AND NOT EXISTS (SELECT 1 FROM evidence AS mine "
        "WHERE mine.candidate_id = ours.id AND mine.kind = t.kind AND mine.digest = t.digest)"
    )
    return take_evidence(connection, path, cited, is_current=0)[1]


def adopt_current(connection: sqlite3.Connection, path: str) -> set[int]:
    """Make the other's current evidence ours where we have none and the inputs are the same; ids of the candidates."""
    none_here = (
        "ours.input_digest = theirs.input_digest AND t.is_current = 1 AND NOT EXISTS (SELECT 1 FROM evidence AS mine "
        "WHERE mine.candidate_id = ours.id AND mine.kind = t.kind AND mine.is_current = 1)"
    )
    held = (
        f"FROM other.evidence AS t {SAME_CANDIDATE} JOIN evidence AS held ON held.candidate_id = ours.id "
        f"AND held.kind = t.kind AND held.digest = t.digest WHERE {none_here}"
    )
    found = connection.execute(f"SELECT held.id, ours.id {held}").fetchall()
    connection.executemany("UPDATE evidence SET is_current = 1 WHERE id = ?", [(row_id,) for row_id, _ in found])
    adopted = f"FROM other.evidence AS t {SAME_CANDIDATE} WHERE {none_here}"
    return {candidate_id for _, candidate_id in found} | take_evidence(connection, path, adopted, is_current=1)[0]


def take_evidence(connection: sqlite3.Connection, path: str, which: str, *, is_current: int) -> tuple[set[int], int]:
    """Add the other's evidence that `which` gives, each read first; ids of the candidates, and how many were added."""
    changed: set[int] = set()
    count = 0
    query = f"SELECT ours.id, t.kind, t.version, t.digest, t.adequate, t.content {which}"
    connection.execute(f"CREATE TEMP TABLE taken AS {query}")
    try:
        cursor = connection.execute("SELECT * FROM temp.taken")
        while rows := cursor.fetchmany(1000):
            wrong = (Fault("input", f"evidence on {row[1]}", "is damaged.") for row in rows if not is_sound(row[1:]))
            refuse(path, wrong)
            changed |= {row[0] for row in rows}
            count += len(rows)
            connection.executemany(
                "INSERT INTO evidence (candidate_id, kind, version, digest, adequate, content, is_current) "
                f"VALUES (?, ?, ?, ?, ?, ?, {is_current})",
                rows,
            )
    finally:
        cursor.close()
        connection.execute("DROP TABLE temp.taken")
    return changed, count


def take_rulings(connection: sqlite3.Connection) -> tuple[int, set[int]]:
    """Add the other's rulings in the order of its log; (how many were new, ids of their candidates)."""
    columns = deriving.RULING_COLUMNS
    is_new = "NOT EXISTS (SELECT 1 FROM ruling WHERE ruling.id = o.id)"
    query = f"SELECT DISTINCT c.id FROM other.ruling AS o JOIN candidate AS c ON c.name = o.candidate WHERE {is_new}"
    ruled = {row[0] for row in connection.execute(query).fetchall()}
    added = connection.execute(
        f"INSERT INTO ruling ({columns}) SELECT {columns} FROM other.ruling AS o WHERE {is_new} ORDER BY o.seq"
    ).rowcount
    return added, ruled


def take_seals(connection: sqlite3.Connection) -> set[int]:
    """Add the seals that are open in the other queue; ids of the candidates where one was new."""
    new = (
        f"FROM other.seal_opened AS t {SAME_CANDIDATE} WHERE NOT EXISTS (SELECT 1 FROM seal_opened AS mine "
        "WHERE mine.reviewer_id = t.reviewer_id AND mine.candidate_id = ours.id)"
    )
    changed = {row[0] for row in connection.execute(f"SELECT DISTINCT ours.id {new}").fetchall()}
    connection.execute(f"INSERT INTO seal_opened (reviewer_id, candidate_id) SELECT t.reviewer_id, ours.id {new}")
    return changed


def names_of(connection: sqlite3.Connection, ids: list[int]) -> tuple[str, ...]:
    """The names of some candidates."""
    query = "SELECT name FROM candidate WHERE id = ?"
    return tuple(connection.execute(query, (candidate_id,)).fetchone()[0] for candidate_id in ids)
