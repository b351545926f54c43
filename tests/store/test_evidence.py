"""One current evidence a candidate and kind; the cited stay."""

from __future__ import annotations

import math

import pytest

from tests.store.making import evidence, rule
from tui.errors import StoreError, UnknownNameError
from tui.model import Evidence, Fit, Param
from tui.store.codec import evidence_from, evidence_text
from tui.store.evidence import (
    current_evidence,
    current_evidence_of,
    evidence_by_digest,
    evidence_digests,
    outdated,
    save_evidence,
)
from tui.store.views import view_rows


def test_every_number_comes_back_as_it_went_in():
    fit = Fit(
        "star + dust", 0.1 + 0.2, 3, 5e-324, -math.inf, math.nan,
        {"a": Param(1 / 3, -math.inf, math.inf, "K", True), "b": Param(math.nan, 0.0, 1e300)},
        {"W3": -0.0, "J": math.nan}, math.inf,
    )  # fmt: skip
    given = Evidence("dust", 4, None, (fit, fit), ("é",), {"deep": {"x": [1, None, True, "t"]}}, "digest", ("J", "W3"))
    read = evidence_from("dust", 4, "digest", None, evidence_text(given))
    assert repr(read) == repr(given)


def test_the_newest_is_current(filled):
    save_evidence(filled, [("SM-0001", evidence("dust", True, "second"))])
    found = current_evidence(filled, "SM-0001")
    assert found["dust"] == evidence("dust", True, "second")
    assert set(found) == {"star", "instrument", "extinction", "blend", "dust"}


def test_cited_evidence_is_found_by_its_digest_after_it_was_replaced(filled, team):
    rule(filled, team[0], "SM-0001", "dust")
    save_evidence(filled, [("SM-0001", evidence("dust", True, "second"))])
    assert evidence_by_digest(filled, "dust-first").adequate is False
    with pytest.raises(UnknownNameError):
        evidence_by_digest(filled, "nothing")


def test_evidence_that_was_cited_may_become_current_again(filled, team):
    rule(filled, team[0], "SM-0001", "dust")
    save_evidence(filled, [("SM-0001", evidence("dust", True, "second"))])
    save_evidence(filled, [("SM-0001", evidence("dust"))])
    assert current_evidence(filled, "SM-0001")["dust"].digest == "dust-first"
    assert filled.execute("SELECT COUNT(*) FROM evidence WHERE candidate_id = 1 AND kind = 'dust'").fetchone() == (1,)


def test_the_same_again_changes_nothing(filled):
    before = filled.execute("SELECT * FROM evidence").fetchall()
    save_evidence(filled, [("SM-0001", evidence("dust"))])
    assert filled.execute("SELECT * FROM evidence").fetchall() == before


@pytest.mark.parametrize(
    "row",
    [
        ("nobody", evidence("dust")),
        ("SM-0002", Evidence("colour", 1, None, digest="x")),
        ("SM-0002", Evidence("dust", 1, None)),
        ("SM-0002", Evidence("dust", 2, None, digest="dust-first")),
    ],
    ids=["candidate", "kind", "digest", "version"],
)
def test_a_refusal_writes_nothing_at_all(filled, row):
    before = filled.execute("SELECT * FROM evidence").fetchall()
    with pytest.raises((UnknownNameError, StoreError)):
        save_evidence(filled, [("SM-0001", evidence("dust", True, "second")), row])
    assert filled.execute("SELECT * FROM evidence").fetchall() == before


def test_what_is_outdated(filled):
    wanted = {
        "SM-0001": {"star": "star-first", "dust": "dust-first"},
        "SM-0002": {"star": "star-second", "dust": "dust-first", "mixture": "m"},
    }
    assert outdated(filled, wanted) == {"SM-0002": ("star", "mixture")}
    assert evidence_digests(filled, ["SM-0003"])["SM-0003"]["dust"] == "dust-first"


def test_many_at_once(filled):
    found = current_evidence_of(filled, ["SM-0002", "SM-0001"])
    assert list(found) == ["SM-0002", "SM-0001"]
    assert found["SM-0001"] == current_evidence(filled, "SM-0001")


def test_the_queue_row_follows_the_star_evidence(filled):
    (row,) = view_rows(filled, None, [1])
    assert (row.odd_band, row.odd_pull) == ("W3", 8.0)
    assert row.oddness == pytest.approx(8.222, abs=0.0005)  # scipy.stats.norm.isf(1e-16) = 8.2220822
    facts = {"oddness": 12.5, "odd_band": "J", "odd_pull": -3.0}
    save_evidence(filled, [("SM-0001", Evidence("star", 1, False, evidence("star").fits, facts=facts, digest="other"))])
    (row,) = view_rows(filled, None, [1])
    assert (row.oddness, row.odd_band, row.odd_pull) == (12.5, "J", -3.0)
