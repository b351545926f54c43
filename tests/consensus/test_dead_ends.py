"""No history ends with a pending candidate that needs nobody and lacks no data.

Searched in two ways: every history of any length for small teams (the standing depends on the log only through current
rulings, which of them answered a dispute, and opened seals, so histories that agree in these are one), and random
longer histories with evidence that moves. That someone is needed would be cheap if it led nowhere, so each history is
also continued: those whom it asks answer, and then further reviewers come who agree with one another.
"""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tui.consensus import seal
from tui.model import CHECKS

TEAM = ("heron", "plover", "curlew")
WORDS = ("explains", "short", "unclear", "withdrawn")


def assert_no_dead_end(team) -> None:
    now = team.now
    assert bool(now.reasons) == (now.outcome == "pending")
    assert now.outcome != "pending" or now.lacks_only_data or now.needs("godwit")
    for who in TEAM:
        assert now.needs(who) <= bool(now.to_rule(who)), "needed, and nothing to rule"


def answer(team, who: str, ruling_for) -> None:
    """Do what the candidate asks of one reviewer: the rest of the walk, then each split once; then it is at rest."""
    for _ in range(2 * len(CHECKS) + 1):
        asked = team.now.to_rule(who) if team.now.needs(who) else ()
        if not asked:
            return
        before = team.now.current.get((asked[0], who))
        team.rule(who, ruling_for(asked[0], before.ruling if before else "short"), asked[0])
    raise AssertionError(f"{who} is asked without end")


def assert_ends(team, ruling_for) -> None:
    """Those asked stay by what they said, then further people come and say `ruling_for`: it ends."""
    team = team.fork()
    for number in range(12):
        for who in TEAM:
            if any(owner == who for _, owner in team.now.current):
                answer(team, who, lambda check, before: before if before in WORDS[:2] else "short")
        if not team.now.needs_people:
            return
        answer(team, f"further{number}", lambda check, before: ruling_for)
        for earlier in range(number):
            answer(team, f"further{earlier}", lambda check, before: ruling_for)
    raise AssertionError(f"never ends: {team.now.pending_reason}")


def key(team):
    """All of a log that the standing can depend on while evidence and settings stay."""
    now = team.now
    owing = {(check, who) for check, parties in now.owing.items() for who in parties}
    # an answer given counts later too, so it belongs to the key even where no split stands
    marks = {(check, who): (ruling.ruling, answered(team, ruling)) for (check, who), ruling in now.current.items()}
    return frozenset(marks.items()), now.opened, frozenset(owing)


def answered(team, ruling) -> bool:
    """Whether both sides were in view when it was made: worked out again, from the log."""
    earlier = team.log[: [row.id for row in team.log].index(ruling.id)]
    newest = {row.reviewer_id: row.ruling for row in earlier if row.check == ruling.check}
    return ruling.seen_others and {*newest.values(), ruling.ruling} >= {"explains", "short"}


@pytest.mark.parametrize(
    ("people", "checks", "rules"),
    [
        (2, ("star", "dust"), {}),
        (2, ("blend", "dust"), {"walk_all": True}),
        (3, ("dust",), {}),
        (3, ("dust",), {"agree_share": 0.6}),
        (3, ("star",), {"quorum": 1}),
    ],
)
def test_every_history_of_a_small_team(new_team, people, checks, rules):
    start = new_team(nodata=tuple(check for check in CHECKS if check not in checks), **rules)
    seen, frontier = {key(start)}, [start]
    while frontier:
        team = frontier.pop()
        assert_no_dead_end(team)
        for who in TEAM[:people]:
            for check in checks:
                for word in WORDS:
                    mine = team.now.current.get((check, who))
                    if word == "withdrawn" and mine is None:
                        continue
                    after = team.fork()
                    after.rule(who, word, check)
                    if key(after) not in seen:
                        seen.add(key(after))
                        frontier.append(after)
    assert len(seen) > 50


STEPS = st.one_of(
    st.tuples(st.sampled_from(TEAM), st.sampled_from(WORDS), st.sampled_from(CHECKS)),
    st.tuples(st.sampled_from(TEAM), st.sampled_from(WORDS[:3]), st.just("all")),
    st.tuples(st.just("evidence"), st.sampled_from([True, False, None]), st.sampled_from(CHECKS)),
)
RULES = st.fixed_dictionaries(
    {"quorum": st.integers(1, 3), "agree_share": st.sampled_from([0.51, 0.6, 0.75, 1.0]), "walk_all": st.booleans()}
)


def play(team, steps, version=0) -> None:
    for version, (who, what, check) in enumerate(steps, version):
        if who == "evidence":
            team.compute(check, adequate=what, version=version, J=1.0, W3=float(version % 4))
            continue
        for one in CHECKS if check == "all" else (check,):
            if team.now.states[one] != "nodata" or what in ("unclear", "withdrawn"):
                team.rule(who, what, one)


@settings(max_examples=500, deadline=None, derandomize=True)
@given(steps=st.lists(STEPS, min_size=2, max_size=16), rules=RULES, further=st.sampled_from(WORDS[:2]))
def test_random_histories_with_moving_evidence(new_team, steps, rules, further):
    team = new_team(**rules)
    play(team, steps)
    assert_no_dead_end(team)
    assert_ends(team, further)


@settings(max_examples=400, deadline=None, derandomize=True)
@given(steps=st.lists(STEPS, min_size=2, max_size=16), rules=RULES)
def test_a_seal_once_open_stays_open(new_team, steps, rules):
    team = new_team(**rules)
    ever_done: frozenset[str] = frozenset()
    for version, step in enumerate(steps, 1):
        play(team, [step], version)
        ever_done |= team.now.done
        assert team.now.opened == ever_done  # exactly those who were done at some moment
        for who in TEAM:
            assert (seal.seen_outcome(team.now, who) == "sealed") == (who not in ever_done)
