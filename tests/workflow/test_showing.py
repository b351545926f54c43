"""What there is to show of one candidate, as the document of `show --json`."""

from __future__ import annotations

import json
import math
from dataclasses import replace

from tui.model import CHECKS, Dip, Evidence, Fit
from tui.workflow.session import Session
from tui.workflow.showing import dip_dicts, dossier, drawn_dict, drawn_of, evidence_dict


def fit(model):
    return Fit(model, 1.0, 2, math.nan, 3.0, 4.0)


def test_the_document_is_plain_json_with_nothing_lost(queue, monkeypatch):
    with Session.open(queue, "heron") as session:
        monkeypatch.setattr(session, "evidence", session.stored_evidence)
        found = dossier(session, "SM-0001").as_dict()
    again = json.loads(json.dumps(found, allow_nan=False))
    assert again == found and list(again["checks"]) == list(CHECKS)
    assert [one["band"] for one in again["measurements"]] == ["Gaia_G", "J", "H", "Ks", "W1", "W2", "W3"]
    assert again["oddness"]["band"] == "W3" and again["mixture"] == {} and again["dips"] == []
    assert again["checks"]["dust"]["state"] == "todo" and again["checks"]["dust"]["stale"] is None


def test_each_dimming_event_has_its_own_fits():
    dips = (Dip("a", "B", 0.1, 0.01), Dip("b", "B", 0.2, math.nan), Dip("b", "V", 0.1, 0.01))
    facts = {"events": ["b", "a"], "standing_events": ["b"], "slope": 1.0}
    evidence = Evidence("dips", 1, None, (fit("grey (a)"), fit("grey (b)")), ("b: refused is grey.",), facts)
    first, second = dip_dicts(dips, evidence)
    assert (first["event"], first["stands"], first["facts"]["slope"]) == ("b", True, 1.0)
    assert [one["depth_error"] for one in first["depths"]] == [None, 0.01]
    assert [one["model"] for one in first["fits"]] == ["grey"] and first["fits"][0]["p"] is None
    assert (second["stands"], second["facts"], second["cautions"]) == (False, {}, [])


def test_a_single_event_needs_no_label():
    evidence = Evidence("dips", 1, True, (fit("grey"),), (), {"events": ["a"], "standing_events": ["a"]})
    assert dip_dicts((Dip("a", "B", 0.1, 0.01),), evidence)[0]["fits"][0]["model"] == "grey"


def test_dips_without_evidence_are_still_shown():
    (only,) = dip_dicts((Dip("a", "B", 0.1, 0.01),), None)
    assert only["depths"] and not only["fits"] and evidence_dict(None) == {}


def test_a_refused_mixture_is_drawn_anew_the_same_each_time(queue, tmp_path, monkeypatch):
    monkeypatch.setenv("PLAINLIGHT_CACHE", str(tmp_path / "cache"))
    with Session.open(queue, "heron") as session:
        candidate, basis = session.candidate("SM-0001"), session.basis
    rows = [replace(one, flux_jy=one.flux_jy / (3 if one.band == "H" else 1)) for one in candidate.measurements]
    notched = replace(candidate, measurements=tuple(rows))
    refused = Evidence("mixture", 1, False, digest="ab" * 32)
    first, again = (drawn_of(notched, refused, basis) for _ in range(2))
    assert first == again and first is not None and first.as_bad == 0
    assert drawn_dict(first) == {"bootstrap": {"draws": first.draws, "as_bad": 0, "p": 1 / (first.draws + 1)}}
    assert drawn_of(notched, replace(refused, adequate=True), basis) is None and drawn_dict(None) == {}
