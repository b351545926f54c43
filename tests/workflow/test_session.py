"""One reader at one queue: what is handed on, what is refused, what the seal lets through."""

from __future__ import annotations

import os
import shutil
import threading

import pytest

from tui.errors import HandleError, StoreError, UnknownNameError
from tui.workflow.records import MAX_NOTE, Filter
from tui.workflow.session import Session


@pytest.fixture
def heron(queue):
    with Session.open(queue, "heron") as session:
        yield session


def rule(session, name, check, ruling, note=""):
    return session.rule(name, check, ruling, note, session.stored_evidence(name)[check].digest)


def test_an_unknown_handle_is_refused_with_the_way_to_join(queue):
    with pytest.raises(HandleError, match="plainlight join"):
        Session.open(queue, "nobody")


def test_a_missing_queue_is_refused(tmp_path):
    with pytest.raises(StoreError, match="no queue"):
        Session.open(str(tmp_path / "none.db"))


def test_rows_come_in_the_order_asked(heron):
    assert [row.name for row in heron.rows(heron.order("name", descending=False))] == ["SM-0001", "SM-0002", "SM-0003"]
    assert heron.name_of(heron.id_of("SM-0002")) == "SM-0002"
    assert list(heron.find("sm-0003")) == list(heron.find("0003", substring=True)) == [heron.id_of("SM-0003")]
    assert heron.counts()["needs_me"] == 3


def test_a_reader_without_a_handle_may_look_and_not_rule(queue):
    with Session.open(queue) as session:
        assert session.rows(session.order())[0].outcome == "sealed"
        with pytest.raises(HandleError, match="--as|handle"):
            session.rule("SM-0001", "star", "short", evidence_digest="")


def test_a_ruling_cites_the_evidence_on_screen_and_is_in_the_file(heron, queue):
    made = rule(heron, "SM-0001", "dust", "explains", "T = 300 K")
    assert made.evidence_digest == heron.stored_evidence("SM-0001")["dust"].digest
    with Session.open(queue, "heron") as again:
        assert again.view("SM-0001").own["dust"].note == "T = 300 K"


def test_a_withdrawn_ruling_is_the_readers_no_more(heron):
    rule(heron, "SM-0001", "dust", "explains")
    assert heron.withdraw("SM-0001", "dust").ruling == "withdrawn"
    assert "dust" not in heron.view("SM-0001").own
    with pytest.raises(StoreError, match="withdraw"):
        heron.withdraw("SM-0001", "star")


def test_no_such_check_or_candidate_is_named(heron):
    with pytest.raises(UnknownNameError, match="dusty"):
        heron.rule("SM-0001", "dusty", "short")
    with pytest.raises(UnknownNameError, match="SM-9"):
        heron.view("SM-9")


def test_others_stay_sealed_until_the_walk_ends(queue):
    with Session.open(queue, "heron") as heron, Session.open(queue, "plover") as plover:
        rule(heron, "SM-0001", "dust", "explains", "secret")
        seen = plover.view("SM-0001")
        assert (seen.states["dust"], seen.outcome, seen.others, seen.seal_open) == ("todo", "sealed", [], False)
        assert "secret" not in str(plover.story("SM-0001")) + str(plover.rows(plover.order()))
        rule(plover, "SM-0001", "star", "explains")
        opened = plover.view("SM-0001")
        assert opened.seal_open and [line.note for line in opened.others] == ["secret"]
        assert rule(plover, "SM-0001", "dust", "short").seen_others


def test_two_people_get_different_candidates(queue):
    with Session.open(queue, "heron") as heron, Session.open(queue, "plover") as plover:
        first = heron.claim_next()
        assert plover.next_for_me() != first and plover.claim_next() != first
        heron.release(first)
        assert heron.next_for_me(skip=[first]) != first


def test_drafts_and_place_survive_a_crash(heron, queue):
    heron.save_draft("SM-0002", "blend", "half a thou")
    heron.save_position("SM-0002", "blend")
    with Session.open(queue, "heron") as again:
        assert again.draft("SM-0002", "blend") == "half a thou" and again.position() == ("SM-0002", "blend")


def test_what_was_put_off_is_offered_last(heron):
    heron.put_off("SM-0001")
    assert heron.put_off_names() == ["SM-0001"] and len(heron.order(where=Filter(later=True))) == 1
    heron.take_up("SM-0001")
    assert heron.put_off_names() == []


def test_another_thread_takes_a_clone(heron):
    found = []

    def look():
        with heron.clone() as mine:
            found.append(len(mine.order()))

    thread = threading.Thread(target=look)
    thread.start()
    thread.join()
    assert found == [3]


def test_settings_set_by_others_are_followed(heron, queue):
    from tui.workflow import setting

    assert heron.settings.law == "g23"
    setting.write(queue, "law", "f99", "plover")
    heron.follow_settings()
    assert heron.settings.law == "f99"
    assert [row[1:] for row in setting.history(queue, "law")] == [("plover", "f99")]


def put_another_in_place_of(queue, tmp_path):
    shutil.copy(queue, tmp_path / "other.db")
    os.replace(tmp_path / "other.db", queue)


def test_once_the_file_is_replaced_there_is_no_ruling_no_receipt_and_no_clone(heron, queue, tmp_path):
    rule(heron, "SM-0001", "star", "short")
    put_another_in_place_of(queue, tmp_path)
    for ask in (lambda: rule(heron, "SM-0001", "dust", "explains"), heron.receipt, heron.clone):
        with pytest.raises(StoreError, match="moved, deleted or replaced while open"):
            ask()


@pytest.fixture
def read_only(queue, monkeypatch):
    """A session at a file that this user may not write."""
    monkeypatch.setattr("tui.store.connect.is_writable", lambda path: False)
    with Session.open(queue, "heron") as session:
        yield session


def test_a_file_that_may_only_be_read_is_read(read_only):
    assert read_only.read_only and not read_only.write
    assert read_only.next_for_me() == read_only.claim_next()
    assert read_only.claim("SM-0001")
    read_only.release("SM-0001")
    read_only.release_all()
    read_only.save_position("SM-0001", "dust")
    read_only.save_draft("SM-0001", "dust", "begun")
    assert read_only.draft("SM-0001", "dust") == ""
    with read_only.clone() as other:
        assert other.read_only


def test_there_evidence_is_computed_and_not_kept(read_only, monkeypatch):
    kept = []
    monkeypatch.setattr("tui.store.evidence.save_evidence", lambda *args: kept.append(args))
    assert set(read_only.evidence("SM-0001", ("star",))) == {"star"}
    assert not kept


def test_there_a_ruling_is_refused_in_plain_words(read_only):
    with pytest.raises(StoreError, match="read only: nothing can be ruled or kept"):
        read_only.rule("SM-0001", "dust", "explains")


def test_a_file_that_may_be_written_is_not_read_only(heron):
    assert heron.write and not heron.read_only


def test_a_note_has_one_limit_for_screen_and_command(heron):
    rule(heron, "SM-0001", "dust", "explains", "n" * MAX_NOTE)
    for too_long in ("n" * (MAX_NOTE + 1), "n" * 10_000):
        with pytest.raises(StoreError, match=f"{MAX_NOTE} is the most"):
            rule(heron, "SM-0001", "star", "short", too_long)
        with pytest.raises(StoreError, match=f"{MAX_NOTE} is the most"):
            heron.save_draft("SM-0001", "star", too_long)
