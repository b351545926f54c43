"""Evidence: one current row a candidate and kind; older ones stay where a ruling cites them.

The digest names an evidence within its candidate and kind, so it must cover the version of the code.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Iterable, Mapping, Sequence

from tui.errors import StoreError, UnknownNameError
from tui.model import KINDS, Evidence
from tui.store import deriving
from tui.store.candidates import ids_of, pages
from tui.store.codec import evidence_from, evidence_text
from tui.store.connect import immediate
from tui.store.names import findable, id_of

IS_CITED = (
    "SELECT 1 FROM ruling JOIN candidate ON candidate.name = ruling.candidate "
    'WHERE candidate.id = ? AND ruling."check" = ? AND ruling.evidence_digest = ? LIMIT 1'
)
Held = tuple[int, str, int, int]  # row id, digest, version, is_current


def save_evidence(connection: sqlite3.Connection, rows: Iterable[tuple[str, Evidence]]) -> None:
    """Make each evidence the current one of its candidate and kind, in one transaction with the derived rows.

    Args:
        rows: (candidate name, evidence with its digest set). Hand in some hundred candidates at once, not all.
    Raises:
        UnknownNameError: no such candidate or kind.
        StoreError: an evidence without digest, or one whose digest is on file with another version.
    """
    rows = list(rows)
    with immediate(connection):
        names = {name: findable(name) for name, _ in rows}
        ids = ids_of(connection, set(names.values()))
        newest: dict[tuple[int, str], Evidence] = {}
        for name, evidence in rows:
            if names[name] not in ids:
                raise UnknownNameError("candidate", name)
            newest[ids[names[name]], checked(evidence).kind] = evidence
        touched = list({candidate_id for candidate_id, _ in newest})
        held = held_evidence(connection, touched)
        fresh = [
            (candidate_id, evidence)
            for (candidate_id, kind), evidence in newest.items()
            if make_room(connection, candidate_id, evidence, held.get((candidate_id, kind), []))
        ]
        insert_evidence(connection, fresh)
        stars = {candidate_id: evidence for (candidate_id, kind), evidence in newest.items() if kind == "star"}
        deriving.refresh_after_evidence(connection, touched, stars)


def checked(evidence: Evidence) -> Evidence:
    """The evidence itself; refused where it cannot be kept."""
    if evidence.kind not in KINDS:
        raise UnknownNameError("kind of evidence", evidence.kind)
    if not evidence.digest:
        raise StoreError(f"Evidence on {evidence.kind} without a digest cannot be kept.")
    return evidence


def held_evidence(connection: sqlite3.Connection, ids: Sequence[int]) -> dict[tuple[int, str], list[Held]]:
    """(candidate id, kind) -> (row id, digest, version, is_current) of all evidence on file."""
    held: dict[tuple[int, str], list[Held]] = {}
    for page in pages(ids):
        query = (
            "SELECT candidate_id, kind, id, digest, version, is_current FROM evidence "
            f"WHERE candidate_id IN ({', '.join('?' * len(page))})"
        )
        for candidate_id, kind, *row in connection.execute(query, page).fetchall():
            held.setdefault((candidate_id, kind), []).append(tuple(row))
    return held


def make_room(connection: sqlite3.Connection, candidate_id: int, evidence: Evidence, held: Sequence[Held]) -> bool:
    """Retire the current row, which goes unless a ruling cites it; whether the new one has still to be added."""
    again = [row_id for row_id, digest, _, _ in held if digest == evidence.digest]
    for row_id, digest, version, is_current in held:
        if digest == evidence.digest:
            if version != evidence.version:
                raise StoreError(f"Evidence on {evidence.kind} has one digest for two versions; the digest must tell.")
            if is_current:
                return False
        elif is_current and not connection.execute(IS_CITED, (candidate_id, evidence.kind, digest)).fetchone():
            connection.execute("DELETE FROM evidence WHERE id = ?", (row_id,))
        elif is_current:
            connection.execute("UPDATE evidence SET is_current = 0 WHERE id = ?", (row_id,))
    if again:
        connection.execute("UPDATE evidence SET is_current = 1 WHERE id = ?", again)
    return not again


def insert_evidence(connection: sqlite3.Connection, rows: Iterable[tuple[int, Evidence]]) -> None:
    """Add rows of (candidate id, evidence), each the current one of its kind."""
    connection.executemany(
        "INSERT INTO evidence (candidate_id, kind, version, digest, adequate, content, is_current) "
        "VALUES (?, ?, ?, ?, ?, ?, 1)",
        [
            (candidate_id, one.kind, one.version, one.digest, None if one.adequate is None else int(one.adequate),
             evidence_text(one))
            for candidate_id, one in rows
        ],  # fmt: skip
    )


def current_evidence(connection: sqlite3.Connection, name: str) -> dict[str, Evidence]:
    """Kind -> the evidence kept as current; kinds never computed are absent."""
    return deriving.current_of(connection, id_of(connection, name))


def current_evidence_of(connection: sqlite3.Connection, names: Sequence[str]) -> dict[str, dict[str, Evidence]]:
    """Name -> kind -> current evidence, for several candidates in few queries (export)."""
    found: dict[str, dict[str, Evidence]] = {name: {} for name in names}
    for page in pages(list(names)):
        query = (
            "SELECT name, kind, version, digest, adequate, content FROM candidate "
            "JOIN evidence ON candidate_id = candidate.id AND is_current = 1 "
            f"WHERE name IN ({', '.join('?' * len(page))})"
        )
        for name, kind, *row in connection.execute(query, page).fetchall():
            found[name][kind] = evidence_from(kind, *row)
    return found


def evidence_by_digest(connection: sqlite3.Connection, digest: str) -> Evidence:
    """An evidence by its digest, current or cited; UnknownNameError if the queue holds none of it."""
    query = "SELECT kind, version, digest, adequate, content FROM evidence WHERE digest = ? ORDER BY id LIMIT 1"
    row = connection.execute(query, (digest,)).fetchone()
    if row is None:
        raise UnknownNameError("evidence", digest)
    return evidence_from(*row)


def evidence_digests(connection: sqlite3.Connection, names: Sequence[str]) -> dict[str, dict[str, str]]:
    """Name -> kind -> digest of the current evidence; without reading the evidence itself."""
    found: dict[str, dict[str, str]] = {name: {} for name in names}
    for page in pages(list(names)):
        query = (
            "SELECT name, kind, digest FROM candidate JOIN evidence ON candidate_id = candidate.id AND is_current = 1 "
            f"WHERE name IN ({', '.join('?' * len(page))})"
        )
        for name, kind, digest in connection.execute(query, page).fetchall():
            found[name][kind] = digest
    return found


def outdated(connection: sqlite3.Connection, wanted: Mapping[str, Mapping[str, str]]) -> dict[str, tuple[str, ...]]:
    """Which evidence lacks or has another digest than it would get today.

    Args:
        wanted: candidate name -> kind -> digest that today's inputs, code and settings give.
    Returns:
        Name -> kinds to compute, in the order of `wanted`; names with none are absent.
    """
    held = evidence_digests(connection, list(wanted))
    lacking = {
        name: tuple(kind for kind, digest in kinds.items() if held[name].get(kind) != digest)
        for name, kinds in wanted.items()
    }
    return {name: kinds for name, kinds in lacking.items() if kinds}
