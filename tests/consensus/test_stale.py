"""A ruling counts while adequate, bands and pulls agree; else the reason is told."""

from __future__ import annotations

import math

import pytest

from tui.consensus.stale import counts
from tui.model import Evidence


@pytest.mark.parametrize(
    ("then", "now", "word"),
    [
        ({}, {}, ""),
        ({"J": 1.0}, {"J": 2.0}, ""),  # exactly one sigma still counts
        ({"J": 1.0}, {"J": 2.01}, "J moved by 1.0 sigma"),
        ({"J": 1.0, "W3": -2.0}, {"J": 1.5, "W3": 1.0}, "W3 moved by 3.0 sigma"),
        ({"J": 1.0}, {"J": 1.0, "W4": 0.0}, "W4 added"),
        ({"J": 1.0, "H": 0.0}, {"J": 1.0}, "H dropped"),
        ({"J": math.nan}, {"J": math.nan}, ""),
        ({"J": 1.0}, {"J": math.nan}, "no longer"),
    ],
)
def test_pulls_and_bands(new_evidence, then, now, word):
    reason = counts(new_evidence("dust", **then), new_evidence("dust", version=2, **now))
    assert (word in reason) if word else reason == ""


@pytest.mark.parametrize(("then", "now"), [(True, False), (False, None), (None, True)])
def test_adequate_must_agree(new_evidence, then, now):
    assert counts(new_evidence("blend", then), new_evidence("blend", now)).startswith("was ")


def test_missing_evidence(new_evidence):
    assert counts(None, new_evidence("star")) and not counts(new_evidence("star"), None) and not counts(None, None)


def test_only_the_best_fit_is_compared(new_evidence):
    then, now = new_evidence("dust", J=1.0), new_evidence("dust", J=1.2)
    worse = new_evidence("dust", J=9.0).fits
    assert counts(then, Evidence("dust", 1, False, now.fits + worse, bands=("J",))) == ""


def test_evidence_without_fits(new_evidence):
    bare = Evidence("instrument", 1, False)
    assert counts(bare, Evidence("instrument", 2, False)) == ""
    assert counts(bare, new_evidence("instrument"))
