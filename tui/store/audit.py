"""Is this queue whole, is it what people wrote, and does what it shows follow from that?

Found: damage of the file, a missing or altered trigger or table, broken references, any edit of a
ruling, measurement or fact, a truncated log where a receipt is at hand, derived rows that do not
follow. Not found: rows cut off the end of a log without a receipt; a file made up anew with all
hashes computed again; edited numbers in evidence, which computing it again would show.
"""

from __future__ import annotations

import os
import sqlite3
from collections.abc import Iterable, Iterator, Sequence
from pathlib import Path

from tui.errors import StoreError, reason_of
from tui.model import Settings
from tui.store import deriving
from tui.store.candidates import refresh_inputs
from tui.store.chains import chain_faults, receipt, receipt_faults
from tui.store.connect import flush, immediate, in_memory, snapshot, write_copy
from tui.store.digests import queue_digest
from tui.store.inputs import derived_inputs, input_faults, wrong_attachments, wrong_evidence, wrong_times
from tui.store.names import folded, ring
from tui.store.records import AuditReport, Fault
from tui.store.reviewers import reviewers
from tui.store.schema import migrate
from tui.store.settings import read_settings

__all__ = ["audit", "backup", "queue_digest", "receipt"]


def audit(connection: sqlite3.Connection, repair: bool = False, receipts: Sequence[str] = ()) -> AuditReport:
    """Look at everything; with `repair`, write derived rows that are wrong anew, and nothing else.

    Args:
        receipts: texts as `receipt` gave them to reviewers.
    Raises:
        InputError: a text that is no receipt.
        StoreError: the file is so damaged that it cannot be read.
    """
    with immediate(connection) if repair else snapshot(connection):
        faults = [*file_faults(connection), *schema_faults(connection), *reference_faults(connection)]
        faults += [*chain_faults(connection), *receipt_faults(connection, receipts)]
        ids = [row[0] for row in connection.execute("SELECT id FROM candidate ORDER BY id").fetchall()]
        faults += [*wrong_times(connection), *input_faults(connection, ids), *wrong_attachments(connection)]
        faults += wrong_evidence(connection)
        wrong = dict.fromkeys([*derived_inputs(connection, ids), *wrong_rows(connection, ids)])
        if repair and wrong:
            mend(connection, list(wrong))
        else:
            faults += [derived_fault(connection, candidate_id) for candidate_id in wrong]
        return AuditReport(
            faults=tuple(faults),
            candidates=len(ids),
            measurements=connection.execute("SELECT COUNT(*) FROM measurement").fetchone()[0],
            rulings=connection.execute("SELECT COUNT(*) FROM ruling").fetchone()[0],
            reviewers=connection.execute("SELECT COUNT(*) FROM reviewer").fetchone()[0],
            queue_digest=queue_digest(connection),
            heads={one.handle: receipt(connection, one.id) for one in reviewers(connection)},
            repaired=len(wrong) if repair else 0,
        )


def file_faults(connection: sqlite3.Connection) -> Iterator[Fault]:
    """What SQLite's own check finds: torn pages, indexes that miss rows, broken CHECKs."""
    for (text,) in connection.execute("PRAGMA integrity_check(20)").fetchall():
        if text != "ok":
            yield Fault("file", "SQLite", f"{text}.")


def schema_faults(connection: sqlite3.Connection, schema: str = "main") -> Iterator[Fault]:
    """Tables, indexes and triggers that lack, differ, or do not belong here."""
    kept = schema_of(connection, schema)
    wanted = expected_schema()
    for name in sorted(wanted.keys() | kept.keys()):
        if name not in kept:
            yield Fault("schema", name, "is missing, so that the file does not guard what it should.")
        elif name not in wanted:
            yield Fault("schema", name, "does not belong in a queue.")
        elif kept[name] != wanted[name]:
            yield Fault("schema", name, "is not as the program made it.")


def schema_of(connection: sqlite3.Connection, schema: str) -> dict[str, tuple[str, str]]:
    """Name -> type and SQL of all that the file defines; SQLite's own statistics apart."""
    query = f"SELECT name, type, COALESCE(sql, '') FROM {schema}.sqlite_master WHERE name NOT LIKE 'sqlite_stat%'"
    return {name: (kind, sql) for name, kind, sql in connection.execute(query).fetchall()}


def expected_schema() -> dict[str, tuple[str, str]]:
    """The same of a queue that was just made."""
    fresh = in_memory()
    try:
        fresh.execute("BEGIN IMMEDIATE")
        migrate(fresh)
        fresh.execute("COMMIT")
        return schema_of(fresh, "main")
    finally:
        fresh.close()


def reference_faults(connection: sqlite3.Connection) -> Iterator[Fault]:
    """Rows that point at a row that is not there."""
    for table, row_id, parent, _ in connection.execute("PRAGMA foreign_key_check").fetchall():
        place = f"{table} row {row_id}" if row_id is not None else table
        yield Fault("reference", place, f"points at a {parent} that is not there.")


def wrong_rows(connection: sqlite3.Connection, ids: Iterable[int]) -> Iterator[int]:
    """Ids of the candidates whose derived rows do not follow from log, evidence and settings."""
    settings = read_settings(connection)
    for candidate_id in ids:
        try:
            wanted = wanted_rows(connection, candidate_id, settings)
        except StoreError:  # evidence that cannot be read, which is a fault of its own
            continue
        if kept_rows(connection, candidate_id) != wanted:
            yield candidate_id


def wanted_rows(connection: sqlite3.Connection, candidate_id: int, settings: Settings) -> tuple[object, ...]:
    """The derived rows of a candidate, computed."""
    ground = deriving.ground_of(connection, candidate_id)
    derived = deriving.derive(ground, settings)
    name = connection.execute("SELECT name FROM candidate WHERE id = ?", (candidate_id,)).fetchone()[0]
    stands = sorted(derived.standing)
    queue = (name, folded(name), ring(name), *derived.queue)
    return queue, stands, sorted(derived.reviewers), derived.opened <= ground.opened


def kept_rows(connection: sqlite3.Connection, candidate_id: int) -> tuple[object, ...]:
    """The derived rows of a candidate, as they lie in the file."""
    columns = ", ".join(("name", "fold", "ring", *deriving.QUEUE_COLUMNS))
    queue = connection.execute(f"SELECT {columns} FROM queue_row WHERE id = ?", (candidate_id,)).fetchone()
    queries = [f"SELECT {kept.columns} FROM {kept.table} WHERE candidate_id = ?" for kept in deriving.KEPT]
    stands, readers = (connection.execute(query, (candidate_id,)).fetchall() for query in queries)
    return queue, sorted(stands), sorted(readers), True


def derived_fault(connection: sqlite3.Connection, candidate_id: int) -> Fault:
    """The fault of a candidate whose derived rows are wrong."""
    name = connection.execute("SELECT name FROM candidate WHERE id = ?", (candidate_id,)).fetchone()[0]
    return Fault("derived", name, "its states do not follow from the log; mend with: plainlight audit QUEUE --repair.")


def mend(connection: sqlite3.Connection, ids: Sequence[int]) -> None:
    """Write the derived rows of some candidates anew."""
    refresh_inputs(connection, ids)
    settings = read_settings(connection)
    for candidate_id in ids:
        name = connection.execute("SELECT name FROM candidate WHERE id = ?", (candidate_id,)).fetchone()[0]
        for table, column in (("standing", "candidate_id"), ("reviewer_row", "candidate_id"), ("queue_row", "id")):
            connection.execute(f"DELETE FROM {table} WHERE {column} = ?", (candidate_id,))
        deriving.insert_queue_row(connection, candidate_id, name)
        deriving.refresh(connection, [candidate_id], settings)


def backup(connection: sqlite3.Connection, path: str | os.PathLike[str]) -> None:
    """Write the queue as it stands to one new file, while others go on writing.

    Raises:
        StoreError: the file exists, or cannot be written.
    """
    path = os.fspath(path)
    if os.path.exists(path):
        raise StoreError(f"{path} exists and was left as it is; give another name for the backup.")
    part = f"{path}.part"
    try:
        write_copy(connection, part)
        flush(part)
        os.link(part, path) if hasattr(os, "link") else os.rename(part, path)
    except FileExistsError:
        raise StoreError(f"{path} exists and was left as it is; give another name for the backup.") from None
    except (sqlite3.Error, OSError) as error:
        why = reason_of(error) if isinstance(error, OSError) else "its folder must exist and have room"
        raise StoreError(f"{path} cannot be written: {why}.") from error
    finally:
        for name in (part, f"{part}-journal"):
            Path(name).unlink(missing_ok=True)
