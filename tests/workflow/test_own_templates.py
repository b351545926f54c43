"""Spectra of natural sources that a queue adds to the mixture bound: what only they make is refused without them."""

from __future__ import annotations

from contextlib import closing

import numpy as np
import pytest

from tui.errors import SettingError, TableError
from tui.model import Candidate, Measurement, Settings
from tui.store.candidates import save_candidates
from tui.store.connect import open_queue
from tui.store.records import LoadRecord
from tui.store.settings import read_settings
from tui.workflow import setting, templates
from tui.workflow.assessing import evidence_for, recipes_for
from tui.workflow.basis import read_basis

WAVE_UM = np.unique(np.concatenate([np.geomspace(0.25, 6.0, 800), np.linspace(0.65, 0.663, 200)]))
BANDS = ("SDSS_u", "SDSS_g", "SDSS_r", "SDSS_i", "SDSS_z", "J", "H", "Ks", "W1", "W2")
UTC = "2026-01-02T00:00:00.000000Z"


def nebula(wave_um):
    """A faint flat continuum and one strong line, H-alpha, in Jy at some scale."""
    return 1e-3 + 2.0 * np.exp(-0.5 * ((wave_um - 0.6563) / 0.0008) ** 2)


def seen(band):
    """Mean of the nebula's flux in a band, photon-weighted, by the trapezoid on a fine grid."""
    wave = np.linspace(band.wave_um[0], band.wave_um[-1], 40_001)
    weight = np.interp(wave, band.wave_um, band.response) / wave
    return np.trapezoid(weight * nebula(wave), wave) / np.trapezoid(weight, wave)


def write_text(folder, name, flux, head="# wavelength: um\n# flux: mJy\n"):
    folder.mkdir(exist_ok=True)
    rows = "".join(f"{wave:.8g} {one:.8g}\n" for wave, one in zip(WAVE_UM, flux, strict=True))
    (folder / name).write_text(head + rows)
    return folder


@pytest.fixture
def folder(tmp_path):
    return write_text(tmp_path / "lines", "nebula.dat", nebula(WAVE_UM))


@pytest.fixture
def shining(queue, tmp_path, monkeypatch):
    """A queue with a candidate that shines in one line: far too bright in r for anything thermal."""
    monkeypatch.setenv("PLAINLIGHT_CACHE", str(tmp_path / "cache"))
    templates._memory.clear()
    grids = templates.build(Settings(), {}).take(BANDS)
    flux = {band.name: 1e-3 * seen(band) for band in grids.bands}
    rows = tuple(Measurement(band, one, 0.02 * one, source="test") for band, one in flux.items())
    with closing(open_queue(queue)) as connection:
        save_candidates(connection, [LoadRecord(Candidate("line", rows, {}), "test")], UTC)
    return queue


def mixture_of(path):
    with closing(open_queue(path)) as connection:
        return evidence_for(connection, "line", ("mixture",), read_basis(connection))["mixture"]


def test_a_source_of_lines_is_refused_without_its_template_and_allowed_with_it(shining, folder):
    before = mixture_of(shining)
    assert before.adequate is False and "templates" not in before.facts
    assert setting.write(shining, "templates", str(folder), None).startswith("templates is now templates:")
    after = mixture_of(shining)
    assert after.adequate is True and after.facts["templates"] == ["nebula"]
    assert "and the template nebula is not refused" in after.facts["sentence"]
    assert after.facts["parts"][0]["family"] == "template nebula"
    assert setting.write(shining, "templates", "default", None).startswith("templates is now the default")
    again = mixture_of(shining)
    assert again.adequate is False and again.digest == before.digest != after.digest


def test_templates_travel_in_the_queue_and_touch_the_bound_alone(shining, folder):
    def digests():
        with closing(open_queue(shining)) as connection:
            basis = read_basis(connection)
        return {kind: one.digest_of("x") for kind, one in recipes_for(("star", "dust", "mixture"), basis).items()}

    before = digests()
    setting.write(shining, "templates", str(folder), "heron")
    for path in folder.iterdir():
        path.unlink()
    templates._memory.clear()
    assert mixture_of(shining).adequate is True
    after = digests()
    assert after["mixture"] != before["mixture"]
    assert {kind: after[kind] for kind in ("star", "dust")} == {kind: before[kind] for kind in ("star", "dust")}


def test_a_template_does_not_save_what_it_is_not(shining, tmp_path):
    flat = write_text(tmp_path / "flat", "flat.dat", np.ones(WAVE_UM.size))
    short = np.where(WAVE_UM < 1.0, 1.0, 0.0)
    write_text(flat, "short.dat", short)
    setting.write(shining, "templates", str(flat), None)
    found = mixture_of(shining)
    assert found.adequate is False and found.facts["templates"] == ["flat", "short"]
    assert "and the templates flat and short" in found.facts["sentence"]
    assert "A template counts as dark where its spectrum does not reach: short in J, H, Ks, W1 and W2." in found.cautions


HOLE = np.where((WAVE_UM > 1.0) & (WAVE_UM < 2.0), np.nan, 1.0)


@pytest.mark.parametrize(
    ("spoil", "words"),
    [
        (lambda place: write_text(place, "b.dat", nebula(WAVE_UM), "# flux: Jy\n"), "wavelength: UNIT"),
        (lambda place: write_text(place, "b.dat", nebula(WAVE_UM), "# wavelength: um\n# flux: K\n"), "no flux density"),
        (lambda place: write_text(place, "b.dat", nebula(WAVE_UM), "# wavelength: s\n# flux: Jy\n"), "no wavelength"),
        (lambda place: write_text(place, "b.dat", HOLE), "no flux, or a negative one"),
        (lambda place: write_text(place, "b.dat", -nebula(WAVE_UM)), "negative one"),
        (lambda place: write_text(place, "b.dat", 0 * WAVE_UM), "no light"),
        (lambda place: write_text(place, "nebula.txt", nebula(WAVE_UM)), "two spectra are named nebula"),
        (lambda place: (place / "b.fits").write_bytes(b"no fits"), "cannot be read"),
        (lambda place: [path.unlink() for path in place.iterdir()], "there is no spectrum in it"),
    ],
)
def test_what_cannot_be_used_is_refused_by_name(folder, queue, spoil, words):
    spoil(folder)
    with pytest.raises(TableError, match=words):
        setting.write(queue, "templates", str(folder), None)
    with closing(open_queue(queue)) as connection:
        assert read_settings(connection).templates == ""


def test_a_gap_is_refused(queue, tmp_path):
    place = tmp_path / "gap"
    place.mkdir()
    wave = WAVE_UM[(WAVE_UM < 1.0) | (WAVE_UM > 2.0)]
    (place / "a.dat").write_text("# wavelength: um\n# flux: Jy\n" + "".join(f"{one:.8g} 1\n" for one in wave))
    with pytest.raises(TableError, match="gap between 0.99"):
        setting.write(queue, "templates", str(place), None)


def test_no_such_folder_and_spectra_that_the_queue_lacks_are_refused(shining):
    with pytest.raises(TableError, match="no such folder"):
        setting.write(shining, "templates", "/nowhere/at/all", None)
    setting.write(shining, "templates", "templates:0123456789abcdef lost", None)
    with pytest.raises(SettingError, match="does not hold"):
        mixture_of(shining)
