"""Rows, orders, filters and counts as one reader may see them."""

from __future__ import annotations

from array import array

import pytest

from tests.store.making import evidence, fill, rule, star, utc, walk
from tui.errors import InputError, SealError, UnknownNameError
from tui.model import CHECKS, Evidence, Fit
from tui.store.candidate_view import others_rulings
from tui.store.candidates import candidate_name, save_candidates
from tui.store.claims import put_off
from tui.store.evidence import save_evidence
from tui.store.names import ring
from tui.store.records import SORTS, Filter, LoadRecord
from tui.store.reviewers import add_reviewer
from tui.store.settings import write_setting
from tui.store.team import open_to, team_standing
from tui.store.views import (
    find_prefix,
    find_substring,
    standing_for,
    story,
    view_counts,
    view_order,
    view_rows,
)

NOT_RULED = dict.fromkeys(CHECKS, "todo")
SEALED = dict.fromkeys(CHECKS, "sealed")


def names(connection, ids):
    return [candidate_name(connection, one) for one in ids]


def odd(name, pull):
    fit = Fit("star", 1.0, 1, 0.5, 1.0, 1.0, {}, {"W3": pull})
    return name, Evidence("star", 1, False, (fit,), facts={"oddness": abs(pull)}, digest=f"odd{pull}")


def test_a_row_before_anybody_ruled(filled, team):
    (row,) = view_rows(filled, team[0].id, [1])
    assert (row.name, row.states, row.outcome, row.ruled, row.to_rule) == ("SM-0001", NOT_RULED, "sealed", 0, 5)
    assert (row.needs_me, row.done, row.seal_open, row.stale) == (True, False, False, frozenset())


def test_a_reader_without_a_handle_sees_nothing_of_anybody(filled, team):
    for reviewer in team:
        walk(filled, reviewer, "SM-0001", "explains")
    (row,) = view_rows(filled, None, [1])
    assert (row.states, row.outcome, row.ruled, row.needs_me, row.done) == (SEALED, "sealed", 0, False, False)
    view = standing_for(filled, None, "SM-0001")
    assert (view.states, view.outcome, view.others, view.own, view.to_rule) == (SEALED, "sealed", [], {}, ())
    assert {line.what for line in story(filled, None, "SM-0001")} == {"loaded", "measured"}


def test_own_rulings_read_as_given_until_the_seal_opens(filled, team):
    heron, plover, _ = team
    walk(filled, plover, "SM-0001", "explains")
    for done, check in enumerate(CHECKS):
        (row,) = view_rows(filled, heron.id, [1])
        assert row.ruled == done
        assert row.outcome == "sealed"
        assert list(row.states.values()) == ["short"] * done + ["todo"] * (5 - done)
        rule(filled, heron, "SM-0001", check)
    (row,) = view_rows(filled, heron.id, [1])
    assert row.seal_open and row.done and row.outcome == "pending"
    assert set(row.states.values()) == {"split"}


def test_untestable_checks_read_nodata(filled, team):
    save_evidence(filled, [("SM-0001", evidence("dust", None, "none"))])
    (row,) = view_rows(filled, team[0].id, [1])
    assert (row.states["dust"], row.to_rule) == ("nodata", 4)
    assert view_rows(filled, None, [1])[0].states["dust"] == "sealed"


def test_the_seal_stays_open_for_good(filled, team):
    heron = team[0]
    walk(filled, heron, "SM-0001")
    rule(filled, heron, "SM-0001", "star", "withdrawn", 200)
    save_evidence(filled, [("SM-0001", evidence(check, True, "turned")) for check in CHECKS])
    view = standing_for(filled, heron.id, "SM-0001")
    assert view.seal_open and not view.done
    assert set(view.stale) == set(CHECKS) - {"star"}
    assert open_to(filled, heron.id) == {"SM-0001"}


def test_the_seal_opened_by_an_untestable_check_stays_open_when_it_becomes_testable(filled, team):
    heron = team[0]
    save_evidence(filled, [("SM-0001", evidence("dust", None, "none"))])
    for check in CHECKS[:4]:
        rule(filled, heron, "SM-0001", check)
    assert standing_for(filled, heron.id, "SM-0001").seal_open
    save_evidence(filled, [("SM-0001", evidence("dust", False, "data came"))])
    view = standing_for(filled, heron.id, "SM-0001")
    assert view.seal_open and not view.done and view.to_rule == ("dust",)


def test_others_are_refused_by_the_store_while_sealed(filled, team):
    heron, plover, _ = team
    rule(filled, plover, "SM-0001", "star", note="look at W3")
    rule(filled, heron, "SM-0001", "star")
    with pytest.raises(SealError):
        others_rulings(filled, heron.id, "SM-0001")
    assert standing_for(filled, heron.id, "SM-0001").others == []
    walk(filled, heron, "SM-0001")
    assert [line.note for line in others_rulings(filled, heron.id, "SM-0001")] == ["look at W3"]


def everything_readable(connection, reviewer_id):
    """All that the store gives one reader about a queue."""
    ids = view_order(connection, reviewer_id)
    filters = [
        *(Filter(unresolved=check) for check in CHECKS),
        *(Filter(outcome=word) for word in ("sealed", "pending", "ordinary", "explained", "unexplained")),
        *(Filter(needs_me=True), Filter(stale=True), Filter(mine=True), Filter(mine=False), Filter(done=True)),
        *(Filter(done=False), Filter(later=True), Filter(text="sm"), Filter(share=(1, 2))),
    ]
    return (
        view_rows(connection, reviewer_id, ids),
        view_counts(connection, reviewer_id),
        [view_order(connection, reviewer_id, sort=sort, descending=way) for sort in SORTS for way in (False, True)],
        [list(view_order(connection, reviewer_id, where=where)) for where in filters],
        [standing_for(connection, reviewer_id, name) for name in names(connection, ids)],
        [story(connection, reviewer_id, name) for name in names(connection, ids)],
        list(find_prefix(connection, "sm")) + list(find_substring(connection, "00")),
    )


@pytest.mark.parametrize("word", ["explains", "short", "unclear"])
def test_nothing_readable_tells_what_one_other_did(filled, team, word):
    heron, plover, _ = team
    rule(filled, heron, "SM-0001", "dust", "explains")  # done with this one: its seal is open, and not looked at below
    rule(filled, heron, "SM-0002", "star")
    before = [everything_readable(filled, reader) for reader in (heron.id, None)]
    for name in ("SM-0002", "SM-0003"):
        for number, check in enumerate(CHECKS[:4]):
            rule(filled, plover, name, check, word, 200 + number, note="secret")
    assert [everything_readable(filled, reader) for reader in (heron.id, None)] == before
    save_evidence(filled, [("SM-0003", evidence("dust", True, "new"))])  # makes plover's rulings no less sealed
    assert view_rows(filled, heron.id, [3])[0].states == NOT_RULED


def test_that_a_candidate_needs_nobody_is_all_that_the_seal_lets_out(filled, team):
    heron, plover, curlew = team
    before = everything_readable(filled, heron.id)
    for reviewer in (plover, curlew):
        walk(filled, reviewer, "SM-0004", "explains")
    after = everything_readable(filled, heron.id)
    (row_before,), (row_after,) = ([row for row in every[0] if row.name == "SM-0004"] for every in (before, after))
    assert row_before.needs_me and not row_after.needs_me
    differing = {name for name in row_before.__slots__ if getattr(row_before, name) != getattr(row_after, name)}
    assert differing == {"needs_me"}
    assert after[1]["needs_me"] == before[1]["needs_me"] - 1
    assert {key for key in after[1] if after[1][key] != before[1][key]} == {"needs_me"}
    assert after[5] == before[5]


@pytest.fixture
def mixed(queue):
    """Six candidates of different oddness, names of different case; heron has walked one and begun another."""
    fill(queue, ["b-2", "A-1", "c-3", "B-4", "a-5", "C-6"])
    pulls = {"b-2": 3.0, "A-1": -9.0, "c-3": 5.0, "B-4": 7.0, "a-5": 1.0}
    save_evidence(queue, [odd(name, pull) for name, pull in pulls.items()])
    save_evidence(queue, [("C-6", Evidence("star", 1, None, digest="nothing"))])
    heron = add_reviewer(queue, "heron", utc())
    walk(queue, heron, "c-3")
    rule(queue, heron, "b-2", "dust", "explains", 200)
    rule(queue, heron, "b-2", "dust", "short", 300)
    return queue, heron.id


@pytest.mark.parametrize(
    ("sort", "descending", "expected"),
    [
        ("oddness", True, "A-1 B-4 c-3 b-2 a-5 C-6"),
        ("oddness", False, "C-6 a-5 b-2 c-3 B-4 A-1"),
        ("name", False, "A-1 a-5 b-2 B-4 c-3 C-6"),
        ("name", True, "C-6 c-3 B-4 b-2 a-5 A-1"),
        ("pull", True, "B-4 c-3 b-2 a-5 A-1 C-6"),
        ("ruled", True, "c-3 b-2 A-1 B-4 a-5 C-6"),
        ("outcome", True, "c-3 b-2 A-1 B-4 a-5 C-6"),  # the seal of c-3 and b-2 is open: pending, then the sealed
        ("star", True, "C-6 c-3 b-2 A-1 B-4 a-5"),  # nodata, short, open (b-2, unruled with the seal open), todo
    ],
)
def test_sorts(mixed, sort, descending, expected):
    queue, heron = mixed
    assert names(queue, view_order(queue, heron, sort=sort, descending=descending)) == expected.split()


@pytest.mark.parametrize(
    ("where", "expected"),
    [
        (Filter(), "A-1 B-4 c-3 b-2 a-5 C-6"),
        (Filter(text="A-"), "A-1 a-5"),
        (Filter(mine=True), "c-3 b-2"),
        (Filter(mine=False), "A-1 B-4 a-5 C-6"),
        (Filter(done=True), "c-3"),
        (Filter(unresolved="star"), "A-1 B-4 c-3 b-2 a-5"),
        (Filter(outcome="sealed"), "A-1 B-4 a-5 C-6"),
        (Filter(outcome="pending"), "c-3 b-2"),
        (Filter(outcome="explained"), ""),
        (Filter(needs_me=True), "A-1 B-4 b-2 a-5 C-6"),
        (Filter(names=frozenset({"a-5", "A-1", "nobody"})), "A-1 a-5"),
        (Filter(needs_me=True, mine=True), "b-2"),
    ],
)
def test_filters(mixed, where, expected):
    queue, heron = mixed
    assert names(queue, view_order(queue, heron, where=where)) == expected.split()


def test_counts_are_what_the_filters_show(mixed):
    queue, heron = mixed
    for reader in (heron, None):
        for key, count in view_counts(queue, reader).items():
            what, _, word = key.partition(":")
            where = {
                "all": Filter(),
                "needs_me": Filter(needs_me=True),
                "done": Filter(done=True),
                "mine": Filter(mine=True),
                "stale": Filter(stale=True),
                "later": Filter(later=True),
                "unresolved": Filter(unresolved=word),
                "outcome": Filter(outcome=word),
            }[what]
            assert len(view_order(queue, reader, where=where)) == count, (reader, key)


def test_orders_hold_what_the_rows_say(mixed):
    queue, heron = mixed
    for check in CHECKS:
        shown = view_rows(queue, heron, view_order(queue, heron, where=Filter(unresolved=check)))
        assert all(row.states[check] in ("todo", "open", "split") for row in shown)


def test_shares_hold_every_candidate_once_and_follow_the_name_alone(mixed):
    queue, heron = mixed
    shares = [names(queue, view_order(queue, heron, where=Filter(share=(one, 3)))) for one in (1, 2, 3)]
    assert sorted(sum(shares, [])) == sorted(["b-2", "A-1", "c-3", "B-4", "a-5", "C-6"])
    for index, share in enumerate(shares):
        assert all(ring(name) % 2**64 % 3 == index for name in share)


def test_put_off_candidates_are_listed(mixed):
    queue, heron = mixed
    put_off(queue, heron, "A-1")
    assert names(queue, view_order(queue, heron, where=Filter(later=True))) == ["A-1"]


def test_the_head_of_an_order_is_the_order_cut(mixed):
    queue, heron = mixed
    assert view_order(queue, heron, limit=2) == view_order(queue, heron)[:2]
    assert isinstance(view_order(queue, heron, limit=2), array)
    assert view_order(queue, heron, sort="star", limit=3) == view_order(queue, heron, sort="star")[:3]


@pytest.mark.parametrize(
    ("search", "text", "expected"),
    [
        (find_prefix, "b", "b-2 B-4"),
        (find_prefix, "", "A-1 a-5 b-2 B-4 c-3 C-6"),
        (find_prefix, "%", ""),
        (find_substring, "-", "A-1 a-5 b-2 B-4 c-3 C-6"),
        (find_substring, "4", "B-4"),
        (find_substring, "_", ""),
    ],
)
def test_searches(mixed, search, text, expected):
    queue, _ = mixed
    assert names(queue, search(queue, text)) == expected.split()


def test_unknown_words_are_refused(mixed):
    queue, heron = mixed
    with pytest.raises(InputError):
        view_order(queue, heron, sort="colour")
    for where in (Filter(unresolved="mixture"), Filter(outcome="lost")):
        with pytest.raises(UnknownNameError):
            view_order(queue, heron, where=where)
    with pytest.raises(InputError):
        view_order(queue, heron, where=Filter(share=(4, 3)))
    with pytest.raises(UnknownNameError):
        standing_for(queue, heron, "nobody")


def test_an_empty_queue_has_empty_views(queue):
    assert list(view_order(queue, None)) == []
    assert view_counts(queue, None)["all"] == 0
    assert view_rows(queue, None, []) == []


def test_the_story_is_told_in_time_order_and_marks_what_is_new(filled, team):
    heron, plover, _ = team
    walk(filled, plover, "SM-0001", second=100)
    rule(filled, heron, "SM-0001", "dust", "explains", 200, note="cold\nand faint")
    save_candidates(filled, [LoadRecord(star("SM-0001", J=2.0), "table")], utc(300))
    rule(filled, plover, "SM-0001", "dust", "explains", 400)
    told = story(filled, heron.id, "SM-0001")
    assert [line.utc for line in told] == sorted(line.utc for line in told)
    assert [line.what for line in told if line.since_mine] == ["corrected", "ruled"]
    (mine,) = [line for line in told if line.who == "heron"]
    assert (mine.check, mine.text) == ("dust", "explains: cold\nand faint")
    assert told[-1].text == "explains (others in view)"


def test_a_setting_changes_outcomes_in_the_same_transaction(filled, team):
    walk(filled, team[0], "SM-0001")
    assert next(team_standing(filled)).outcome == "pending"
    write_setting(filled, "quorum", "1", utc(500))
    assert next(team_standing(filled)).outcome == "unexplained"


def test_team_rows_count_rulings(filled, team):
    heron, plover, _ = team
    rule(filled, heron, "SM-0001", "star", "short", 100)
    rule(filled, heron, "SM-0001", "star", "explains", 200)
    rule(filled, plover, "SM-0001", "star", "unclear", 100)
    row = next(team_standing(filled))
    count = row.counts["star"]
    assert (count.explains, count.short, count.unclear, count.revised, count.stale) == (1, 0, 1, 1, 0)
    assert row.touched
    assert not list(team_standing(filled))[1].touched
