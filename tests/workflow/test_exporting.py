"""The vetted list of a queue: which candidates, which numbers, which metadata; masked where nothing was computed."""

from __future__ import annotations

import os
from contextlib import closing

import pytest
from astropy.table import Table

from tui.errors import InputError
from tui.model import CHECKS, Candidate
from tui.store.candidates import save_candidates
from tui.store.connect import open_queue
from tui.store.records import LoadRecord
from tui.workflow.exporting import Selection, export
from tui.workflow.session import Session


@pytest.fixture
def ruled(queue):
    """Two reviewers end SM-0001 as unexplained, SM-0002 as explained by dust; one never assessed star more."""
    for handle in ("heron", "plover"):
        with Session.open(queue, handle) as session:
            evidence = {name: session.stored_evidence(name) for name in ("SM-0001", "SM-0002")}
            for check in CHECKS:
                session.rule("SM-0001", check, "short", "", evidence["SM-0001"][check].digest)
            session.rule("SM-0002", "dust", "explains", "", evidence["SM-0002"]["dust"].digest)
    with closing(open_queue(queue)) as connection:
        save_candidates(connection, [LoadRecord(Candidate("SM-0004"), "late")], "2026-03-01T00:00:00.000000Z")
    return queue


def exported(queue, tmp_path, **selection):
    out = str(tmp_path / "list.ecsv")
    export(queue, out, Selection(**selection), force=True)
    return Table.read(out)


def test_every_candidate_is_a_row_with_outcome_states_and_counts(ruled, tmp_path):
    table = exported(ruled, tmp_path)
    rows = {row["name"]: row for row in table}
    assert list(table["name"]) == ["SM-0001", "SM-0002", "SM-0003", "SM-0004"]
    assert table["outcome"].tolist()[:3] == ["unexplained", "explained", "pending"]
    assert (rows["SM-0001"]["dust_state"], rows["SM-0001"]["dust_short"]) == ("short", 2)
    assert (rows["SM-0002"]["dust_state"], rows["SM-0002"]["dust_explains"]) == ("explains", 2)
    assert rows["SM-0003"]["pending_reason"].startswith("open:star")


def test_numbers_are_there_where_computed_and_masked_elsewhere(ruled, tmp_path):
    table = exported(ruled, tmp_path)
    assert table["star_teff"].tolist() == [5772.0] * 3 + [None]
    assert table["star_teff_high"][0] == pytest.approx(6349.2) and table["star_dof"].tolist() == [5, 5, 5, None]
    assert table["extinction_r_v"].tolist() == [3.1] * 3 + [None]
    assert table["extinction_r_v_low"].mask.all() and table["dip_slope"].mask.all() and table["mixture_chi2"].mask.all()
    assert table["odd_band"].tolist() == ["W3"] * 3 + [None]
    assert table["cautions"][0].startswith("star: one band carries it; ")
    assert table["photosphere"].tolist() == ["dwarfs"] * 3 + [None]


def test_a_selection_narrows_the_list(ruled, tmp_path):
    assert list(exported(ruled, tmp_path, outcome="unexplained")["name"]) == ["SM-0001"]
    assert list(exported(ruled, tmp_path, unresolved="dust")["name"]) == ["SM-0003", "SM-0004"]
    (tmp_path / "truth.csv").write_text("name,nature\nSM-0001,none\n")
    table = exported(ruled, tmp_path, controls=str(tmp_path / "truth.csv"))
    assert "SM-0001" not in list(table["name"]) and table.meta["selection"]["controls_left_out"] is True


def test_the_metadata_say_how_the_list_was_made(ruled, tmp_path):
    meta = exported(ruled, tmp_path).meta
    assert meta["reviewers"] == ["heron", "plover"] and meta["thresholds"]["quorum"] == 2
    assert meta["code_versions"]["star"] >= 1 and len(meta["queue_digest"]) == 64
    assert "no detection" in meta["caution"] and meta["agreement"]["overall"]["raw"] == 1.0


def test_what_is_missing_is_said(ruled, tmp_path):
    assert "1 of them has no evidence" in export(ruled, str(tmp_path / "a.csv")).sentence()


def test_a_refused_export_does_no_work(ruled, tmp_path):
    (tmp_path / "list.csv").write_text("mine")
    with pytest.raises(InputError, match="--force"):
        export(ruled, str(tmp_path / "list.csv"))
    with pytest.raises(InputError, match=".ecsv"):
        export(ruled, str(tmp_path / "list.xlsx"))
    assert (tmp_path / "list.csv").read_text() == "mine" and "list.xlsx" not in os.listdir(tmp_path)


def test_progress_is_told(ruled, tmp_path):
    told = []
    export(ruled, str(tmp_path / "b.csv"), report=lambda done, total: told.append((done, total)))
    assert told == [(4, 4)]
