"""A queue's pulls in one pass: the same as each evidence by itself; a mark that changes with them."""

from __future__ import annotations

from contextlib import closing

import numpy as np
import pytest

from tui.model import Candidate, Evidence, Fit, Measurement
from tui.store import pulls
from tui.store.candidates import candidate_id, save_candidates
from tui.store.connect import open_queue
from tui.store.evidence import current_evidence, save_evidence
from tui.store.records import LoadRecord

UTC = "2026-01-01T00:00:00.000000Z"
PULLS = {
    "A": {"J": 1.5, "W3": -2.25, "my band.x": 0.125},
    "B": {"J": float("nan"), "W3": 7.0},
    "C": {},
    "D": {"W3": 3.0, "J": 0.5},
}


def star(name, found, digest=""):
    fits = (Fit("star", 1.0, 2, 0.5, 1.0, 1.0, {}, found),) if found is not None else ()
    return Evidence("star", 1, True, fits, (), {}, digest or f"digest-{name}", tuple(found or ()))


def w3(flux_jy):
    return Measurement("W3", flux_jy, 0.01, epoch="2010.5", source="s")


@pytest.fixture
def connection(tmp_path):
    with closing(open_queue(str(tmp_path / "q.db"), create=True)) as connection:
        facts = {"A": {"ra": 10.0, "dec": -5.0}, "B": {"ra": 10.0}}
        rows = (
            Candidate(name, (w3(0.1 + 0.1 * place),), facts.get(name, {}))
            for place, name in enumerate([*PULLS, "E", "F"])
        )
        save_candidates(connection, [LoadRecord(one, "s") for one in rows], UTC)
        save_evidence(connection, [(name, star(name, found)) for name, found in PULLS.items()])
        save_evidence(connection, [("E", star("E", None))])
        yield connection


def test_each_row_is_that_of_its_own_evidence(connection):
    found = pulls.star_pulls(connection)
    assert [int(one) for one in found.ids] == [candidate_id(connection, name) for name in "ABCDE"]
    for row, name in enumerate("ABCD"):
        best = current_evidence(connection, name)["star"].best
        expected = [best.pulls.get(band, np.nan) for band in found.bands]
        assert np.array_equal(found.pulls[row], np.array(expected, dtype=np.float32), equal_nan=True)
    assert np.isnan(found.pulls[4]).all() and set(found.bands) == {"J", "W3", "my band.x"}


def test_a_queue_without_evidence(tmp_path):
    with closing(open_queue(str(tmp_path / "empty.db"), create=True)) as connection:
        found = pulls.star_pulls(connection)
        assert found.ids.size == 0 and found.bands == () and found.pulls.shape == (0, 0)
        pulls.pulls_mark(connection)


def test_the_mark_changes_with_star_evidence_and_nothing_else(connection):
    before = pulls.pulls_mark(connection)
    save_candidates(connection, [LoadRecord(Candidate("G"), "s")], UTC)
    assert pulls.pulls_mark(connection) == before
    save_evidence(connection, [("D", star("D", {"W3": 4.0}, "another"))])
    assert pulls.pulls_mark(connection) != before


def test_an_id_that_is_used_again_is_no_sameness(connection):
    save_evidence(connection, [("F", star("F", {"W3": 4.0}, "one"))])
    before = pulls.pulls_mark(connection)
    save_evidence(connection, [("F", star("F", {"W3": 9.0}, "two"))])  # takes the place and the id of the newest row
    assert pulls.pulls_mark(connection) != before


def test_places_and_fluxes(connection):
    ids = [candidate_id(connection, name) for name in "ABC"]
    assert pulls.places_of(connection, ids) == {ids[0]: (10.0, -5.0)}
    assert pulls.fluxes_of(connection, ids, "W3")[ids[1]] == (pytest.approx(0.2), "2010.5")
    assert pulls.fluxes_of(connection, ids, "J") == {}
    assert pulls.names_of(connection, ids) == dict(zip(ids, "ABC", strict=True))
