"""Copies worked on apart come to the same queue in any order, any grouping, any number of times."""

from __future__ import annotations

import os
import shutil
import sqlite3
from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.store.making import evidence, rule, star, utc, walk
from tui.errors import HandleError, StoreError, UnknownNameError
from tui.model import CHECKS, Candidate, Measurement, Ruling
from tui.store import gather as gathering
from tui.store.audit import audit
from tui.store.candidates import candidate_digests, candidate_names, get_candidate, save_candidates
from tui.store.connect import open_queue
from tui.store.digests import queue_digest
from tui.store.drafts import save_draft
from tui.store.evidence import current_evidence, save_evidence
from tui.store.gather import gather
from tui.store.records import LoadRecord
from tui.store.reviewers import add_reviewer, reviewer_by_handle, reviewers
from tui.store.rulings import append_ruling, insert_ruling, ruling_hash, ruling_log
from tui.store.settings import read_settings, setting_history, write_setting
from tui.store.team import team_standing


@pytest.fixture
def copies(templates, tmp_path):
    """Three copies of one queue, open."""
    opened = []
    for name in "abc":
        shutil.copy(templates / "filled.db", tmp_path / f"{name}.db")
        opened.append(open_queue(tmp_path / f"{name}.db"))
    yield opened
    for connection in opened:
        connection.close()


def person(connection, handle="heron"):
    return reviewer_by_handle(connection, handle)


def states(connection):
    """What the team sees, by name: ids are local."""
    return {row.name: (row.outcome, row.pending_reason, row.states, row.counts) for row in team_standing(connection)}


def test_rulings_of_a_copy_are_taken_in_once(copies):
    ours, theirs, _ = copies
    walk(ours, person(ours, "heron"), "SM-0001")
    walk(theirs, person(theirs, "plover"), "SM-0001")
    report = gather(ours, theirs.queue_path)
    assert (report.rulings, report.candidates, report.affected) == (5, 0, ())
    assert states(ours)["SM-0001"][0] == "unexplained"
    assert gather(ours, theirs.queue_path).rulings == 0
    assert audit(ours).sound


def test_the_other_file_is_only_read(copies, tmp_path):
    ours, theirs, third = copies
    walk(theirs, person(theirs, "plover"), "SM-0001")
    path = theirs.queue_path
    theirs.close()
    third.close()
    before = Path(path).read_bytes()
    gather(ours, path)
    assert Path(path).read_bytes() == before
    assert sorted(os.listdir(tmp_path)) == ["a.db", "a.db-shm", "a.db-wal", "b.db", "c.db"]


def test_one_person_on_two_copies_forks_their_chain(copies):
    ours, theirs, _ = copies
    rule(ours, person(ours), "SM-0001", "star", "short", 100)
    rule(theirs, person(theirs), "SM-0001", "star", "explains", 200)
    gather(ours, theirs.queue_path)
    assert [ruling.previous_hash for ruling in ruling_log(ours)] == ["", ""]
    assert states(ours)["SM-0001"][3]["star"].explains == 1  # the later of two heads
    rule(ours, person(ours), "SM-0002", "star", second=300)
    assert audit(ours).sound


def test_two_people_under_one_handle_are_refused_until_one_is_renamed(copies):
    ours, theirs, third = copies
    add_reviewer(ours, "ruff", utc(10))
    other = add_reviewer(theirs, "ruff", utc(11))
    walk(theirs, other, "SM-0001")
    digest = queue_digest(ours)
    with pytest.raises(HandleError, match="--rename ruff=NEW"):
        gather(ours, theirs.queue_path)
    assert queue_digest(ours) == digest
    with pytest.raises(HandleError):
        gather(ours, theirs.queue_path, {"ruff": "heron"})
    with pytest.raises(UnknownNameError):
        gather(ours, theirs.queue_path, {"nobody": "stint", "ruff": "stint"})
    report = gather(ours, theirs.queue_path, {"ruff": "stint"})
    assert report.rulings == 5
    assert person(ours, "stint").id == other.id
    assert gather(ours, theirs.queue_path).rulings == 0  # once said, it need not be said again
    assert gather(ours, theirs.queue_path, {"ruff": "stint"}).rulings == 0
    gather(third, ours.queue_path)
    assert [one.handle for one in reviewers(third)] == ["curlew", "heron", "plover", "ruff", "stint"]


def test_candidates_and_measurements_of_a_diverged_copy_are_taken_in(copies):
    ours, theirs, _ = copies
    save_candidates(ours, [LoadRecord(star("SM-0001", J=3.0)), LoadRecord(star("only ours"))], utc(50))
    save_candidates(theirs, [LoadRecord(star("SM-0001", J=4.0)), LoadRecord(star("only theirs"))], utc(60))
    repeat = Candidate("SM-0002", (Measurement("J", 9.0, 1.0, source="UKIDSS"),))
    save_candidates(theirs, [LoadRecord(repeat)], utc(70))
    report = gather(ours, theirs.queue_path)
    assert report.candidates == 1
    assert set(report.affected) == {"SM-0001", "SM-0002", "only theirs"}
    assert [one.flux_jy for one in get_candidate(ours, "SM-0001").measurements if one.band == "J"] == [4.0]
    assert len(get_candidate(ours, "SM-0002").measurements) == 4
    gather(theirs, ours.queue_path)
    assert queue_digest(ours) == queue_digest(theirs)
    names = candidate_names(ours)
    assert candidate_digests(ours, names) == candidate_digests(theirs, names)
    assert audit(ours).sound


def test_cited_evidence_comes_along_and_todays_stays(copies):
    ours, theirs, _ = copies
    save_evidence(theirs, [("SM-0001", evidence("dust", True, "theirs"))])
    rule(theirs, person(theirs, "plover"), "SM-0001", "dust", "explains")
    assert gather(ours, theirs.queue_path).evidence == 1
    assert current_evidence(ours, "SM-0001")["dust"].digest == "dust-first"
    assert states(ours)["SM-0001"][3]["dust"].stale == 1


def test_evidence_on_the_same_inputs_is_adopted_where_we_have_none(copies, queue):
    theirs = copies[0]
    walk(theirs, person(theirs), "SM-0001")
    report = gather(queue, theirs.queue_path)
    assert (report.candidates, report.reviewers, report.rulings) == (12, 3, 5)
    assert current_evidence(queue, "SM-0001") == current_evidence(theirs, "SM-0001")
    assert states(queue) == states(theirs)
    assert queue_digest(queue) == queue_digest(theirs)
    assert audit(queue).sound


def test_settings_are_gathered_and_the_latest_holds(copies):
    ours, theirs, _ = copies
    walk(ours, person(ours), "SM-0001")
    write_setting(ours, "quorum", "3", utc(100))
    write_setting(theirs, "quorum", "1", utc(200))
    assert gather(ours, theirs.queue_path).settings == 1
    assert read_settings(ours).quorum == 1
    assert len(setting_history(ours)) == 2
    assert states(ours)["SM-0001"][0] == "unexplained"


def test_an_opened_seal_stays_open_in_the_gathered_queue(copies):
    ours, theirs, _ = copies
    walk(theirs, person(theirs), "SM-0001")
    gather(ours, theirs.queue_path)
    query = "SELECT seal_open FROM reviewer_row WHERE candidate_id = 1"
    assert ours.execute(query).fetchall() == [(1,)]


def test_drafts_and_claims_stay_where_they_are(copies):
    ours, theirs, _ = copies
    save_draft(theirs, person(theirs).id, "SM-0001", "dust", "unfinished")
    gather(ours, theirs.queue_path)
    assert ours.execute("SELECT COUNT(*) FROM draft").fetchone() == (0,)


def test_a_copy_on_a_network_filesystem_can_be_gathered(copies, monkeypatch):
    ours, theirs, _ = copies
    walk(theirs, person(theirs), "SM-0001")  # still in its log, not yet in the file
    network = theirs.queue_path
    monkeypatch.setattr(gathering, "network_type", lambda path: "nfs4" if path == network else "")
    assert gather(ours, network).rulings == 5


def test_an_older_copy_is_gathered_and_left_as_it_is(copies, tmp_path):
    from tui.store.schema import migrate

    old = tmp_path / "old.db"
    connection = sqlite3.connect(old, isolation_level=None)
    connection.execute("BEGIN IMMEDIATE")
    migrate(connection, 2)
    connection.execute("COMMIT")
    connection.close()
    before = old.read_bytes()
    assert gather(copies[0], old).rulings == 0
    assert old.read_bytes() == before
    assert not (tmp_path / "old.db.v2.bak").exists()


def refused(ours, path, match):
    digest = queue_digest(ours)
    with pytest.raises(StoreError, match=match):
        gather(ours, path)
    assert queue_digest(ours) == digest
    assert "other" not in {row[1] for row in ours.execute("PRAGMA database_list").fetchall()}
    assert ours.execute("SELECT name FROM temp.sqlite_master").fetchall() == []


def test_what_cannot_be_gathered_is_refused_whole(copies, tmp_path):
    ours = copies[0]
    (tmp_path / "text.db").write_text("no queue")
    refused(ours, tmp_path / "text.db", "not a Plainlight queue")
    refused(ours, tmp_path / "none.db", "no queue")
    refused(ours, ours.queue_path, "itself")


@pytest.mark.parametrize(
    ("statements", "match"),
    [
        (["DROP TRIGGER ruling_no_update", "UPDATE ruling SET note = 'x'"], "ruling_no_update"),
        (["CREATE TRIGGER evil AFTER INSERT ON ruling BEGIN DELETE FROM claim; END"], "evil"),
        (["CREATE VIEW evil AS SELECT 1"], "evil"),
        (["INSERT INTO setting VALUES ('deadbeef', 'quorum', 'lots', '2026-01-01T00:00:00.000000Z', '')"], "quorum"),
        (
            [
                "INSERT INTO load (id, utc) VALUES (77, '2026-01-01T00:00:00.000000Z')",
                "INSERT INTO measurement SELECT candidate_id, band, 'evil', epoch, digest, 77, value, value_error, "
                "unit, 9.0, error_jy, is_limit, nsigma, flags, exclude, note FROM measurement LIMIT 1",
            ],
            "changed after it was loaded",
        ),
        (["INSERT INTO candidate (name) VALUES ('A' || char(0x30a) || 'ngstrom')"], "NFC"),
        (["INSERT INTO load (utc) VALUES ('2026-01-01Tsome dayZ')"], "not a time"),
        (["INSERT INTO load (utc) VALUES ('9999-12-31T23:59:59.999999Z')"], "not a time"),
        (["INSERT INTO attachment VALUES (printf('%064x', 1), 'grid', 'evil', x'00')"], "attachment"),
        (
            [
                "UPDATE evidence SET is_current = 0 WHERE kind = 'dust'",
                "INSERT INTO evidence (candidate_id, kind, version, digest, content, is_current) "
                "VALUES (1, 'dust', 1, 'evil', '{\"fits\": [3]}', 1)",
            ],
            None,
        ),
        (
            [
                "INSERT INTO load (id, utc) VALUES (77, '2026-01-01T00:00:00.000000Z')",
                "INSERT INTO candidate_version VALUES (1, 'evil', printf('%032x', 1), 77, "
                "replace(hex(zeroblob(900)), '00', '[') || replace(hex(zeroblob(900)), '00', ']'))",
            ],
            "cannot be trusted",
        ),
    ],
    ids=[
        *("unguarded", "trigger", "view", "setting", "measurement", "name", "time", "far time", "attachment"),
        *("uncited evidence", "nested facts"),
    ],
)
def test_a_file_that_was_tampered_with_is_refused_whole(copies, statements, match):
    ours, theirs, _ = copies
    walk(theirs, person(theirs), "SM-0001")
    plain = sqlite3.connect(theirs.queue_path, isolation_level=None)
    for statement in statements:
        plain.execute(statement)
    plain.close()
    digest = queue_digest(ours)
    if match is None:  # what nothing cites is not taken in, damaged or not
        assert gather(ours, theirs.queue_path).rulings == 5
        assert current_evidence(ours, "SM-0001")["dust"].digest == "dust-first"
        return
    with pytest.raises(Exception, match=match) as caught:
        gather(ours, theirs.queue_path)
    assert isinstance(caught.value, (StoreError, ValueError))
    assert queue_digest(ours) == digest


@pytest.mark.parametrize(
    "content",
    ['{"fits": [3]}', "[]", "7", '{"fits":[],"cautions":[7],"facts":{},"bands":[]}', '{"fits":{},"cautions":[]}'],
)
def test_damaged_evidence_that_is_cited_is_refused(copies, content):
    ours, theirs, _ = copies
    plain = sqlite3.connect(theirs.queue_path, isolation_level=None)
    plain.execute("UPDATE evidence SET is_current = 0 WHERE candidate_id = 1 AND kind = 'dust'")
    plain.execute(
        "INSERT INTO evidence (candidate_id, kind, version, digest, content, is_current) "
        "VALUES (1, 'dust', 1, 'evil', ?, 0)",
        (content,),
    )
    plain.close()
    rule(theirs, person(theirs), "SM-0002", "star")
    made = replace(next(ruling_log(theirs)), id="feedfacefeedface", candidate="SM-0001", check="dust")
    made = replace(made, evidence_digest="evil", previous_hash=made.hash)
    insert_ruling(theirs, replace(made, hash=ruling_hash(made)))
    refused(ours, theirs.queue_path, "damaged")


def test_an_edited_ruling_in_the_other_file_is_refused(copies):
    ours, theirs, _ = copies
    walk(theirs, person(theirs), "SM-0001")
    plain = sqlite3.connect(theirs.queue_path, isolation_level=None)
    guard = plain.execute("SELECT sql FROM sqlite_master WHERE name = 'ruling_no_update'").fetchone()[0]
    plain.execute("DROP TRIGGER ruling_no_update")
    plain.execute("UPDATE ruling SET note = 'x' WHERE seq = 2")
    plain.execute(guard)
    plain.close()
    refused(ours, theirs.queue_path, "changed after it was written")


def test_one_id_for_two_rulings_is_refused(copies):
    ours, theirs, _ = copies
    for connection, word in ((ours, "short"), (theirs, "explains")):
        made = Ruling("SM-0001", "dust", person(connection).id, word, utc=utc(100), id="feedfacefeedface")
        append_ruling(connection, made)
    refused(ours, theirs.queue_path, "differs")


# One step of a history: which copy, which reviewer, candidate, check, word, second (clocks disagree between copies).
STEP = st.tuples(
    st.integers(0, 2), st.integers(0, 2), st.integers(1, 2), st.sampled_from(CHECKS),
    st.sampled_from(("explains", "short", "unclear", "withdrawn")), st.integers(0, 50),
)  # fmt: skip
OTHER_STEP = st.one_of(
    st.tuples(st.just("load"), st.integers(0, 2), st.integers(1, 14), st.sampled_from((1.0, 2.0)), st.integers(0, 50)),
    st.tuples(st.just("set"), st.integers(0, 2), st.sampled_from(("1", "2", "3")), st.integers(0, 50)),
    st.tuples(st.just("gather"), st.integers(0, 2), st.integers(0, 2)),
)


def play(copies, history):
    """Carry out a history; what the rules of the log refuse is left out."""
    for step in history:
        if step[0] == "load":
            _, copy, number, flux, second = step
            save_candidates(copies[copy], [LoadRecord(star(f"SM-{number:04d}", J=flux))], utc(100 + second))
        elif step[0] == "set":
            _, copy, value, second = step
            write_setting(copies[copy], "quorum", value, utc(second))
        elif step[0] == "gather":
            _, copy, other = step
            if copy != other:
                gather(copies[copy], copies[other].queue_path)
        else:
            copy, who, number, check, word, second = step
            reviewer = reviewers(copies[copy])[who]
            if word != "withdrawn" or copies[copy].execute("SELECT 1 FROM ruling LIMIT 1").fetchone():
                try:
                    rule(copies[copy], reviewer, f"SM-{number:04d}", check, word, 200 + second)
                except StoreError as error:
                    assert "withdraw" in str(error)


def assess(connection):
    """Evidence from the inputs alone, as one version of the code would give it."""
    names = candidate_names(connection)
    for name, digest in candidate_digests(connection, names).items():
        turn = int(digest[:2], 16) % 3
        rows = [(name, evidence(check, (True, False, None)[turn], digest[:8])) for check in CHECKS]
        save_evidence(connection, rows)


@settings(max_examples=12, deadline=None, suppress_health_check=list(HealthCheck))
@given(
    history=st.lists(st.one_of(STEP, STEP, STEP, OTHER_STEP), max_size=14),
    orders=st.lists(st.permutations(range(3)), min_size=2, max_size=2),
    again=st.lists(st.integers(0, 2), max_size=2),
)
def test_any_order_grouping_and_repetition_end_in_the_same(templates, tmp_path_factory, history, orders, again):
    folder = tmp_path_factory.mktemp("copies")
    copies = []
    for name in "abc":
        shutil.copy(templates / "filled.db", folder / f"{name}.db")
        copies.append(open_queue(folder / f"{name}.db"))
        copies[-1].execute("PRAGMA synchronous = OFF")  # speed; nothing here is about power cuts
    play(copies, history)
    ends = []
    for number, order in enumerate(orders):
        target = folder / f"end{number}.db"
        shutil.copy(templates / "filled.db", target)
        end = open_queue(target)
        end.execute("PRAGMA synchronous = OFF")
        for one in (*order, *again):
            gather(end, copies[one].queue_path)
        ends.append(end)
    gather(copies[0], copies[1].queue_path)  # grouped: first two together, then the third
    gather(copies[0], copies[2].queue_path)
    ends.append(copies[0])
    assert len({queue_digest(end) for end in ends}) == 1
    for end in ends:
        assess(end)
    seen = [(states(end), audit(end).faults) for end in ends]
    for connection in (*ends, *copies[1:]):
        connection.close()
    assert seen[0] == seen[1] == seen[2]
    assert seen[0][1] == ()
