"""The tally of a small queue, line by line, as the team has it and as one reviewer may see it."""

from __future__ import annotations

import json
from contextlib import closing
from dataclasses import replace

import pytest

from tui.model import CHECKS, Ruling
from tui.store.connect import open_queue
from tui.store.reviewers import reviewers
from tui.store.rulings import append_ruling
from tui.store.settings import read_settings
from tui.store.team import open_to
from tui.workflow.tallying import STATES_SHOWN, tally

NOW = "2026-01-11T00:00:00.000000Z"


@pytest.fixture
def connection(queue):
    with closing(open_queue(queue)) as opened:
        yield opened


def rule(connection, handle, name, ruling, *checks):
    who = next(one.id for one in reviewers(connection) if one.handle == handle)
    for minute, check in enumerate(checks or CHECKS):
        append_ruling(connection, Ruling(name, check, who, ruling, utc=f"2026-01-02T00:{minute:02d}:00.000000Z"))


def taken(connection, truth=None, **settings):
    return tally(connection, replace(read_settings(connection), **settings), now=NOW, truth=truth)


def cells(found, check):
    return {state: line.count for state, line in found.progress[check].items() if line.count}


def test_an_untouched_queue(connection):
    found = taken(connection)
    assert (found.settled.count, found.under_way.count, found.untouched.count) == (0, 0, 3)
    assert cells(found, "dust") == {"none": 3} and found.holds == ()
    assert found.agreement.overall.raw is None and found.agreement.overall.alpha is None
    assert any("nothing to compare" in said for said in found.sentences())


def test_settled_split_and_untouched(connection):
    for handle in ("heron", "plover"):
        rule(connection, handle, "SM-0001", "short")
    rule(connection, "heron", "SM-0002", "short", *CHECKS[:4])
    rule(connection, "heron", "SM-0002", "explains", "dust")
    rule(connection, "plover", "SM-0002", "short")
    found = taken(connection)
    assert found.survivors.names == ("SM-0001",) and found.settled.names == ("SM-0001",)
    assert cells(found, "dust") == {"short": 1, "split": 1, "none": 1}
    held = {line.key: line for line in found.holds}
    assert [held[key].names for key in ("split", "again:heron", "again:plover")] == [("SM-0002",)] * 3
    assert held["quiet:heron"].text == "heron quiet for 9 days"
    # ten checks compared, nine the same; heron followed the lean on 5 + 4 + 1, plover on 4 + 4: dust is adequate here
    overall = found.agreement.overall
    assert (overall.pairs, overall.raw) == (10, 0.9) and found.agreement.checks["dust"].raw == 0.5
    assert (found.agreement.lean.events, found.agreement.lean.trials) == (17, 20)
    assert [line.done for line in found.reviewers] == [2, 2] and found.reviewers[0].candidates == 2


def test_a_split_ruled_again_waits_for_a_further_reviewer(connection):
    for handle, word in (("heron", "explains"), ("plover", "short")):
        rule(connection, handle, "SM-0002", "short", *CHECKS[:4])
        rule(connection, handle, "SM-0002", word, "dust")
    for handle, word in (("heron", "explains"), ("plover", "short")):
        rule(connection, handle, "SM-0002", word, "dust")
    held = {line.key: line for line in taken(connection).holds}
    assert held["further"].names == ("SM-0002",) and "again:heron" not in held


def test_a_reviewer_is_shown_only_names_whose_seal_is_open(connection):
    for handle in ("heron", "plover"):
        rule(connection, handle, "SM-0001", "short")
    rule(connection, "heron", "SM-0003", "explains", "dust")
    found = taken(connection)
    by = {one.handle: open_to(connection, one.id) for one in reviewers(connection)}
    plover = found.seen_by(by["plover"])
    assert plover.survivors.names == ("SM-0001",) and plover.under_way.names == () and plover.under_way.unnamed == 1
    nobody = found.seen_by(())
    assert nobody.survivors.count == 1 and nobody.unnamed == 1
    assert "SM-0" not in json.dumps(nobody.as_dict()) + " ".join(nobody.sentences())
    for line in plover.lines():
        assert set(line.names) <= by["plover"]
    assert not plover.is_teams and found.is_teams


def test_controls_leave_the_counts_and_give_rates(connection):
    for handle in ("heron", "plover"):
        rule(connection, handle, "SM-0001", "short")
        rule(connection, handle, "SM-0002", "explains" if handle == "heron" else "short", "dust")
    found = taken(connection, truth={"SM-0001": "none", "SM-0002": "dust"})
    assert (found.candidates, found.controls, found.survivors.count) == (1, 2, 0)
    rates = {line.handle: line.controls for line in found.reviewers}
    assert (rates["heron"].hit.value, rates["plover"].hit.value) == (1.0, 0.0)
    assert (rates["heron"].false.events, rates["heron"].false.trials) == (0, 5)
    assert found.agreement.overall.pairs == 6  # agreement is measured on controls too


def test_json_is_plain_and_complete(connection):
    for handle in ("heron", "plover"):
        rule(connection, handle, "SM-0001", "short")
    shown = taken(connection, n_searched=5000).as_dict()
    assert json.loads(json.dumps(shown, allow_nan=False)) == shown
    assert set(shown["progress"]) == set(CHECKS) and set(shown["progress"]["dust"]) == set(STATES_SHOWN)
    assert shown["agreement"]["overall"]["alpha"] is None  # everybody said the same: undefined, not perfect
    assert shown["agreement"]["error_rates"] == {} and "three reviewers" in shown["agreement"]["error_rates_note"]
    assert set(shown["survivors"]["q"]) == {"SM-0001"}
    assert shown["meaning"]["pending"] == 2 and 0 < shown["meaning"]["upper_limit"] < 0.01


def test_the_same_queue_gives_the_same_tally(connection):
    rule(connection, "heron", "SM-0001", "short")
    rule(connection, "plover", "SM-0001", "explains", "star", "dust")
    assert taken(connection).as_dict() == taken(connection).as_dict()


def test_without_the_number_searched_no_limit_is_given(connection):
    said = " ".join(taken(connection).sentences())
    assert "cannot be said" in said and "no detection" in said
    assert taken(connection).meaning.limit is None
