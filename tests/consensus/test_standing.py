"""The rules from rulings to outcome, each worked out by hand from their wording."""

from __future__ import annotations

import random

import pytest

from tui.consensus.standing import standing
from tui.model import CHECKS, NATURAL


def test_nothing_ruled_is_open_and_needs_everyone(new_team):
    now = new_team().now
    assert set(now.states.values()) == {"open"} and now.outcome == "pending"
    assert now.pending_reason == "open:star;open:instrument;open:extinction;open:blend;open:dust"
    assert now.needs("heron") and now.to_rule("heron") == CHECKS and not now.done


def test_fewer_sure_rulings_than_the_quorum_stay_open(new_team):
    team = new_team(quorum=3)
    team.rule("heron", "short")
    assert team.rule("plover", "short").states["star"] == "open"
    assert team.rule("curlew", "short").outcome == "unexplained"


def test_unclear_is_not_sure(new_team):
    team = new_team()
    team.rule("heron", "short", "dust")
    assert team.rule("plover", "unclear", "dust").states["dust"] == "open"
    assert team.rule("curlew", "short", "dust").states["dust"] == "short"


def test_star_settled_explains_is_ordinary_before_anything_else(new_team):
    team = new_team()
    team.rule("heron", "explains", "star", "dust")
    now = team.rule("plover", "explains", "dust", "star")
    assert (now.outcome, now.cause) == ("ordinary", "star")


def test_one_of_four_settled_explains_is_explained_whatever_is_open(new_team):
    team = new_team(nodata=("star",))
    team.rule("heron", "explains", "dust")
    now = team.rule("plover", "explains", "dust")
    assert (now.outcome, now.cause, now.reasons) == ("explained", "dust", ())
    assert not now.needs("curlew") and now.opened == {"heron", "plover"}


def test_star_and_all_four_short_is_unexplained(new_team):
    team = new_team()
    team.rule("heron", "short")
    assert team.rule("plover", "short").outcome == "unexplained"


def test_parted_explains_though_no_check_settles(new_team):
    team = new_team()
    team.rule("heron", "explains", "dust")
    now = team.rule("plover", "explains", "blend")
    assert (now.outcome, now.cause) == ("explained", "parted")
    assert now.states["dust"] == now.states["blend"] == "open"


def test_an_explains_on_star_does_not_part(new_team):
    team = new_team()
    team.rule("heron", "explains", "dust")
    assert team.rule("plover", "explains", "star").outcome == "pending"


def test_parted_takes_the_agree_share_of_the_done(new_team):
    team = new_team(agree_share=0.6)
    team.rule("heron", "explains", "dust")
    team.rule("curlew", "short")
    now = team.rule("plover", "explains", "blend")  # 2 of 3 done hold one
    assert (now.outcome, now.cause) == ("explained", "parted")


@pytest.mark.parametrize(("share", "state"), [(1.0, "split"), (0.6, "explains"), (0.61, "split")])
def test_larger_share_against_agree_share(new_team, share, state):
    team = new_team(agree_share=share, quorum=5)
    for who in "abc":
        team.rule(who, "explains", "dust")
    for who in "de":
        team.rule(who, "short", "dust")  # 3 of 5: exactly 0.6
    assert team.now.states["dust"] == state


def test_nodata_needs_no_ruling_and_lacks_only_data(new_team):
    team = new_team(nodata=("extinction",))
    walk = [check for check in CHECKS if check != "extinction"]
    assert team.rule("heron", "short", *walk).done == {"heron"}
    now = team.rule("plover", "short", *walk)
    assert now.states["extinction"] == "nodata" and now.pending_reason == "nodata:extinction"
    assert now.lacks_only_data and not now.needs("curlew") and not now.needs("heron")


def test_reasons_put_splits_first_and_data_last(new_team):
    team = new_team(nodata=("extinction",))
    team.rule("heron", "short", "star", "instrument", "blend", "dust")
    now = team.rule("plover", "explains", "dust")
    assert now.pending_reason == "split:dust;open:star;open:instrument;open:blend;nodata:extinction"


def test_nobody_is_done_by_doing_nothing_where_all_is_nodata(new_team):
    now = new_team(nodata=CHECKS).now
    assert now.lacks_only_data and not now.done and not now.opened


def test_walk_all_asks_for_every_check(new_team):
    team = new_team(walk_all=True)
    assert not team.rule("heron", "explains", "star", "dust").done
    assert team.rule("heron", "short", "instrument", "extinction", "blend").done == {"heron"}


def test_withdrawn_takes_back_and_does_not_bring_back(new_team):
    team = new_team()
    team.rule("heron", "short", "dust")
    team.rule("heron", "explains", "dust")
    now = team.rule("heron", "withdrawn", "dust")
    assert ("dust", "heron") not in now.current and not now.done
    assert now.opened == {"heron"}  # was done once


def split(team):
    """heron and plover walk all, and part over dust."""
    team.rule("heron", "short", *CHECKS[:4])
    team.rule("heron", "explains", "dust")
    return team.rule("plover", "short")


def test_a_split_asks_each_party_once(new_team):
    team = new_team()
    assert split(team).pending_reason == "split:dust"
    assert team.now.needs("heron") and team.now.to_rule("heron") == ("dust",) and team.now.needs("plover")
    team.rule("heron", "explains", "dust")
    assert not team.now.needs("heron") and team.now.needs("plover")
    team.rule("plover", "short", "dust")
    assert team.now.states["dust"] == "split"
    assert not team.now.needs("heron") and not team.now.needs("plover") and team.now.needs("curlew")
    assert team.now.waits_for_another({"heron", "plover"}) and not team.now.waits_for_another({"heron", "curlew"})


def test_two_thirds_of_three_settle_once_all_ruled_again(new_team):
    team = new_team()
    split(team)
    team.rule("heron", "explains", "dust")
    team.rule("plover", "short", "dust")
    assert team.rule("curlew", "short").states["dust"] == "split"  # curlew has not ruled with the seal open
    assert team.now.to_rule("curlew") == ("dust",)
    assert team.rule("curlew", "short", "dust").outcome == "unexplained"


def test_two_of_two_thirds_are_not_enough(new_team):
    team = new_team()
    split(team)
    for who, ruling in (("heron", "explains"), ("plover", "short")):
        team.rule(who, ruling, "dust")
    assert team.now.states["dust"] == "split"


def test_three_of_five_are_less_than_two_thirds(new_team):
    team = new_team()
    for who in "abcde":
        team.rule(who, "short", *CHECKS[:4])
        team.rule(who, "explains" if who in "abc" else "short", "dust")
    for who in "abcde":
        team.rule(who, "explains" if who in "abc" else "short", "dust")
    assert team.now.states["dust"] == "split" and team.now.waits_for_another("abcde")


def test_a_second_ruling_before_anyone_dissented_is_no_answer(new_team):
    team = new_team()
    team.rule("heron", "explains", "dust")
    team.rule("plover", "explains", "dust")
    team.rule("heron", "explains", "dust")  # with plover's in view, but nobody had dissented
    team.rule("curlew", "short")
    assert team.now.states["dust"] == "split" and team.now.needs("heron") and team.now.needs("plover")


def test_a_party_won_over_settles_the_split(new_team):
    team = new_team()
    split(team)
    assert team.rule("heron", "short", "dust").outcome == "unexplained"
    assert team.now.counts["dust"].revised == 1 and team.now.counts["dust"].short == 2


def test_evidence_that_moved_makes_rulings_stale_and_people_needed(new_team):
    team = new_team()
    team.rule("heron", "short")
    team.rule("plover", "short")
    now = team.compute("dust", adequate=True, version=2)
    assert now.states["dust"] == "open" and set(now.stale.values()) == {"was not adequate, now adequate"}
    assert now.needs("heron") and now.to_rule("heron") == ("dust",) and now.counts["dust"].stale == 2
    assert now.opened == {"heron", "plover"} and not now.done
    assert team.compute("dust", adequate=False, version=3).outcome == "unexplained"  # and they count again


def test_a_check_without_evidence_yet_is_not_nodata(new_team):
    team = new_team()
    team.rule("heron", "short")
    now = standing(team.log, {}, {}, team.settings)
    assert now.states["dust"] == "open" and now.done == {"heron"} and not now.stale


def test_a_ruling_that_cites_unknown_evidence_is_stale(new_team):
    team = new_team()
    team.rule("heron", "short")
    evidence = {**team.evidence, "dust": team.compute("dust", version=9) and team.evidence["dust"]}
    now = standing(team.log, evidence, {}, team.settings)
    assert list(now.stale.values()) == ["the evidence it cites is not in this queue"]


def test_the_seal_stays_open_when_data_make_a_check_testable(new_team):
    team = new_team(nodata=("extinction",))
    team.rule("heron", "short", "star", "instrument", "blend", "dust")
    now = team.compute("extinction", adequate=False, version=2)
    assert not now.done and now.opened == {"heron"} and now.to_rule("heron") == ("extinction",)


def test_the_seal_stays_open_from_the_log_alone_when_evidence_moves(new_team):
    team = new_team()
    team.rule("heron", "short")
    for check in CHECKS:
        team.compute(check, version=2, J=4.0, W3=8.2)
    now = standing(team.log, team.evidence, team.cited, team.settings)
    assert len(now.stale) == 5 and not now.done and now.opened == {"heron"}


def test_the_seal_stays_closed_when_the_walk_ends_on_moved_evidence(new_team):
    team = new_team()
    team.rule("heron", "short", *CHECKS[:4])
    for check in CHECKS:
        team.compute(check, version=2, J=4.0, W3=8.2)
    now = team.rule("heron", "short", "dust")
    assert len(now.stale) == 4 and not now.done and not now.opened
    assert team.rule("heron", "short", *CHECKS[:4]).opened == {"heron"}


def test_standing_does_not_depend_on_the_order_of_rows(new_team):
    team = new_team()
    split(team)
    team.rule("heron", "short", "dust")
    team.rule("curlew", "explains", "blend")
    shuffled = random.Random(7).sample(team.log, len(team.log))
    assert standing(shuffled, team.evidence, team.cited, team.settings) == standing(
        team.log, team.evidence, team.cited, team.settings
    )


@pytest.mark.parametrize("check", NATURAL)
def test_quorum_of_one_settles_at_once(new_team, check):
    assert new_team(quorum=1).rule("heron", "explains", check).outcome == "explained"
