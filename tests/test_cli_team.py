"""The team's commands: tally, export, gather, audit; on copies that were worked on apart."""

from __future__ import annotations

import json
import sqlite3
from contextlib import closing

import pytest
from click.testing import CliRunner

from tui.cli.group import cli
from tui.model import CHECKS, Candidate, Evidence, Fit, Measurement, digest
from tui.store import connect, waiting
from tui.store.candidates import save_candidates
from tui.store.connect import open_queue
from tui.store.evidence import save_evidence
from tui.store.records import LoadRecord
from tui.workflow.session import Session

UTC = "2026-01-01T00:00:00.000000Z"
NAMES = ("SM-1", "SM-2", "SM-3")


def evidence(name, kind):
    fit = Fit(kind, 20.0, 5, 1e-6, 24.0, 25.0, {}, {"W3": 8.0})
    return Evidence(kind, 1, kind == "dust", (fit,), (), {}, digest([name, kind]), ("J", "W3"))


def run(*arguments):
    return CliRunner().invoke(cli, arguments)


def rule(path, handle, name, check, ruling):
    with Session.open(path, handle) as session:
        session.rule(name, check, ruling, "", session.stored_evidence(name)[check].digest)


@pytest.fixture
def queue(tmp_path, monkeypatch):
    monkeypatch.setenv("PLAINLIGHT_CONFIG", str(tmp_path / "none.toml"))
    path = str(tmp_path / "q.db")
    measured = (Measurement("J", 1.0, 0.02), Measurement("W3", 1.0, 0.02))
    with closing(connect.open_queue(path, create=True)) as connection:
        save_candidates(connection, [LoadRecord(Candidate(name, measured), "t") for name in NAMES], UTC)
        save_evidence(connection, [(name, evidence(name, check)) for name in NAMES for check in CHECKS])
    for handle in ("heron", "plover"):
        assert run("join", path, handle).exit_code == 0
    return path


def test_the_tally_counts_and_says_what_it_means(queue):
    for handle in ("heron", "plover"):
        for check in CHECKS:
            rule(queue, handle, "SM-1", check, "short")
    text = run("tally", queue).stdout
    for words in ("past every seal", "1 settled of 3", "SM-1", "warm dust", "no detection", "heron"):
        assert words in text
    found = json.loads(run("tally", queue, "--json").stdout)
    assert found["survivors"]["names"] == ["SM-1"] and found["outcomes"]["unexplained"]["count"] == 1


def test_controls_leave_the_counts_and_give_rates(queue, tmp_path):
    (tmp_path / "truth.csv").write_text("name,nature\nSM-1,dust\n")
    rule(queue, "heron", "SM-1", "dust", "explains")
    text = run("tally", queue, "--controls", str(tmp_path / "truth.csv")).stdout
    assert "1 control is left out where candidates are counted" in text and "1/1" in text
    assert run("tally", queue, "--controls", str(tmp_path / "none.csv")).exit_code == 2


def test_copies_worked_on_apart_are_gathered_once(queue, tmp_path):
    copy = str(tmp_path / "copy.db")
    assert run("audit", queue, "--backup", copy).exit_code == 0
    rule(copy, "plover", "SM-2", "dust", "explains")
    rule(queue, "heron", "SM-2", "dust", "explains")
    assert "1 ruling" in run("gather", queue, copy).stdout
    assert "nothing new" in run("gather", queue, copy).stdout
    outcomes = json.loads(run("tally", queue, "--json").stdout)["outcomes"]
    assert outcomes["explained"]["names"] == ["SM-2"]


def test_two_people_under_one_handle_are_refused_with_the_mend(queue, tmp_path):
    other = str(tmp_path / "other.db")
    with closing(connect.open_queue(other, create=True)) as connection:
        save_candidates(connection, [LoadRecord(Candidate("SM-1"), "t")], UTC)
    run("join", other, "heron")
    refused = run("gather", queue, other)
    assert refused.exit_code == 2 and "--rename heron=" in refused.stderr
    assert run("gather", queue, other, "--rename", "heron=crane").exit_code == 0
    with Session.open(queue) as session:
        assert [one.handle for one in session.reviewers()] == ["crane", "heron", "plover"]


def test_an_unrelated_queue_is_taken_in_only_where_that_is_meant(queue, tmp_path):
    other = str(tmp_path / "other.db")
    (tmp_path / "t.csv").write_text("name,J_mag,J_err\nZ-1,8,0.02\n")
    run("load", other, str(tmp_path / "t.csv"))
    before = run("audit", queue).stdout
    refused = run("gather", queue, other)
    assert refused.exit_code == 2 and "hardly a colleague's copy" in refused.stderr
    assert run("audit", queue).stdout == before
    taken = run("gather", queue, other, "--unrelated")
    assert taken.exit_code == 0 and "1 candidate," in taken.stdout and "None of its candidates was in" in taken.stdout


def test_an_empty_queue_gathers_any(tmp_path, queue):
    open_queue(str(tmp_path / "empty.db"), create=True).close()
    taken = run("gather", str(tmp_path / "empty.db"), queue)
    assert taken.exit_code == 0 and "3 candidates" in taken.stdout and "None of" not in taken.stdout


def test_export_looks_past_every_seal_and_so_knows_no_sealed(queue, tmp_path):
    refused = run("export", queue, str(tmp_path / "list.csv"), "--outcome", "sealed")
    assert refused.exit_code == 2 and "'sealed' is not one of" in refused.stderr


def test_gathering_a_queue_into_itself_is_refused(queue):
    assert run("gather", queue, queue).exit_code == 2


def test_a_sound_queue_passes_its_audit_and_gives_receipts(queue):
    rule(queue, "heron", "SM-1", "dust", "short")
    result = run("audit", queue)
    assert result.exit_code == 0 and "Sound" in result.stdout
    receipt = next(line.split(": ")[1] for line in result.stdout.splitlines() if line.startswith("Receipt of heron"))
    checked = run("audit", queue, "--receipt", receipt)
    assert checked.exit_code == 0 and "1 receipt checked" in checked.stdout
    assert run("audit", queue, "--receipt", "nonsense").exit_code == 2


def test_a_ruling_edited_by_other_means_is_found_and_named(queue):
    rule(queue, "heron", "SM-1", "dust", "short")
    with closing(sqlite3.connect(queue)) as connection:
        connection.execute("DROP TRIGGER ruling_no_update")
        connection.execute("UPDATE ruling SET ruling = 'explains'")
        connection.commit()
    result = run("audit", queue)
    assert result.exit_code == 1 and "heron on dust of SM-1" in result.stdout


def test_a_cut_chain_is_found_by_its_receipt(queue, tmp_path):
    before = str(tmp_path / "before.db")
    run("audit", queue, "--backup", before)
    rule(queue, "heron", "SM-1", "dust", "short")
    with Session.open(queue, "heron") as session:
        (tmp_path / "receipts.txt").write_text(session.receipt() + "\n")
    assert run("audit", before, "--receipt", str(tmp_path / "receipts.txt")).exit_code == 1


def test_a_backup_never_replaces_a_file(queue, tmp_path):
    (tmp_path / "b.db").write_text("mine")
    assert run("audit", queue, "--backup", str(tmp_path / "b.db")).exit_code == 2
    assert (tmp_path / "b.db").read_text() == "mine"


def test_export_says_where_and_refuses_to_replace(queue, tmp_path):
    out = str(tmp_path / "list.vot")
    assert run("export", queue, out).stdout == f"Wrote 3 candidates to {out}.\n"
    assert run("export", queue, out).exit_code == 2 and run("export", queue, out, "--force").exit_code == 0
    assert run("export", queue, str(tmp_path / "list.doc")).exit_code == 2


def test_a_locked_queue_is_said_plainly(queue, monkeypatch):
    monkeypatch.setattr(waiting, "BUSY_SECONDS", 0.05)
    with closing(sqlite3.connect(queue, isolation_level=None)) as holder:
        holder.execute("BEGIN IMMEDIATE")
        result = run("join", queue, "curlew")
        holder.execute("ROLLBACK")
    assert result.exit_code == 2 and "locked" in result.stderr and result.stderr.count("\n") == 1
