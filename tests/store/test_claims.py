"""Claims, what was put off, and whose turn is what."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

from tests.store.making import evidence, rule, utc, walk
from tui.model import CHECKS
from tui.store.claims import (
    CLAIM_MINUTES,
    claim,
    claim_next,
    claimed,
    others_looking,
    put_off,
    put_off_names,
    release,
    release_all,
    take_up,
)
from tui.store.evidence import save_evidence
from tui.store.team import team_row
from tui.store.turns import next_for


def turns(connection, reviewer, now=None):
    """All that a reviewer is sent to, in order."""
    skipped: list[str] = []
    while (name := next_for(connection, reviewer.id, now or utc(), skipped)) is not None:
        skipped.append(name)
    return skipped


def test_who_else_looks_is_told_by_handle_until_it_runs_out(filled, team):
    name = turns(filled, team[0])[0]
    claim(filled, name, team[0].id, utc())
    claim(filled, name, team[1].id, utc())
    assert others_looking(filled, name, team[0].id, utc()) == [team[1].handle]
    assert others_looking(filled, name, None, utc()) == sorted([team[0].handle, team[1].handle])
    assert others_looking(filled, name, team[0].id, utc(60 * CLAIM_MINUTES)) == []


def test_everyone_is_sent_everywhere_in_an_order_of_their_own(filled, team):
    orders = [turns(filled, reviewer) for reviewer in team]
    assert [sorted(order) for order in orders] == [sorted(orders[0])] * 3
    assert len(orders[0]) == 12
    assert orders == [turns(filled, reviewer) for reviewer in team]


def test_fewest_done_reviewers_come_first(filled, team):
    heron, plover, _ = team
    walk(filled, plover, "SM-0005")
    walk(filled, plover, "SM-0007")
    order = turns(filled, heron)
    assert set(order[-2:]) == {"SM-0005", "SM-0007"}
    assert not {"SM-0005", "SM-0007"} & set(turns(filled, plover))


def test_the_order_does_not_tell_where_others_parted(filled, team):
    # with quorum 2 only a split can have two done reviewers and still need a third: it must not come last for that
    heron, plover, curlew = team
    names = [f"SM-{number:04d}" for number in range(1, 13)]
    for number, name in enumerate(names):
        walk(filled, plover, name, "short", 200 + 20 * number)
    before = turns(filled, heron)
    parted = before[:3]
    for number, name in enumerate(parted):
        walk(filled, curlew, name, "short", 600 + 20 * number)
        rule(filled, curlew, name, "dust", "explains", 610 + 20 * number)
    assert turns(filled, heron) == before


def test_what_is_settled_or_lacks_only_data_needs_nobody(filled, team):
    heron, plover, curlew = team
    for reviewer in (plover, curlew):
        walk(filled, reviewer, "SM-0005")
    save_evidence(filled, [("SM-0006", evidence(check, None, "none")) for check in CHECKS])
    assert team_row(filled, 5).outcome == "unexplained"
    assert not {"SM-0005", "SM-0006"} & set(turns(filled, heron))


def test_a_party_to_a_split_is_sent_back_once(filled, team):
    heron, plover, curlew = team
    walk(filled, heron, "SM-0001", "short")
    walk(filled, plover, "SM-0001", "short", 200)
    rule(filled, plover, "SM-0001", "dust", "explains", 300)
    assert "SM-0001" in turns(filled, heron)
    rule(filled, heron, "SM-0001", "dust", "short", 400)
    assert "SM-0001" not in turns(filled, heron)
    assert "SM-0001" in turns(filled, curlew)


def test_claimed_candidates_are_offered_to_nobody_else_until_the_claim_runs_out(filled, team):
    heron, plover, _ = team
    name = next_for(filled, plover.id, utc())
    assert claim(filled, name, heron.id, utc())
    assert claimed(filled, utc(1)) == {name: (heron.id,)}
    assert name not in turns(filled, plover, utc(CLAIM_MINUTES * 60 - 1))
    assert name in turns(filled, heron, utc(1))
    assert turns(filled, plover, utc(CLAIM_MINUTES * 60))[0] == name
    assert not claim(filled, name, plover.id, utc(2))
    release(filled, name, heron.id)
    assert claimed(filled, utc(3)) == {name: (plover.id,)}
    release_all(filled, plover.id)
    assert claimed(filled, utc(3)) == {}


def test_a_begun_candidate_is_claimed_like_any_other(filled, team):
    heron, plover, _ = team
    rule(filled, plover, "SM-0003", "star")
    claim(filled, "SM-0003", heron.id, utc())
    assert "SM-0003" not in turns(filled, plover)


def test_what_was_put_off_comes_last(filled, team):
    heron = team[0]
    first, second, *_ = turns(filled, heron)
    put_off(filled, heron.id, first)
    assert put_off_names(filled, heron.id) == [first]
    assert next_for(filled, heron.id, utc()) == second
    assert turns(filled, heron)[-1] == first
    take_up(filled, heron.id, first)
    assert next_for(filled, heron.id, utc()) == first


def test_people_at_once_get_different_candidates(filled, team, path):
    code = (
        "import sys; from tui.store.connect import open_queue; from tui.store.claims import claim_next; "
        "print(claim_next(open_queue(sys.argv[1]), sys.argv[2], sys.argv[3]))"
    )
    running = [
        subprocess.Popen([sys.executable, "-c", code, path, one.id, utc()], stdout=subprocess.PIPE, cwd=Path.cwd())
        for one in team
    ]
    got = [process.communicate()[0].decode().strip() for process in running]
    assert len(set(got)) == 3
    assert set(claimed(filled, utc())) == set(got)


def test_when_all_is_claimed_there_is_nothing_next(filled, team):
    heron, plover, _ = team
    while claim_next(filled, heron.id, utc(), skip=tuple(claimed(filled, utc()))):
        continue
    assert len(claimed(filled, utc())) == 12
    assert next_for(filled, plover.id, utc()) is None
