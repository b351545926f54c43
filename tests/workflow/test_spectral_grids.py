"""Candidates that carry a spectrum get grids that hold its points; the others stay on the fast way."""

from __future__ import annotations

from contextlib import closing
from dataclasses import replace

import numpy as np
import pytest

from tui.model import Candidate, Measurement, Settings, Spectrum
from tui.physics.spectral import is_point
from tui.store.candidates import save_candidates
from tui.store.connect import open_queue
from tui.store.records import LoadRecord
from tui.workflow import assessing, probing
from tui.workflow.basis import Basis, read_basis
from tui.workflow.spectral_grids import groups, templates_of

WAVE_UM = np.linspace(0.5, 0.7, 12)


def carrying(name, wave_um=WAVE_UM):
    fluxes = {"Gaia_G": 0.030, "J": 0.045, "H": 0.040, "Ks": 0.028}
    measured = tuple(Measurement(band, flux, 0.02 * flux, source="test") for band, flux in fluxes.items())
    flux = 0.030 * (wave_um / 0.6)
    return Candidate(name, measured, {"ra": 1.0, "dec": 2.0}, spectrum=Spectrum(wave_um, flux, 0.05 * flux))


@pytest.fixture
def planck(tmp_path, monkeypatch):
    monkeypatch.setenv("PLAINLIGHT_CACHE", str(tmp_path / "cache"))
    return Basis(Settings(photosphere="planck"))


def test_candidates_are_grouped_by_wavelength_grid(planck):
    bare = replace(carrying("bare"), spectrum=None)
    found = groups([carrying("a"), bare, carrying("b", WAVE_UM * 1.1), carrying("c")], planck)
    assert [[one.name for one in some] for some, _ in found] == [["bare"], ["a", "c"], ["b"]]
    assert found[0][1] is planck.templates() and sum(is_point(name) for name in found[1][1].names) == WAVE_UM.size
    assert templates_of(carrying("d"), planck) is found[1][1]


def test_dwarfs_need_no_grids_of_their_own(planck):
    basis = replace(planck, settings=Settings())
    assert [templates is basis.templates() for _, templates in groups([carrying("a")], basis)] == [True]


def test_evidence_of_a_queue_holds_the_points(planck, tmp_path):
    path = str(tmp_path / "spectra.db")
    with closing(open_queue(path, create=True)) as connection:
        utc = "2026-01-01T00:00:00.000000Z"
        bare = replace(carrying("bare"), spectrum=None)
        save_candidates(connection, [LoadRecord(one, "test") for one in (carrying("a"), bare)], utc)
        basis = replace(read_basis(connection), settings=planck.settings)
        found = {name: assessing.evidence_for(connection, name, ("star",), basis)["star"] for name in ("a", "bare")}
    assert sum(map(is_point, found["a"].bands)) == WAVE_UM.size and not any(map(is_point, found["bare"].bands))
    assert "spectrum_p" in found["a"].facts and "spectrum_p" not in found["bare"].facts


def test_probing_drops_a_spectrum_by_name(planck):
    fit, curve = probing.probe(carrying("a"), "star", {}, frozenset({"spectrum"}), planck)
    assert set(fit.pulls) == {"Gaia_G", "J", "H", "Ks"} and np.isfinite(curve.total_jy).all()
