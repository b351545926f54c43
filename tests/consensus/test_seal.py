"""Before one's first time done nothing of others' shows; after it all does, for good."""

from __future__ import annotations

import random

from tui.consensus import seal
from tui.model import CHECKS


def test_without_a_handle_everything_reads_sealed(new_team):
    team = new_team()
    team.rule("heron", "short")
    assert set(seal.seen_states(team.now, None).values()) == {"sealed"}
    assert seal.seen_outcome(team.now, None) == "sealed" and seal.own_stale(team.now, None) == {}


def test_own_rulings_show_and_others_do_not(new_team):
    team = new_team(nodata=("extinction",))
    team.rule("heron", "short", "star", "instrument", "blend", "dust")
    now = team.rule("plover", "unclear", "star")
    assert seal.seen_states(now, "plover") == {
        "star": "unclear", "instrument": "todo", "extinction": "nodata", "blend": "todo", "dust": "todo",
    }  # fmt: skip
    assert seal.seen_outcome(now, "plover") == "sealed" and seal.seen_pending_reason(now, "plover") == ""
    assert seal.seen_states(now, "heron")["star"] == "open" and seal.seen_outcome(now, "heron") == "pending"


def test_what_a_closed_seal_shows_depends_on_own_rulings_only(new_team):
    dice = random.Random(11)
    for _ in range(60):
        one, two = new_team(), new_team()
        for check in dice.sample(CHECKS, dice.randint(0, 4)):
            ruling = dice.choice(["short", "unclear"])
            one.rule("curlew", ruling, check)
            two.rule("curlew", ruling, check)
        for _ in range(dice.randint(0, 12)):
            who, ruling = dice.choice(["heron", "plover"]), dice.choice(["explains", "short", "unclear"])
            two.rule(who, ruling, dice.choice(CHECKS))
        assert seal.seen_states(one.now, "curlew") == seal.seen_states(two.now, "curlew")
        assert seal.seen_outcome(two.now, "curlew") == "sealed"
        assert two.now.to_rule("curlew") == one.now.to_rule("curlew")
        assert not seal.has_others_in_view(two.now, "curlew")


def test_mark_needs_an_open_seal_and_someone_elses_ruling(new_team):
    team = new_team()
    team.rule("heron", "explains", "dust")
    assert not seal.has_others_in_view(team.now, "heron")  # nobody else has ruled
    team.rule("plover", "short", "star")
    assert seal.has_others_in_view(team.now, "heron") and not seal.has_others_in_view(team.now, "plover")


def test_turns_differ_between_reviewers_and_repeat():
    names = [f"SM-{number:04d}" for number in range(40)]
    heron, plover = (sorted(names, key=lambda name: seal.turn(name, who)) for who in ("heron", "plover"))
    assert heron != plover and heron == sorted(names, key=lambda name: seal.turn(name, "heron"))
