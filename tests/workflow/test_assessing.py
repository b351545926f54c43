"""What is computed: only what lacks or is outdated, in chunks, with a digest of all that it rests on."""

from __future__ import annotations

from contextlib import closing
from dataclasses import replace

import pytest

import tui.checks
from tui.errors import UnknownNameError
from tui.model import CHECKS, KINDS, Candidate, Evidence, Settings
from tui.store.candidates import save_candidates
from tui.store.connect import open_queue
from tui.store.records import LoadRecord
from tui.workflow import assessing, setting
from tui.workflow.basis import Basis
from tui.workflow.digests import RELEVANT, recipes
from tui.workflow.session import Session


@pytest.fixture
def calls(monkeypatch, tmp_path):
    """Checks that record what they were asked for and answer at once."""
    asked = []

    def assess_all(candidates, templates, settings, kinds, tables):
        asked.append((tuple(one.name for one in candidates), tuple(kinds)))
        return [{kind: Evidence(kind, tui.checks.VERSIONS[kind], False) for kind in kinds} for _ in candidates]

    monkeypatch.setattr(tui.checks, "VERSIONS", dict.fromkeys(KINDS, 7), raising=False)
    monkeypatch.setattr(tui.checks, "assess_all", assess_all, raising=False)
    monkeypatch.setattr(Basis, "templates", lambda self: None)
    return asked


def test_all_that_lacks_is_computed_once(queue, calls):
    done = assessing.assess_queue(queue, jobs=1)
    assert (done.candidates, done.evidence) == (3, 3 * len(KINDS))
    assert calls == [(("SM-0001", "SM-0002", "SM-0003"), KINDS)]
    assert assessing.assess_queue(queue, jobs=1).sentence() == "All evidence is there and up to date."
    assert len(calls) == 1


def test_only_the_kinds_asked_for_are_computed(queue, calls):
    assessing.assess_queue(queue, kinds=("dust", "mixture"), jobs=1)
    assert calls[0][1] == ("dust", "mixture")
    assessing.assess_queue(queue, jobs=1)
    assert set(calls[1][1]) == set(KINDS) - {"dust", "mixture"}


def test_an_unknown_kind_is_refused(queue, calls):
    with pytest.raises(UnknownNameError, match="planets"):
        assessing.assess_queue(queue, kinds=("planets",))


def test_a_new_version_of_one_check_outdates_that_check_alone(queue, calls, monkeypatch):
    assessing.assess_queue(queue, jobs=1)
    monkeypatch.setitem(tui.checks.VERSIONS, "instrument", 8)
    assessing.assess_queue(queue, jobs=1)
    assert calls[1] == (("SM-0001", "SM-0002", "SM-0003"), ("instrument",))


def test_a_new_version_outdates_what_rests_on_it_too(queue, calls, monkeypatch):
    assessing.assess_queue(queue, jobs=1)
    monkeypatch.setitem(tui.checks.VERSIONS, "dips", 8)
    assessing.assess_queue(queue, jobs=1)
    assert calls[1][1] == (*CHECKS, "dips")


def test_a_setting_of_physics_outdates_and_one_of_consensus_does_not(queue, calls):
    assessing.assess_queue(queue, jobs=1)
    setting.write(queue, "quorum", "3", "heron")
    assert assessing.assess_queue(queue, jobs=1).evidence == 0
    setting.write(queue, "ruwe_max", "1.5", "heron")
    assessing.assess_queue(queue, jobs=1)
    assert set(calls[1][1]) == set(KINDS) - {"mixture"}


def test_a_new_measurement_outdates_one_candidate(queue, calls):
    assessing.assess_queue(queue, jobs=1)
    with closing(open_queue(queue)) as connection:
        record = LoadRecord(Candidate("SM-0002", facts={"ruwe": 2.0}), "gaia")
        save_candidates(connection, [record], "2026-02-01T00:00:00.000000Z")
    assessing.assess_queue(queue, jobs=1)
    assert calls[1] == (("SM-0002",), KINDS)


def test_chunks_are_bounded_and_progress_is_told(queue, calls, monkeypatch):
    monkeypatch.setattr(assessing, "CHUNK", 2)
    told = []
    assessing.assess_queue(queue, jobs=1, report=lambda done, total: told.append((done, total)))
    assert [len(names) for names, _ in calls] == [2, 1] and told == [(2, 3), (3, 3)]


def test_a_session_computes_what_lacks_and_stores_it(queue, calls):
    with Session.open(queue, "heron") as session:
        made = session.rule("SM-0001", "blend", "short")
        assert calls == [(("SM-0001",), ("blend",))]
        assert made.evidence_digest == session.stored_evidence("SM-0001")["blend"].digest
        assert list(session.evidence("SM-0001")) == list(KINDS)
        assert "blend" not in calls[1][1]


def test_a_reader_computes_and_stores_nothing(queue, calls):
    with Session.open(queue, write=False) as session:
        assert session.evidence("SM-0001", ("dust",))["dust"].version == 7
        assert session.stored_evidence("SM-0001")["dust"].version == 1


def test_every_kind_says_which_settings_it_rests_on():
    assert set(RELEVANT) == set(KINDS)
    assert all(hasattr(Settings(), name) for names in RELEVANT.values() for name in names)


def test_the_digest_covers_kind_version_input_settings_and_templates():
    def made(kind="dust", version=1, settings=Settings(), templates="t", candidate="c"):
        return recipes((kind,), {kind: version}, settings, templates)[kind].digest_of(candidate)

    first = made()
    changed = replace(Settings(), p_min=0.5)
    others = [made("star"), made(version=2), made(settings=changed), made(templates="u"), made(candidate="d")]
    assert first == made() and len({first, *others}) == 6 and set(CHECKS) <= set(RELEVANT)
