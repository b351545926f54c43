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
from tui.workflow.grid_photosphere import keep_grid, kept_spectra
from tui.workflow.grid_spectra import read_spectra
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


def test_text_ecsv_and_fits_are_read(folder):
    found = [one.spectrum for one in read_spectra(str(folder))]
    assert sorted(one.teff_k for one in found) == list(TEFF_K)
    assert all(np.allclose(one.flux_jy, surface(one.teff_k), rtol=1e-6) for one in found)


def test_flux_per_wavelength_in_an_image_and_a_stated_scale_give_the_same(tmp_path):
    wave_um = np.linspace(0.2, 20.0, 4000)
    per_um = np.pi * planck_jy(wave_um, 5772.0) * 1e-26 * 2.99792458e14 / wave_um**2  # F_lambda, W m-2 um-1
    hdu = fits.PrimaryHDU(per_um / 1e6)
    hdu.header.update(CRVAL1=0.2, CDELT1=wave_um[1] - wave_um[0], CUNIT1="um", BUNIT="W m-2 um-1", TEFF=5772, SCALE=1e6)
    hdu.writeto(tmp_path / "image.fits")
    found = read_spectra(str(tmp_path))[0].spectrum
    assert np.allclose(found.flux_jy, np.pi * planck_jy(found.wave_um, 5772.0), rtol=1e-9)


# A black body's flux is known: a grid of them has Planck's fluxes, between its temperatures too.
def test_planck_spectra_give_planck_band_fluxes(folder, queue):
    chosen = [bands()[name] for name in ("Gaia_G", "J", "W1", "W3")]
    setting.write(queue, "photosphere", f"grid {folder}", None)
    with Session.open(queue) as session:
        made = templates.photosphere_of(read_basis(session.connection).settings.photosphere, chosen, queue)
    planck = templates.photosphere_of("planck", chosen, "")
    for column in range(len(chosen)):
        expected = np.interp(np.log(made.teff_k), np.log(planck.teff_k), planck.ln_flux[:, column])
        assert np.allclose(made.ln_flux[:, column], expected, atol=1e-3)  # the quadrature of lines is coarser


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
        (lambda place: write_text(place, 5000, surface(5000) * np.where(WAVE_UM > 1.2, -1, 1)), "negative one, at 1.2"),
        (lambda place: write_text(place, 5000, name="t05000.fits"), "cannot be read"),
        (lambda place: write_text(place, 12000), "gap between 7000 and 12000"),
        (lambda place: (place / "x_05000.fits").write_bytes(b"no fits"), "cannot be read"),
    ],
)
def test_what_cannot_be_used_is_refused_by_name(folder, queue, spoil, words):
    spoil(folder)
    with pytest.raises(TableError, match=words), Session.open(queue) as session:
        keep_grid(session.connection, str(folder))


def test_no_folder_or_too_few_spectra_are_refused(tmp_path, queue):
    with pytest.raises(TableError, match="no such folder"):
        read_spectra(str(tmp_path / "none"))
    write_text(tmp_path, 5000)
    with pytest.raises(TableError, match="needs 4"), Session.open(queue) as session:
        keep_grid(session.connection, str(tmp_path))


def test_wavelengths_left_out_in_between_are_refused(tmp_path):
    path = write_text(tmp_path, 5000)
    lines = path.read_text().splitlines()
    path.write_text("\n".join(line for line in lines if line[0] == "#" or not 1.35 < float(line.split()[0]) < 1.45))
    with pytest.raises(TableError, match=r"gap between 1\.3\d+ and 1\.4\d+ micron"):
        read_spectra(str(tmp_path))


def test_the_value_names_the_choice_and_what_it_was_made_of(tmp_path, queue):
    place = tmp_path / "models"
    place.mkdir()
    for teff_k in TEFF_K:
        for logg, brighter in ((4.0, 1.1), (4.5, 1.0)):
            write_text(place, teff_k, brighter * surface(teff_k), name=f"t{teff_k:05.0f}_g{logg}_m0.0.dat")
    with Session.open(queue) as session:
        usual = keep_grid(session.connection, str(place))
        giant = keep_grid(session.connection, f"{place} logg=4")
        with pytest.raises(TableError, match="no spectrum has logg 3; there are 4, 4.5"):
            keep_grid(session.connection, f"{place} logg=3")
        brighter = kept_spectra(session.connection, giant)[0].flux_jy / kept_spectra(session.connection, usual)[0].flux_jy
    assert usual.endswith(" models (4500-7000 K, log g 4.5, [M/H] 0)") and "log g 4, " in giant
    assert np.allclose(brighter, 1.1) and usual.split()[0] != giant.split()[0]
