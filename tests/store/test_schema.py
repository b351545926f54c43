"""Every forbidden write, tried with plain sqlite3 as someone with the file in hand would."""

from __future__ import annotations

import shutil
import sqlite3

import numpy as np
import pytest

from tests.store.making import evidence, rule, utc, walk
from tui.errors import StoreError
from tui.model import Candidate, Dip, Neighbour, Spectrum
from tui.store.candidates import save_candidates
from tui.store.connect import open_queue
from tui.store.evidence import save_evidence
from tui.store.records import Cutout, LoadRecord
from tui.store.reviewers import rename_reviewer, reviewer_by_handle
from tui.store.settings import write_setting
from tui.store.sides import attach, save_cutout

LOGS = (
    *("load", "candidate", "candidate_version", "measurement", "neighbour", "dip", "spectrum", "cutout", "attachment"),
    *("reviewer", "reviewer_rename", "ruling", "setting", "seal_opened"),
)


@pytest.fixture(scope="module")
def full_file(templates, tmp_path_factory):
    """A file in which every log has at least one row."""
    path = tmp_path_factory.mktemp("full") / "full.db"
    shutil.copy(templates / "filled.db", path)
    connection = open_queue(path)
    heron, curlew = (reviewer_by_handle(connection, handle) for handle in ("heron", "curlew"))
    wave = np.array([1.0, 2.0, 3.0])
    extra = Candidate(
        "SM-0001", neighbours=(Neighbour(4.0),), dips=(Dip("e", "J", 0.1, 0.01),), spectrum=Spectrum(wave, wave, wave)
    )
    save_candidates(connection, [LoadRecord(extra, "side")], utc(50))
    save_cutout(connection, "SM-0001", Cutout("J", wave.reshape(1, 3), 1.0), utc(51))
    attach(connection, "band", "mine", b"bytes")
    walk(connection, heron, "SM-0001")
    rename_reviewer(connection, curlew.id, "ruff", utc(60))
    write_setting(connection, "quorum", "3", utc(70))
    connection.close()
    return path


@pytest.fixture
def full(full_file, path):
    """A plain connection to a copy, without any pragma of ours."""
    shutil.copy(full_file, path)
    connection = sqlite3.connect(path, isolation_level=None)
    yield connection
    connection.close()


def columns(connection, table):
    return [row[1] for row in connection.execute(f"PRAGMA table_info({table})")]


@pytest.mark.parametrize("table", LOGS)
def test_no_row_of_a_log_is_removed(full, table):
    assert full.execute(f"SELECT COUNT(*) FROM {table}").fetchone()[0] > 0
    with pytest.raises(sqlite3.IntegrityError, match="never removed"):
        full.execute(f"DELETE FROM {table}")


@pytest.mark.parametrize("table", [name for name in LOGS if name != "candidate"])
def test_no_column_of_a_log_is_changed(full, table):
    for column in columns(full, table):
        with pytest.raises(sqlite3.IntegrityError, match="never changed"):
            full.execute(f'UPDATE {table} SET "{column}" = "{column}"')


@pytest.mark.parametrize("column", ["id", "name"])
def test_no_candidate_is_renamed(full, column):
    with pytest.raises(sqlite3.IntegrityError, match="never changed"):
        full.execute(f"UPDATE candidate SET {column} = {column}")


@pytest.mark.parametrize("way", ["INSERT", "INSERT OR REPLACE", "REPLACE", "INSERT OR IGNORE"])
@pytest.mark.parametrize("table", LOGS)
def test_no_row_is_written_over(full, table, way):
    names = ", ".join(f'"{name}"' for name in columns(full, table))
    before = full.execute(f"SELECT * FROM {table}").fetchall()
    with pytest.raises(sqlite3.IntegrityError, match="never written twice"):
        full.execute(f"{way} INTO {table} ({names}) SELECT {names} FROM {table} LIMIT 1")
    assert full.execute(f"SELECT * FROM {table}").fetchall() == before


@pytest.mark.parametrize("table", ["spectrum", "cutout", "attachment", "ruling"])
def test_no_row_is_written_over_by_its_rowid(full, table):
    names = [name for name in columns(full, table) if name != "seq"]
    size = 16 if table in ("spectrum", "cutout") else 32
    fresh = f"lower(hex(randomblob({size})))"
    changed = ", ".join(fresh if name in ("digest", "hash", "id") else f'"{name}"' for name in names)
    listed = ", ".join(f'"{name}"' for name in names)
    with pytest.raises(sqlite3.IntegrityError, match="never written twice"):
        full.execute(f"REPLACE INTO {table} (rowid, {listed}) SELECT rowid, {changed} FROM {table} LIMIT 1")


def test_an_upsert_changes_no_ruling(full):
    with pytest.raises(sqlite3.IntegrityError):
        full.execute(
            "INSERT INTO ruling SELECT * FROM ruling WHERE true LIMIT 1 "
            "ON CONFLICT (id) DO UPDATE SET ruling = 'explains'"
        )


@pytest.mark.parametrize("column", ["kind", "version", "digest", "adequate", "content"])
def test_evidence_is_never_changed(full, column):
    with pytest.raises(sqlite3.IntegrityError, match="never changed"):
        full.execute(f"UPDATE evidence SET {column} = {column}")


def test_cited_evidence_is_never_removed(full):
    with pytest.raises(sqlite3.IntegrityError, match="cites"):
        full.execute("DELETE FROM evidence")


def test_cited_evidence_is_never_written_over(full):
    with pytest.raises(sqlite3.IntegrityError, match="never written twice"):
        full.execute("REPLACE INTO evidence SELECT * FROM evidence LIMIT 1")


@pytest.mark.parametrize(
    ("column", "value"),
    [
        ("ruling", "'yes'"),
        ('"check"', "'colour'"),
        ("seen_others", "2"),
        ("seen_others", "'no'"),
        ("utc", "'yesterday'"),
        ("hash", "'short'"),
        ("note", "NULL"),
        ("note", "x''"),
        ("note", "printf('%.*c', 20001, 'n')"),
        ("previous_hash", "printf('%064x', 7)"),
        ("previous_hash", "(SELECT hash FROM ruling LIMIT 1)"),  # of another reviewer
        ("replaces", "'0123456789abcdef'"),
        ("replaces", "(SELECT id FROM ruling LIMIT 1)"),
    ],
)
def test_a_ruling_out_of_form_is_refused(full, column, value):
    plover = full.execute("SELECT id FROM reviewer WHERE handle = 'plover'").fetchone()[0]
    row = {
        "id": "'feedfacefeedface'",
        "candidate": "'SM-0001'",
        '"check"': "'dust'",
        "reviewer_id": f"'{plover}'",
        "ruling": "'short'",
        "note": "''",
        "evidence_digest": "''",
        "seen_others": "0",
        "replaces": "''",
        "utc": f"'{utc(999)}'",
        "previous_hash": "''",
        "hash": "printf('%064x', 1)",
    }
    full.execute("BEGIN")
    full.execute(f"INSERT INTO ruling ({', '.join(row)}) VALUES ({', '.join(row.values())})")
    full.execute("ROLLBACK")
    row[column] = value
    with pytest.raises(sqlite3.IntegrityError):
        full.execute(f"INSERT INTO ruling ({', '.join(row)}) VALUES ({', '.join(row.values())})")


@pytest.mark.parametrize("handle", ["", "Heron", "a b", "é", "x" * 33, "[/]"])
def test_a_handle_out_of_form_is_refused(full, handle):
    with pytest.raises(sqlite3.IntegrityError):
        full.execute("INSERT INTO reviewer VALUES ('0123456789abcdef', ?, ?)", (handle, utc()))


def test_dangling_references_are_refused_on_our_connections(filled):
    with pytest.raises(StoreError, match="FOREIGN KEY"):
        filled.execute("INSERT INTO seal_opened VALUES ('nobody-at-all', 1)")


def test_uncited_evidence_may_go(filled):
    save_evidence(filled, [("SM-0001", evidence("dust", digest="second"))])
    query = "SELECT digest FROM evidence WHERE candidate_id = 1 AND kind = 'dust'"
    assert filled.execute(query).fetchall() == [("dust-second",)]


def test_cited_evidence_stays_when_replaced(filled, team):
    rule(filled, team[0], "SM-0001", "dust")
    save_evidence(filled, [("SM-0001", evidence("dust", digest="second"))])
    query = "SELECT digest, is_current FROM evidence WHERE candidate_id = 1 AND kind = 'dust' ORDER BY digest"
    assert filled.execute(query).fetchall() == [("dust-first", 0), ("dust-second", 1)]
