"""Look-alikes over a queue on disk: found, told apart from chance, kept in memory, and shown."""

from __future__ import annotations

import json
from contextlib import closing

import numpy as np
import pytest

from tui.model import Candidate, Evidence, Fit, Measurement
from tui.store import pulls as kept_pulls
from tui.store.candidates import candidate_id, save_candidates
from tui.store.connect import open_queue
from tui.store.evidence import save_evidence
from tui.store.records import LoadRecord
from tui.workflow.lookalikes import LookAlikeFinder, year_of
from tui.workflow.session import Session

UTC = "2026-01-01T00:00:00.000000Z"
BANDS = ("Gaia_BP", "Gaia_G", "Gaia_RP", "J", "H", "Ks", "W1", "W2", "W3", "W4")
MEMBERS, COUNT = 12, 200


def star(pulls, name):
    fit = Fit("star", 1.0, 2, 0.5, 1.0, 1.0, {}, dict(zip(BANDS, pulls, strict=True)))
    return Evidence("star", 1, False, (fit,), (), {}, f"digest-{name}", BANDS)


@pytest.fixture(scope="module")
def queue(tmp_path_factory):
    """Noise; the first twelve share a pattern, a brightness of 9 mag in J, an epoch and a place on the sky."""
    path = str(tmp_path_factory.mktemp("alike") / "q.db")
    rng = np.random.default_rng(7)
    table = rng.normal(size=(COUNT, len(BANDS)))
    table[:MEMBERS, 7:] += (4.0, 8.0, 12.0)
    table[:MEMBERS, :3] = 0.01
    mag = rng.uniform(8, 16, COUNT)
    mag[:MEMBERS] = rng.normal(9.0, 0.05, MEMBERS)
    ra, dec = rng.uniform(0, 360, COUNT), rng.uniform(-60, 60, COUNT)
    ra[:MEMBERS], dec[:MEMBERS] = rng.normal(120.0, 0.1, MEMBERS), rng.normal(20.0, 0.1, MEMBERS)
    epoch = rng.uniform(55200, 55500, COUNT)
    epoch[:MEMBERS] = 55321.0
    with closing(open_queue(path, create=True)) as connection:
        names = [f"S-{place:03d}" for place in range(COUNT)]
        rows = []
        for place, name in enumerate(names):
            flux = 1600.0 * 10 ** (-0.4 * mag[place])
            measured = tuple(
                Measurement(band, flux, 0.02 * flux, source="s", epoch=f"MJD {epoch[place]:.1f}") for band in BANDS
            )
            rows.append(LoadRecord(Candidate(name, measured, {"ra": ra[place], "dec": dec[place]}), "s"))
        save_candidates(connection, rows, UTC)
        save_evidence(connection, [(name, star(table[place], name)) for place, name in enumerate(names)])
    return path


@pytest.fixture
def session(queue, monkeypatch):
    monkeypatch.setattr(Session, "evidence", lambda self, name, kinds=(): self.stored_evidence(name))
    with Session.open(queue, write=False) as session:
        yield session


def test_a_shared_pattern_is_found_with_what_else_is_shared(session):
    found = session.look_alikes("S-003")
    assert {one.name for one in found.candidates} >= {f"S-{place:03d}" for place in range(MEMBERS) if place != 3}
    assert found.count <= MEMBERS + 2 and found.searched == COUNT and found.p == 0.01
    assert (found.band, found.points_to_calibration) == ("W4", True) and found.mag_band.startswith("Gaia")
    assert found.shared == {"magnitude": 0.01, "epoch": 0.01, "place": 0.01}
    assert "magnitude, epoch and place" in found.sentence
    best = found.candidates[0]
    assert best.cosine > 0.9 and best.pull > 5 and best.epoch == "MJD 55321.0" and best.apart_deg < 1.0
    assert json.loads(json.dumps(found.as_dict()))["candidates"][0]["name"] == best.name
    assert found == session.look_alikes("S-003")  # one queue, one answer


def test_noise_looks_like_nothing(session):
    lonely = [session.look_alikes(f"S-{place:03d}") for place in (60, 61, 62)]
    assert all(one.count <= 3 and not one.points_to_calibration for one in lonely)


def test_the_queue_is_read_once_and_again_only_when_star_evidence_changed(queue, session, monkeypatch):
    reads = []
    whole = kept_pulls.star_pulls
    monkeypatch.setattr("tui.workflow.lookalikes.star_pulls", lambda connection: reads.append(1) or whole(connection))
    session.look_alikes("S-001")
    with session.clone() as other:
        other.look_alikes("S-002")
    session.look_alikes("S-005")
    assert len(reads) == 1
    with closing(open_queue(queue)) as connection:
        save_candidates(connection, [LoadRecord(Candidate("new"), "s")], "2026-01-02T00:00:00.000000Z")
        session.look_alikes("S-001")
        assert len(reads) == 1  # something was written, and no star evidence
        save_evidence(connection, [("new", star(np.zeros(len(BANDS)), "new"))])
    session.look_alikes("S-001")
    assert len(reads) == 2


def test_a_candidate_whose_evidence_is_not_in_the_queue_yet_is_compared_all_the_same(session):
    place = candidate_id(session.connection, "S-004")
    fresh = star([0.0] * 7 + [4.0, 8.0, 12.0], "fresh")
    found = LookAlikeFinder().find(session.connection, (0,), (10**6, "not there"), fresh, session.band_info())
    assert found.count >= MEMBERS - 1 and found.searched >= COUNT + 1
    assert LookAlikeFinder().find(session.connection, (0,), (place, "S-004"), None, session.band_info()) is None


@pytest.mark.parametrize(
    ("text", "year"),
    [("2000-01-01T12:00", 2000.0), ("JD 2451545.0", 2000.0), ("51544.5", 2000.0), ("2016.0", 2016.0),
     ("MJD 55321.0", 2010.34)],
)  # fmt: skip
def test_epochs_as_archives_give_them(text, year):
    # J2000.0 is JD 2451545.0 = MJD 51544.5 (IAU 1976); a Julian year has 365.25 days
    assert year_of(text) == pytest.approx(year, abs=0.01)


@pytest.mark.parametrize("text", ["", "DR3", "AllWISE", "2000-13-45", "12"])
def test_what_is_no_epoch_is_left_out(text):
    assert np.isnan(year_of(text))
