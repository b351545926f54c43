"""A photosphere source of the user's own spectra: Planck spectra given as a grid must act as `planck` does."""

from __future__ import annotations

import numpy as np
import pytest
from astropy.io import fits
from astropy.table import Table

from tui.data.load import bands
from tui.errors import TableError
from tui.model import Settings
from tui.physics.planck import planck_jy
from tui.workflow import setting, templates
from tui.workflow.basis import read_basis
from tui.workflow.grid_photosphere import grid_photosphere, keep_grid
from tui.workflow.grid_spectra import SurfaceSpectrum, read_spectra
from tui.workflow.session import Session

WAVE_UM = np.geomspace(0.15, 40.0, 3000)
TEFF_K = (4500.0, 5200.0, 6000.0, 7000.0)


def surface(teff_k):
    return np.pi * planck_jy(WAVE_UM, teff_k)


def write_text(folder, teff_k, flux=None, head="# wavelength: um\n# flux: Jy\n", name=None):
    path = folder / (name or f"star_{teff_k:05.0f}.dat")
    given = surface(teff_k) if flux is None else flux
    rows = "".join(f"{w:.8g} {f:.8g}\n" for w, f in zip(WAVE_UM, given, strict=True))
    path.write_text(head + rows)
    return path


@pytest.fixture
def folder(tmp_path):
    place = tmp_path / "mygrid"
    place.mkdir()
    for teff_k in TEFF_K[:2]:
        write_text(place, teff_k)
    table = Table({"wavelength": WAVE_UM * 1e4, "flux": surface(TEFF_K[2])}, meta={"teff": TEFF_K[2]})
    table["wavelength"].unit, table["flux"].unit = "Angstrom", "Jy"
    table.write(place / "third.ecsv")
    wave = fits.Column("W", "D", unit="um", array=WAVE_UM)
    hdu = fits.BinTableHDU.from_columns([wave, fits.Column("F", "D", unit="Jy", array=surface(TEFF_K[3]))])
    hdu.header["TEFF"] = TEFF_K[3]
    hdu.writeto(place / "fourth.fits")
    return place


def test_text_ecsv_and_fits_are_read_coolest_first(folder):
    found = read_spectra(str(folder))
    assert [one.teff_k for one in found] == list(TEFF_K)
    assert all(np.allclose(one.flux_jy, surface(one.teff_k), rtol=1e-6) for one in found)


# A black body's flux is known: between the spectra too, ln F minus Planck is zero and interpolated as such.
def test_planck_spectra_give_planck_band_fluxes(folder):
    chosen = [bands()[name] for name in ("Gaia_G", "J", "W1", "W3")]
    made = grid_photosphere("grid", read_spectra(str(folder)), chosen)
    planck = templates.photosphere_of("planck", chosen, "")
    for column in range(len(chosen)):
        expected = np.interp(np.log(made.teff_k), np.log(planck.teff_k), planck.ln_flux[:, column])
        assert np.allclose(made.ln_flux[:, column], expected, atol=2e-3)


def test_a_band_that_the_spectra_do_not_reach_is_said_to_be_silent(folder):
    made = grid_photosphere("grid", read_spectra(str(folder)), [bands()["PACS100"], bands()["J"]])
    assert np.isnan(made.ln_flux[:, 0]).all() and np.isfinite(made.ln_flux[:, 1]).all()


def test_the_grid_travels_in_the_queue_by_its_content(folder, queue, tmp_path, monkeypatch):
    monkeypatch.setenv("PLAINLIGHT_CACHE", str(tmp_path / "cache"))
    assert "photosphere is now grid:" in setting.write(queue, "photosphere", f"grid {folder}", "heron")
    for path in folder.iterdir():
        path.unlink()
    with Session.open(queue) as session:
        basis = read_basis(session.connection)
    found = basis.templates()
    assert found.photosphere == basis.settings.photosphere != "dwarfs" and "PACS100" in found.silent
    assert basis.templates_digest() != templates.templates_digest(Settings())


@pytest.mark.parametrize(
    ("spoil", "words"),
    [
        (lambda place: write_text(place, 5000, head="# flux: Jy\n"), "wavelength"),
        (lambda place: write_text(place, 5000, surface(5000) * 1e-10), "surface"),
        (lambda place: write_text(place, 5000, head="# wavelength: um\n# flux: m\n"), "no flux density"),
        (lambda place: write_text(place, 5000, name="sun.dat"), "no temperature"),
        (lambda place: write_text(place, 5200, name="again_05200.dat"), "5200 K too"),
        (lambda place: write_text(place, 12000), "gap between 7000 and 12000"),
        (lambda place: (place / "x_05000.fits").write_bytes(b"no fits"), "cannot be read"),
    ],
)
def test_what_cannot_be_used_is_refused_by_name(folder, queue, spoil, words):
    spoil(folder)
    with pytest.raises(TableError, match=words), Session.open(queue) as session:
        keep_grid(session.connection, str(folder))


def test_no_folder_or_too_few_spectra_are_refused(tmp_path):
    with pytest.raises(TableError, match="no such folder"):
        read_spectra(str(tmp_path / "none"))
    write_text(tmp_path, 5000)
    with pytest.raises(TableError, match="needs 3"):
        read_spectra(str(tmp_path))


def test_a_spectrum_is_what_it_says(folder):
    one = read_spectra(str(folder))[0]
    assert isinstance(one, SurfaceSpectrum) and one.wave_um.shape == one.flux_jy.shape == WAVE_UM.shape
