"""Every sort of fault, made with plain sqlite3, is found and named."""

from __future__ import annotations

import os
import sqlite3
import threading

import pytest

from tests.store.making import rule, utc, walk
from tui.errors import InputError, StoreError
from tui.model import Candidate, Dip, Neighbour
from tui.store.audit import audit, backup
from tui.store.candidate_view import standing_for
from tui.store.candidates import candidate_count, save_candidates
from tui.store.chains import receipt
from tui.store.connect import open_queue
from tui.store.digests import queue_digest
from tui.store.records import LoadRecord
from tui.store.rulings import ruling_log
from tui.store.team import team_row


@pytest.fixture
def ruled(filled, team):
    """Walks of two reviewers on two candidates."""
    sides = Candidate("SM-0001", neighbours=(Neighbour(3.0),), dips=(Dip("e", "g", 0.1, 0.01),))
    save_candidates(filled, [LoadRecord(sides, "side")], utc(9))
    for second, name in enumerate(("SM-0001", "SM-0002")):
        for reviewer in team[:2]:
            walk(filled, reviewer, name, second=100 + second)
    return filled


def tamper(path, *statements, unguarded=None):
    """What somebody does with the file in hand; `unguarded`: a trigger taken away for the while and put back."""
    connection = sqlite3.connect(path, isolation_level=None)
    sql = connection.execute("SELECT sql FROM sqlite_master WHERE name = ?", (unguarded,)).fetchone()
    if unguarded:
        connection.execute(f"DROP TRIGGER {unguarded}")
    for statement in statements:
        assert connection.execute(statement).rowcount != 0
    if sql:
        connection.execute(sql[0])
    connection.close()


def test_a_sound_queue(ruled):
    report = audit(ruled)
    assert report.sound
    assert (report.candidates, report.measurements, report.rulings, report.reviewers) == (12, 36, 20, 3)
    assert report.queue_digest == queue_digest(ruled)
    assert list(report.heads) == ["curlew", "heron", "plover"]


@pytest.mark.parametrize(
    "change",
    [
        "note = 'x'",
        "ruling = 'explains'",
        "utc = substr(utc, 1, 18) || '9' || substr(utc, 20)",
        "seen_others = 1 - seen_others",
        "evidence_digest = 'tust-first'",
        '"check" = \'dust\'',
        "candidate = 'SM-0003'",
        "previous_hash = ''",
    ],
)
def test_one_edited_ruling_is_found_and_named(ruled, path, change):
    edited = list(ruling_log(ruled))[6]
    tamper(path, f"UPDATE ruling SET {change} WHERE seq = 7", unguarded="ruling_no_update")
    faults = [fault for fault in audit(ruled).faults if fault.kind == "chain"]
    assert f"ruling {edited.id}" in {fault.place for fault in faults}
    assert any("plover" in fault.text or "heron" in fault.text for fault in faults)


def test_an_edited_ruling_with_its_hash_made_anew_breaks_the_next(ruled, path):
    tamper(path, "UPDATE ruling SET note = 'x', hash = printf('%064x', 5) WHERE seq = 2", unguarded="ruling_no_update")
    faults = [fault for fault in audit(ruled).faults if fault.kind == "chain"]
    assert any("not in the log before it" in fault.text for fault in faults)


def test_a_ruling_cut_out_is_found(ruled, path):
    tamper(path, "DELETE FROM ruling WHERE seq = 3", unguarded="ruling_no_delete")
    assert "chain" in {fault.kind for fault in audit(ruled).faults}


def test_a_truncated_log_is_found_by_its_receipt_alone(ruled, team, path):
    given = [receipt(ruled, reviewer.id) for reviewer in team]
    assert audit(ruled, receipts=given).sound
    tamper(path, "DELETE FROM ruling WHERE seq > 14", unguarded="ruling_no_delete")
    assert {fault.kind for fault in audit(ruled).faults} == {"derived"}  # the chain alone cannot tell
    found = {fault.place for fault in audit(ruled, receipts=given).faults if fault.kind == "receipt"}
    assert found == {"heron", "plover"}


def test_a_receipt_holds_while_the_log_grows(ruled, team):
    given = receipt(ruled, team[0].id)
    assert given.startswith("heron:10:")
    walk(ruled, team[0], "SM-0003", second=500)
    assert audit(ruled, receipts=[given, receipt(ruled, team[2].id)]).sound


@pytest.mark.parametrize("text", ["", "heron", "heron:x:y", "heron:1:" + "0" * 63, "Heron:1:" + "0" * 64])
def test_what_is_no_receipt_is_said(ruled, text):
    with pytest.raises(InputError, match="receipt"):
        audit(ruled, receipts=[text])


@pytest.mark.parametrize(
    ("table", "change", "word"),
    [
        ("measurement", "flux_jy = flux_jy * 1.001 WHERE candidate_id = 1 AND band = 'J'", "measurement in J"),
        ("measurement", "exclude = 1 WHERE candidate_id = 1 AND band = 'J'", "measurement in J"),
        ("candidate_version", "facts = '{\"ra\":1}' WHERE candidate_id = 1", "facts"),
        ("neighbour", "separation_arcsec = 3.5", "neighbour"),
        ("dip", "depth = 0.2", "dip"),
    ],
)
def test_edited_inputs_are_found_and_named(ruled, path, table, change, word):
    tamper(path, f"UPDATE {table} SET {change}", unguarded=f"{table}_no_update")
    found = [fault for fault in audit(ruled).faults if fault.kind == "input"]
    assert [fault.place for fault in found] == ["SM-0001"]
    assert word in found[0].text


@pytest.mark.parametrize(
    "statement",
    [
        "DROP TRIGGER ruling_no_update",
        "DROP INDEX ruling_candidate",
        "CREATE TABLE extra (a)",
        "CREATE TRIGGER extra AFTER INSERT ON ruling BEGIN DELETE FROM claim; END",
        "CREATE VIEW extra AS SELECT * FROM ruling",
    ],
)
def test_a_changed_schema_is_found(ruled, path, statement):
    tamper(path, statement)
    (fault,) = audit(ruled).faults
    assert fault.kind == "schema"
    assert fault.place in statement


def test_a_weakened_trigger_is_found(ruled, path):
    weak = "CREATE TRIGGER ruling_no_delete BEFORE DELETE ON ruling BEGIN SELECT 1; END"
    tamper(path, "DROP TRIGGER ruling_no_delete", weak)
    assert [(fault.kind, fault.place) for fault in audit(ruled).faults] == [("schema", "ruling_no_delete")]


def test_dangling_references_are_found(ruled, path):
    tamper(path, "INSERT INTO claim VALUES (99, 'nobody', '2026')")
    assert {fault.kind for fault in audit(ruled).faults} == {"reference"}


@pytest.mark.parametrize(
    "statement",
    [
        "UPDATE queue_row SET outcome = 'ordinary' WHERE id = 1",
        "UPDATE queue_row SET fold = 'zz' WHERE id = 1",
        "UPDATE queue_row SET oddness = 99 WHERE id = 1",
        "UPDATE queue_row SET needs = 1 WHERE id = 1",
        "DELETE FROM queue_row WHERE id = 1",
        "DELETE FROM standing WHERE candidate_id = 1",
        "UPDATE reviewer_row SET seal_open = 0 WHERE candidate_id = 1",
        "DELETE FROM reviewer_row WHERE candidate_id = 1",
        "UPDATE candidate SET input_digest = 'x' WHERE id = 1",
        "INSERT INTO reviewer_row SELECT id, 1, 'short', 'short', 'short', 'short', 'short', 0, 5, 1, 1, 0 "
        "FROM reviewer WHERE handle = 'curlew'",
    ],
)
def test_derived_rows_that_do_not_follow_are_found_and_mended(ruled, path, statement):
    before = team_row(ruled, 1)
    tamper(path, statement)
    (fault,) = audit(ruled).faults
    assert (fault.kind, fault.place) == ("derived", "SM-0001")
    mended = audit(ruled, repair=True)
    assert mended.sound and mended.repaired == 1
    assert audit(ruled).sound
    assert team_row(ruled, 1) == before


def test_repair_leaves_the_log_alone(ruled, path):
    tamper(path, "UPDATE ruling SET note = 'x' WHERE seq = 7", unguarded="ruling_no_update")
    before = queue_digest(ruled)
    assert not audit(ruled, repair=True).sound
    assert queue_digest(ruled) == before


def test_damage_of_the_file_is_found(ruled, path):
    ruled.execute("PRAGMA wal_checkpoint(TRUNCATE)")
    ruled.execute("PRAGMA writable_schema = ON")  # an index that no longer fits its table
    ruled.execute("UPDATE sqlite_master SET sql = replace(sql, '(fold)', '(name)') WHERE name = 'queue_row_fold'")
    ruled.close()
    connection = open_queue(path)
    assert "file" in {fault.kind for fault in audit(connection).faults}
    connection.close()


def test_a_reader_may_audit(ruled, path):
    reader = open_queue(path, write=False)
    assert audit(reader).sound
    reader.close()


def test_a_backup_is_one_whole_file_made_while_others_write(ruled, team, path, tmp_path):
    stop = threading.Event()

    def keep_ruling():
        connection = open_queue(path)
        number = 0
        while not stop.is_set() or number < 3:
            rule(connection, team[2], f"SM-{3 + number % 9:04d}", "star", second=900 + number)
            number += 1
        connection.close()

    writer = threading.Thread(target=keep_ruling)
    writer.start()
    for number in range(3):
        backup(ruled, tmp_path / f"copy{number}.db")
    stop.set()
    writer.join()
    assert not [name for name in os.listdir(tmp_path) if name.startswith("copy") and not name.endswith(".db")]
    copy = open_queue(tmp_path / "copy2.db")
    assert candidate_count(copy) == 12
    assert audit(copy).sound
    copy.close()


def test_a_backup_goes_over_no_file(ruled, tmp_path):
    (tmp_path / "mine").write_text("precious")
    with pytest.raises(StoreError, match="left as it is"):
        backup(ruled, tmp_path / "mine")
    with pytest.raises(StoreError, match="cannot be written"):
        backup(ruled, tmp_path / "no" / "folder.db")
    assert (tmp_path / "mine").read_text() == "precious"


def test_evidence_that_cannot_be_read_is_found(ruled, path):
    tamper(
        path,
        "UPDATE evidence SET content = '{}' WHERE candidate_id = 9 AND kind = 'dust'",
        unguarded="evidence_no_update",
    )
    assert [(fault.kind, fault.place) for fault in audit(ruled).faults] == [("input", "SM-0009")]
    with pytest.raises(StoreError, match="damaged"):
        standing_for(ruled, None, "SM-0009")
