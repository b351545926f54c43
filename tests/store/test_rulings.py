"""The log: chained, refused where it must be, and never lost once acknowledged."""

from __future__ import annotations

import hashlib
import json
import os
import signal
import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import pytest

from tests.store.making import evidence, rule, utc, walk
from tui.errors import StoreError, UnknownNameError
from tui.model import CHECKS, Evidence, Ruling
from tui.store.chains import chain_faults
from tui.store.connect import open_queue
from tui.store.drafts import drafts, save_draft
from tui.store.evidence import save_evidence
from tui.store.rulings import append_ruling, log_by_candidate, ruling_hash, ruling_log, rulings_of
from tui.store.team import team_row


def test_the_hash_is_sha256_of_canonical_json():
    made = Ruling("SM-1", "dust", "abcdefgh", "short", "é", "e1", True, "", utc(), "id123456", "0" * 64)
    text = json.dumps(
        {
            "candidate": "SM-1", "check": "dust", "evidence_digest": "e1", "id": "id123456", "note": "é",
            "previous_hash": "0" * 64, "replaces": "", "reviewer_id": "abcdefgh", "ruling": "short",
            "seen_others": True, "utc": utc(),
        },
        sort_keys=True, separators=(",", ":"),
    )  # fmt: skip
    assert ruling_hash(made) == hashlib.sha256(text.encode("ascii")).hexdigest()


@pytest.mark.parametrize("field", [name for name in Ruling.__dataclass_fields__ if name != "hash"])
def test_the_hash_covers_every_field(field):
    made = Ruling("SM-1", "dust", "abcdefgh", "short")
    changed = replace(made, **{field: not made.seen_others if field == "seen_others" else "changed"})
    assert ruling_hash(changed) != ruling_hash(made)


def test_each_row_follows_the_reviewers_previous(filled, team):
    heron, plover, _ = team
    first = rule(filled, heron, "SM-0001", "star")
    rule(filled, plover, "SM-0001", "star")
    second = rule(filled, heron, "SM-0002", "dust", "explains")
    assert first.previous_hash == ""
    assert second.previous_hash == first.hash
    assert list(ruling_log(filled))[2] == second
    assert rulings_of(filled, "SM-0002") == [second] == log_by_candidate(filled)["SM-0002"]
    assert chain_faults(filled) == []


def test_a_change_of_mind_replaces_the_newest(filled, team):
    first = rule(filled, team[0], "SM-0001", "star")
    second = rule(filled, team[0], "SM-0001", "star", "explains", second=200)
    taken_back = rule(filled, team[0], "SM-0001", "star", "withdrawn", second=300)
    again = rule(filled, team[0], "SM-0001", "star", "unclear", second=400)
    assert [second.replaces, taken_back.replaces, again.replaces] == [first.id, second.id, taken_back.id]


def test_a_clock_that_runs_back_does_not_reorder_the_log(filled, team):
    first = rule(filled, team[0], "SM-0001", "star", second=500)
    second = rule(filled, team[0], "SM-0001", "star", "explains", second=5)
    assert second.utc > first.utc
    assert team_row(filled, 1).counts["star"].explains == 1


def test_todays_evidence_is_cited_where_none_is_named(filled, team):
    assert rule(filled, team[0], "SM-0001", "star").evidence_digest == "star-first"


def test_evidence_of_before_may_be_cited_while_it_is_on_file(filled, team):
    rule(filled, team[0], "SM-0001", "star")
    save_evidence(filled, [("SM-0001", evidence("star", True, "second"))])
    assert rule(filled, team[1], "SM-0001", "star", evidence_digest="star-first").evidence_digest == "star-first"
    assert team_row(filled, 1).counts["star"].stale == 2


@pytest.mark.parametrize(
    ("change", "error"),
    [
        ({"candidate": "SM-9999"}, UnknownNameError),
        ({"check": "mixture"}, UnknownNameError),
        ({"check": "dips"}, UnknownNameError),
        ({"ruling": "nodata"}, UnknownNameError),
        ({"reviewer_id": "nobody-here"}, UnknownNameError),
        ({"ruling": "withdrawn"}, StoreError),
        ({"evidence_digest": "never made"}, StoreError),
        ({"evidence_digest": "star-first"}, StoreError),
        ({"note": "n" * 20_001}, StoreError),
        ({"note": "a\0b"}, StoreError),
        ({"note": "\ud800"}, StoreError),
        ({"utc": "yesterday"}, ValueError),
        ({"utc": ""}, ValueError),
    ],
)
def test_a_refusal_writes_nothing(filled, team, change, error):
    given = replace(Ruling("SM-0001", "dust", team[0].id, "short", utc=utc(100)), **change)
    with pytest.raises(error):
        append_ruling(filled, given)
    assert filled.execute("SELECT COUNT(*) FROM ruling").fetchone() == (0,)
    assert not filled.in_transaction


def test_nothing_is_withdrawn_twice(filled, team):
    rule(filled, team[0], "SM-0001", "star")
    rule(filled, team[0], "SM-0001", "star", "withdrawn")
    with pytest.raises(StoreError, match="withdraw"):
        rule(filled, team[0], "SM-0001", "star", "withdrawn")


def test_an_untestable_check_takes_only_unclear(filled, team):
    save_evidence(filled, [("SM-0001", Evidence("dust", 1, None, digest="untestable"))])
    for word in ("short", "explains"):
        with pytest.raises(StoreError, match="only unclear"):
            rule(filled, team[0], "SM-0001", "dust", word)
    rule(filled, team[0], "SM-0001", "dust", "unclear")
    rule(filled, team[0], "SM-0001", "dust", "withdrawn")


def test_others_in_view_is_marked_by_the_store_itself(filled, team):
    heron, plover, _ = team
    walk(filled, heron, "SM-0001")
    alone = rule(filled, heron, "SM-0001", "dust", "unclear", 200, seen_others=True)
    assert not alone.seen_others  # the seal is open, but there was nothing of others to see
    sealed = rule(filled, plover, "SM-0001", "star", "short", 300, seen_others=True)
    assert not sealed.seen_others
    assert rule(filled, heron, "SM-0001", "dust", "short", 400).seen_others


def test_the_same_id_again_is_refused(filled, team):
    made = rule(filled, team[0], "SM-0001", "star")
    with pytest.raises(StoreError, match="never written twice"):
        append_ruling(filled, replace(made, check="dust", evidence_digest=""))


def test_states_and_outcome_follow_in_the_same_transaction(filled, team):
    for reviewer in team[:2]:
        walk(filled, reviewer, "SM-0001")
    row = team_row(filled, 1)
    assert row.outcome == "unexplained"
    assert set(row.states.values()) == {"short"}
    assert row.done == 2


def test_the_draft_that_became_the_note_is_forgotten(filled, team):
    save_draft(filled, team[0].id, "SM-0001", "star", "faint")
    save_draft(filled, team[0].id, "SM-0001", "dust", "warm?")
    rule(filled, team[0], "SM-0001", "star", note="faint")
    rule(filled, team[0], "SM-0001", "dust", note="typed elsewhere")
    assert drafts(filled, team[0].id, "SM-0001") == {"dust": "warm?"}


RULER = """
import sys
from tests.store.making import utc
from tui.model import CHECKS, Ruling
from tui.store.connect import open_queue
from tui.store.rulings import append_ruling
path, reviewer, count = sys.argv[1:]
connection = open_queue(path)
for number in range(int(count)):
    name = f"SM-{number // 5 % 12 + 1:04d}"
    made = append_ruling(connection, Ruling(name, CHECKS[number % 5], reviewer, "short", utc=utc(number)))
    print(made.id, flush=True)
"""


def ruler(path, reviewer, count):
    command = [sys.executable, "-c", RULER, path, reviewer.id, str(count)]
    return subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, cwd=Path.cwd())


def test_no_acknowledged_ruling_is_lost_to_kill_9(filled, team, path):
    acknowledged: list[str] = []
    for reviewer, before_killing in zip(team, (1, 7, 23), strict=True):
        process = ruler(path, reviewer, 100_000)
        acknowledged += [process.stdout.readline().strip() for _ in range(before_killing)]
        os.kill(process.pid, signal.SIGKILL)
        acknowledged += process.communicate()[0].split()
    again = open_queue(path)
    kept = [ruling.id for ruling in ruling_log(again)]
    assert set(acknowledged) <= set(kept)
    assert len(kept) <= len(acknowledged) + len(team)  # at most the one on its way
    assert chain_faults(again) == []
    assert again.execute("PRAGMA integrity_check").fetchone() == ("ok",)
    again.close()


def test_several_processes_lose_nothing_and_see_no_error(filled, team, path):
    running = [ruler(path, reviewer, 60) for reviewer in (*team, *team)]  # two for each, still one chain a person
    done = [process.communicate() for process in running]
    assert [errors for _, errors in done] == [""] * 6
    told = [one for out, _ in done for one in out.split()]
    kept = list(ruling_log(filled))
    assert sorted(told) == sorted(ruling.id for ruling in kept)
    assert len(told) == 360
    previous = [ruling.previous_hash for ruling in kept]
    assert len(set(previous)) == len(kept) - len(team) + 1  # no fork: one root each
    assert chain_faults(filled) == []
    assert team_row(filled, 1).done == 3
    assert set(team_row(filled, 1).states) == set(CHECKS)
