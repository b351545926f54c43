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
        texts = []
        for name, evidence in rows:
            if names[name] not in ids:
                raise UnknownNameError("candidate", name)
            if evidence.kind not in KINDS:
                raise UnknownNameError("kind of evidence", evidence.kind)
            texts.append((ids[names[name]], evidence))
        for candidate_id, evidence in texts:
            make_current(connection, candidate_id, evidence)
        deriving.refresh(connection, dict.fromkeys(candidate_id for candidate_id, _ in texts))


def make_current(connection: sqlite3.Connection, candidate_id: int, evidence: Evidence) -> None:
    """Put one evidence in the place of the current one, which goes unless a ruling cites it."""
    if not evidence.digest:
        raise StoreError(f"Evidence on {evidence.kind} without a digest cannot be kept.")
    query = (
        "SELECT id, digest, version, is_current FROM evidence "
        "WHERE candidate_id = ? AND kind = ? AND (is_current = 1 OR digest = ?)"
    )
    for row_id, digest, version, is_current in connection.execute(
        query, (candidate_id, evidence.kind, evidence.digest)
    ).fetchall():
        if digest == evidence.digest:
            if version != evidence.version:
                raise StoreError(f"Evidence on {evidence.kind} has one digest for two versions; the digest must tell.")
            if is_current:
                return
        elif not connection.execute(IS_CITED, (candidate_id, evidence.kind, digest)).fetchone():
            connection.execute("DELETE FROM evidence WHERE id = ?", (row_id,))
        else:
            connection.execute("UPDATE evidence SET is_current = 0 WHERE id = ?", (row_id,))
    key = (candidate_id, evidence.kind, evidence.digest)
    again = "UPDATE evidence SET is_current = 1 WHERE candidate_id = ? AND kind = ? AND digest = ?"
    if connection.execute(again, key).rowcount:
        return
    insert_evidence(connection, candidate_id, evidence, is_current=True)


def insert_evidence(connection: sqlite3.Connection, candidate_id: int, evidence: Evidence, *, is_current: bool) -> None:
    """Add one row."""
    adequate = None if evidence.adequate is None else int(evidence.adequate)
    connection.execute(
        "INSERT INTO evidence (candidate_id, kind, version, digest, adequate, content, is_current) "
        "VALUES (?, ?, ?, ?, ?, ?, ?)",
        (
            *(candidate_id, evidence.kind, evidence.version, evidence.digest, adequate),
            *(evidence_text(evidence), int(is_current)),
        ),
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
