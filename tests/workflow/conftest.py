"""A small queue with hand-made evidence, for whatever works on an open queue."""

from __future__ import annotations

from contextlib import closing

import pytest

from tui.model import CHECKS, Candidate, Evidence, Fit, Measurement, Param, digest
from tui.store.candidates import candidate_digests, save_candidates
from tui.store.connect import open_queue
from tui.store.evidence import save_evidence
from tui.store.records import LoadRecord
from tui.store.reviewers import add_reviewer

NAMES = ("SM-0001", "SM-0002", "SM-0003")
HANDLES = ("heron", "plover")
UTC = "2026-01-01T00:00:00.000000Z"
BANDS = ("Gaia_G", "J", "H", "Ks", "W1", "W2", "W3")


def candidate(name, scale=1.0):
    """A 5772 K black body, roughly, with an excess in W3."""
    fluxes = (0.030, 0.045, 0.040, 0.028, 0.014, 0.0077, 0.0060)
    scaled = {band: scale * flux for band, flux in zip(BANDS, fluxes, strict=True)}
    measured = tuple(Measurement(band, flux, 0.02 * flux, source="test") for band, flux in scaled.items())
    return Candidate(name, measured, {"ra": 10.0, "dec": -5.5})


def fit(model, p, **params):
    fitted = {name: Param(value, 0.9 * value, 1.1 * value, "K") for name, value in params.items()}
    return Fit(model, 20.0, 5, p, 24.0, 25.0, fitted, {"W3": 8.0})


def hand_made(name, kind, version=1):
    """Evidence that no code computed: star not adequate, dust adequate, the rest not."""
    return Evidence(kind, version, kind == "dust", (fit(kind, 0.2 if kind == "dust" else 1e-6, teff=5772.0),),
                    ("one band carries it",), {}, digest([name, kind, version]), BANDS)  # fmt: skip


@pytest.fixture
def queue(tmp_path):
    """Path of a queue with three candidates, two reviewers and evidence on every check."""
    path = str(tmp_path / "q.db")
    with closing(open_queue(path, create=True)) as connection:
        records = [LoadRecord(candidate(name, 1.0 + i), "test") for i, name in enumerate(NAMES)]
        save_candidates(connection, records, UTC)
        for handle in HANDLES:
            add_reviewer(connection, handle, UTC)
        save_evidence(connection, [(name, hand_made(name, check)) for name in NAMES for check in CHECKS])
        assert set(candidate_digests(connection, NAMES)) == set(NAMES)
    return path
