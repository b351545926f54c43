"""Practising: answers follow one's own rulings, and no file is touched."""

from __future__ import annotations

import pytest

from tui.errors import StoreError, UnknownNameError
from tui.model import CHECKS
from tui.workflow.practice_session import PracticeSession


@pytest.fixture
def practice():
    return PracticeSession()


def test_answers_are_hidden_until_one_has_ruled(practice):
    name = next(iter(practice.stars))
    assert practice.view(name).others == [] and not practice.view(name).seal_open
    practice.rule(name, "star", "short", "far off")
    view = practice.view(name)
    assert [(line.check, line.handle, line.note) for line in view.others] == [
        ("star", "answer", practice.answer(name, "star").why)
    ]
    assert view.states["star"] == "short" and view.to_rule == CHECKS[1:] and not view.done
    practice.withdraw(name, "star")
    assert practice.view(name).others == [] and len(practice.view(name).own_history) == 2
    with pytest.raises(StoreError):
        practice.withdraw(name, "star")


def test_a_star_is_done_when_its_explanation_is_found_or_all_is_ruled(practice):
    first, second, _ = practice.stars
    right = next(check for check in CHECKS if practice.answer(first, check).ruling == "explains")
    practice.rule(first, right, "explains")
    assert practice.view(first).done and practice.view(first).to_rule == ()
    assert practice.story(first)[-1].text == practice.star(first).told
    wrong = next(check for check in CHECKS if practice.answer(second, check).ruling != "explains")
    practice.rule(second, wrong, "explains")
    assert not practice.view(second).done  # a wrong explanation ends nothing: the walk goes on
    for check in CHECKS:
        practice.rule(second, check, "unclear")
    assert practice.view(second).done
    assert practice.claim_next() == list(practice.stars)[2]


def test_later_and_drafts_last_as_long_as_the_practice(practice):
    first, second, third = practice.stars
    practice.put_off(first)
    assert practice.claim_next() == second and practice.claim_next((second, third)) == first
    practice.save_draft(first, "dust", "warm?")
    assert practice.view(first).drafts == {"dust": "warm?"} and practice.clone().draft(first, "dust") == "warm?"
    assert PracticeSession().draft(first, "dust") == ""
    with pytest.raises(UnknownNameError):
        practice.candidate("SM-0001")


def test_evidence_curve_and_probe_are_the_programs_own(practice):
    name = next(iter(practice.stars))
    assert practice.stored_evidence(name) == {}
    found = practice.evidence(name)
    assert set(CHECKS) <= set(found) and practice.stored_evidence(name) == found
    curve = practice.curve(name, "star")
    assert curve.total_jy.shape == curve.wave_um.shape
    fit, _ = practice.probe(name, "star", {"teff": 5000.0}, ("W3",))
    assert practice.probe(name, "blend", {"teff1": 5000.0}, (), "free pair")[0].model == "free pair"
    assert "W3" not in fit.pulls and fit.params["teff"].value == pytest.approx(5000.0, rel=1e-9)
