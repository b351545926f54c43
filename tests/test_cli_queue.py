"""The commands on a queue with hand-made evidence: what is printed where, and with which status."""

from __future__ import annotations

import os
import subprocess
import sys
from contextlib import closing
from dataclasses import replace

import pytest
from click.testing import CliRunner

from tui.cli.dossier import adequacy_words
from tui.cli.group import cli
from tui.model import CHECKS, Candidate, Evidence, Fit, Measurement, digest
from tui.store.candidates import save_candidates
from tui.store.connect import open_queue
from tui.store.evidence import save_evidence
from tui.store.records import LoadRecord

UTC = "2026-01-01T00:00:00.000000Z"
HOSTILE = "[/]\u202eSM \u200bünï 星"


def evidence(name, kind):
    fit = Fit(kind, 20.0, 5, 1e-6, 24.0, 25.0, {}, {"W3": 8.0})
    return Evidence(kind, 1, kind == "dust", (fit,), (), {}, digest([name, kind]), ("J", "W3"))


@pytest.fixture
def queue(tmp_path, monkeypatch):
    monkeypatch.setenv("PLAINLIGHT_CONFIG", str(tmp_path / "none.toml"))
    path = str(tmp_path / "q.db")
    names = ["SM-1", "SM-2", HOSTILE, "N" * 200]
    measured = (Measurement("J", 1.0, 0.02), Measurement("W3", 1.0, 0.02))
    with closing(open_queue(path, create=True)) as connection:
        save_candidates(connection, [LoadRecord(Candidate(name, measured), "t") for name in names], UTC)
        save_evidence(connection, [(name, evidence(name, check)) for name in names for check in CHECKS])
    assert run("join", path, "heron").exit_code == run("join", path, "plover").exit_code == 0
    return path


def run(*arguments):
    return CliRunner().invoke(cli, arguments)


def test_list_is_tab_separated_and_cuts_no_name(queue):
    result = run("list", queue, "--sort", "name")
    lines = [line.split("\t") for line in result.stdout.splitlines()]
    assert result.exit_code == 0 and lines[0][:2] == ["name", "oddness"] and {len(line) for line in lines} == {12}
    assert {line[0] for line in lines[1:]} == {"SM-1", "SM-2", "[/]\ufffdSM \u200bünï 星", "N" * 200}
    assert {line[9] for line in lines[1:]} == {"sealed"}


def test_list_next_gives_two_people_different_names(queue):
    first = run("list", queue, "--next", "--as", "heron").stdout.strip()
    second = run("list", queue, "--next", "--as", "plover").stdout.strip()
    assert first and second and first != second


def test_next_needs_a_handle_and_takes_it_from_the_config(queue, tmp_path, monkeypatch):
    assert run("list", queue, "--next").exit_code == 2
    (tmp_path / "config.toml").write_text('handle = "heron"')
    monkeypatch.setenv("PLAINLIGHT_CONFIG", str(tmp_path / "config.toml"))
    assert run("list", queue, "--next").exit_code == 0


def test_shares_part_the_queue(queue):
    parts = [run("list", queue, "--share", f"{index}/3").stdout.splitlines()[1:] for index in (1, 2, 3)]
    assert sorted(row.split("\t")[0] for part in parts for row in part) == sorted(
        row.split("\t")[0] for row in run("list", queue).stdout.splitlines()[1:]
    )
    assert run("list", queue, "--share", "4/3").exit_code == 2
    assert run("list", queue, "--share", "x").exit_code == 2


def test_story_tells_what_was_loaded_and_keeps_the_seal(queue):
    result = run("story", queue, "SM-1", "--as", "heron")
    assert result.exit_code == 0 and "2026-01-01T00:00:00Z" in result.stdout and "sealed" in result.stderr


def test_set_shows_writes_and_remembers(queue):
    assert "quorum" in run("set", queue).stdout
    assert "follow" in run("set", queue, "quorum", "3", "--as", "heron").stdout
    history = run("set", queue, "quorum").stdout
    assert "heron" in history and "3" in history
    assert run("set", queue, "quorum", "many").exit_code == run("set", queue, "beauty", "3").exit_code == 2


@pytest.mark.parametrize(
    "arguments",
    [
        ("list", "{q}", "--as", "nobody"),
        ("story", "{q}", "SM-9"),
        ("join", "{q}", "Upper Case"),
        ("join", "{q}", "heron"),
        ("rule", "{q}", "SM-1", "dust", "explains", "--as", "nobody"),
        ("rule", "{q}", "SM-1", "dust", "explains"),
        ("rule", "{q}", "SM-1", "dust", "withdrawn", "--as", "heron"),
        ("review", "{q}", "--as", "heron"),
        ("list", "{q}.none"),
        ("load", "{q}", "{q}.none"),
    ],
)
def test_refusals_are_one_line_and_status_2(queue, arguments):
    result = run(*(text.format(q=queue) for text in arguments))
    assert (result.exit_code, result.stdout) == (2, "")
    assert result.stderr.startswith("plainlight: ") and result.stderr.count("\n") == 1


def test_a_file_that_is_no_queue_is_left_untouched(tmp_path):
    path = tmp_path / "notes.txt"
    path.write_text("not a queue")
    result = run("list", str(path))
    assert result.exit_code == 2 and path.read_text() == "not a queue" and os.listdir(tmp_path) == ["notes.txt"]


def test_review_on_a_dumb_terminal_names_the_commands(queue, monkeypatch):
    monkeypatch.setenv("TERM", "dumb")
    result = run("review", queue, "--as", "heron")
    assert result.exit_code == 2 and "plainlight list" in result.stderr and "rule" in result.stderr


def test_a_reader_who_stops_early_costs_nothing(queue):
    process = subprocess.Popen(
        [sys.executable, "-m", "tui", "list", queue], stdout=subprocess.PIPE, stderr=subprocess.PIPE
    )
    process.stdout.close()
    with process.stderr:
        assert process.stderr.read() == b""
    assert process.wait(timeout=60) == 0


def test_a_configured_handle_of_other_queues_does_not_hinder_looking(queue, tmp_path, monkeypatch):
    (tmp_path / "config.toml").write_text('handle = "stranger"')
    monkeypatch.setenv("PLAINLIGHT_CONFIG", str(tmp_path / "config.toml"))
    assert run("list", queue).exit_code == run("story", queue, "SM-1").exit_code == 0
    assert run("set", queue, "quorum", "3").exit_code == 0
    assert run("list", queue, "--next").exit_code == run("list", queue, "--as", "nobody").exit_code == 2


def test_thousands_of_refusals_do_not_fill_the_terminal(tmp_path):
    (tmp_path / "t.csv").write_text("name,J_mag,H_mag\n" + "".join(f"A{n},bright,8\n" for n in range(30)))
    result = run("load", str(tmp_path / "q.db"), str(tmp_path / "t.csv"))
    said = result.stderr.splitlines()
    assert result.exit_code == 1 and sum("bright" in text for text in said) == 20
    assert said[-1] == "30 refused, of which these are the first 20; all of them: --refused FILE."
    written = run("load", str(tmp_path / "q.db"), str(tmp_path / "t.csv"), "--refused", str(tmp_path / "r.txt"))
    assert (tmp_path / "r.txt").read_text().count("bright") == 30 and "bright" not in written.stderr


def test_assessing_an_empty_queue_says_that_it_is_empty(tmp_path):
    open_queue(str(tmp_path / "q.db"), create=True).close()
    result = run("assess", str(tmp_path / "q.db"))
    assert (result.exit_code, result.stdout) == (0, f"{tmp_path / 'q.db'} holds no candidates.\n")


@pytest.mark.parametrize(
    ("fact", "words"),
    [
        ("dip_stands", "not adequate: the fit stands, but a dip is unexplained"),
        ("spectrum_misfits", "not adequate: the fit stands, but the star's own spectrum misfits"),
        ("nothing", "not adequate: no fit explains the data"),
    ],
)
def test_what_speaks_against_a_standing_fit_is_named(fact, words):
    fit = Fit("star", 3.3, 8, 0.92, 8.0, 9.0, {}, {"W3": 0.9})
    made = Evidence("star", 1, False, (fit,), (), {fact: True}, "d", ("J", "W3"))
    assert adequacy_words(made, 0.01) == words
    refused = replace(made, fits=(replace(fit, p=1e-6),))
    assert adequacy_words(refused, 0.01) == "not adequate: no fit explains the data"


def test_story_has_a_heading_for_every_column(queue):
    lines = run("story", queue, "SM-1").stdout.splitlines()
    assert lines[0].split("  ")[-1].strip() == "bands, ruling, note"
    measured = next(text for text in lines if "measured" in text)
    assert measured.index("J W3") == lines[0].index("bands, ruling, note")
