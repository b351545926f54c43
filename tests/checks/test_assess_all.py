"""All kinds at once: the same as one by one, independent of company, and quiet on hostile candidates."""

from __future__ import annotations

import json

import numpy as np
import pytest

from tests.checks.making import make
from tui.checks import VERSIONS, assess, assess_all
from tui.errors import TemplateError
from tui.model import KINDS, Candidate, Measurement, Settings, canonical_json
from tui.physics import composite as c

NAN = float("nan")


@pytest.fixture(scope="module")
def mixed(templates):
    """One of each nature."""
    return [
        make(templates, c.STAR, 5772.0, name="star", seed=1),
        make(templates, c.STAR_AV, 6500.0, name="screen", seed=2, av=2.0, facts={"av_max": 3.0}),
        make(templates, c.DUST, 6500.0, name="dust", seed=3, x=300.0, amount=0.02),
        make(templates, c.COMPACT, 3300.0, name="compact", seed=4, x=30000.0, amount=0.01),
        make(templates, c.STAR, 5000.0, name="odd", seed=5, factors={"H": 0.3, "W1": 0.2}),
    ]


@pytest.fixture(scope="module")
def found(mixed, templates, tables):
    every = assess_all(mixed, templates, Settings(), KINDS, tables)
    return {candidate.name: evidence for candidate, evidence in zip(mixed, every, strict=True)}


def test_each_nature_is_explained_by_its_check(found):
    assert found["star"]["star"].adequate is True
    assert found["screen"]["extinction"].adequate is True
    assert found["dust"]["dust"].adequate is True and found["dust"]["star"].adequate is False
    assert found["compact"]["blend"].adequate is True and found["compact"]["star"].adequate is False


def test_a_notch_is_explained_by_nothing(found):
    kinds = ("star", "extinction", "blend", "dust", "mixture")
    assert [found["odd"][kind].adequate for kind in kinds] == [False] * 5


def test_kinds_come_in_order_with_their_versions(found):
    for evidence in found.values():
        assert list(evidence) == [kind for kind in KINDS if kind in VERSIONS]
        assert all(one.kind == kind and one.version == VERSIONS[kind] for kind, one in evidence.items())


def test_one_kind_alone_says_the_same(mixed, found, templates, tables):
    for kind in ("star", "extinction", "dust", "blend"):
        for candidate, one in zip(mixed, assess(kind, mixed, templates, Settings(), tables), strict=True):
            same = found[candidate.name][kind]
            assert (one.adequate, one.best.model) == (same.adequate, same.best.model)
            assert one.best.chi2 == pytest.approx(same.best.chi2, rel=1e-6)


def test_company_does_not_matter(mixed, found, templates, tables):
    alone = assess_all([mixed[2]], templates, Settings(), KINDS, tables)[0]
    for kind, evidence in alone.items():
        assert evidence.adequate is found["dust"][kind].adequate
        if evidence.best is not None:
            assert evidence.best.chi2 == pytest.approx(found["dust"][kind].best.chi2, rel=1e-3, abs=1e-3)


def test_evidence_can_be_written_down_and_read_as_sentences(found):
    for evidence in found.values():
        for one in evidence.values():
            json.loads(canonical_json(one.facts))
            assert all(remark.endswith(".") and remark[0].isupper() or remark[0] in "fp"
                for remark in one.cautions), one.cautions


HOSTILE = {
    "nothing": (),
    "limits only": (Measurement("W3", 1e-3, NAN, True), Measurement("W4", 2e-3, NAN, True)),
    "one band": (Measurement("J", 1e-3, 1e-5),),
    "negative": (Measurement("J", -1e-3, 1e-3), Measurement("Ks", -2e-3, 1e-3)),
    "zero": (Measurement("J", 0.0, 1e-3), Measurement("Ks", 0.0, 1e-3)),
    "no errors": tuple(Measurement(band, 1e-3, NAN) for band in ("J", "H", "Ks", "W1")),
    "errors of zero": tuple(Measurement(band, 1e-3, 0.0) for band in ("J", "H", "Ks", "W1")),
    "very bright": tuple(Measurement(band, 1e6, 1e4) for band in ("J", "H", "Ks", "W1")),
    "very faint": tuple(Measurement(band, 1e-9, 1e-10) for band in ("J", "H", "Ks", "W1")),
    "all excluded": (Measurement("J", 1.0, 0.1, exclude=True),),
}


@pytest.mark.parametrize("facts", [{}, {"parallax": 20.0, "parallax_error": 0.1}, {"parallax": NAN,
    "parallax_error": 0.0}])
@pytest.mark.parametrize("name", HOSTILE)
def test_hostile_candidates_are_answered_without_a_warning(name, facts, templates, tables, mixed):
    candidate = Candidate(name, HOSTILE[name], facts)
    for company in ([candidate], [mixed[0], candidate]):
        evidence = assess_all(company, templates, Settings(), KINDS, tables)[-1]
        if not any(not (m.limit or m.exclude) for m in candidate.measurements):
            assert all(evidence[kind].adequate is None for kind in ("star", "extinction", "blend", "dust"))
        for one in evidence.values():
            assert one.best is None or np.isfinite(one.best.chi2)


def test_no_candidates_no_evidence(templates, tables):
    assert assess_all([], templates, Settings(), KINDS, tables) == []


def test_a_band_outside_the_grids_is_named(templates, tables):
    with pytest.raises(TemplateError, match="U"):
        assess_all([Candidate("x", (Measurement("U", 1.0, 0.1),))], templates, Settings(), ("star",), tables)
