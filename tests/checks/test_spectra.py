"""A candidate's own spectrum: plain ones stand, band-passes do not, and a good one hides no bad band."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tui.checks import assess_all, probe
from tui.checks.spectra import as_measured, ln_p_of_parts, named, own_settings, parts
from tui.data import load
from tui.model import Candidate, Fit, Measurement, Settings, Spectrum
from tui.physics.grid import SurfaceSpectrum, grid_photosphere
from tui.physics.joining import joined
from tui.physics.photometry import band_flux, quadrature
from tui.physics.photosphere import planck_photosphere
from tui.physics.planck import planck_jy
from tui.physics.spectral import broad_bands, grid_key, is_point, points_of
from tui.physics.templates import Spread, build_photosphere, build_templates

BANDS = ("Gaia_BP", "Gaia_RP", "J", "H", "Ks", "W1", "W2")
WAVE_UM, FINE_UM = np.linspace(0.40, 0.95, 30), np.geomspace(0.2, 40.0, 8000)
TEFF_K = np.exp(np.linspace(np.log(4000), np.log(8000), 70))
SPREAD = [Spread(source, "all", 0, 1e6, 0, 1e4, 0.03) for source in ("planck", "grid", "dwarfs")]
THETA2 = 1e-20


def through(bands, source):
    if source == "planck":
        photosphere = planck_photosphere(TEFF_K, [quadrature(band) for band in bands])
    elif source == "dwarfs":
        photosphere = build_photosphere("dwarfs", load.dwarfs(), bands, load.bands())
    else:
        models = [SurfaceSpectrum(t, FINE_UM, np.pi * planck_jy(FINE_UM, t)) for t in (4000, 4800, 5600, 6600, 8000)]
        photosphere = grid_photosphere("grid:0123456789abcdef mine", models, bands)
    return build_templates(bands, photosphere, "g23", SPREAD, r_v=3.1)


def grids(source):
    base = replace(through([load.bands()[name] for name in BANDS], source), broad=through(broad_bands(), source))
    if source == "dwarfs":
        return base
    spectrum = Spectrum(WAVE_UM, WAVE_UM, WAVE_UM)
    return joined(base, through(points_of(spectrum).bands, source), grid_key(spectrum))


@pytest.fixture(scope="module")
def planck():
    return grids("planck")


@pytest.fixture(scope="module")
def by_source(planck):
    return {"planck": planck, "grid": grids("grid"), "dwarfs": grids("dwarfs")}


def plain(wave_um):
    return np.ones_like(wave_um)


def band_pass(wave_um):
    """Only light within 10 % of 0.6 micron passes whole, half of the rest."""
    return np.where(np.abs(wave_um / 0.6 - 1) < 0.1, 1.0, 0.5)


def candidate(screen=plain, seed=1, scale=1.0, excess=plain, teff_k=5600.0):
    """A black body behind a screen with errors of 2 %, the spectrum at another scale, W2 brighter by `excess`."""
    rng = np.random.default_rng(seed)
    light = THETA2 * np.pi * planck_jy(FINE_UM, teff_k) * screen(FINE_UM)
    measured = []
    for name in BANDS:
        flux = band_flux(FINE_UM, light, load.bands()[name]) * (excess(np.array([1.0]))[0] if name == "W2" else 1.0)
        measured.append(Measurement(name, flux * (1 + 0.03 * rng.normal()), 0.02 * flux))
    seen = scale * np.interp(WAVE_UM, FINE_UM, light)
    spectrum = Spectrum(WAVE_UM, seen * (1 + 0.03 * rng.normal(size=WAVE_UM.size)), 0.02 * seen)
    return Candidate("SM-0001", tuple(measured), {"ra": 10.0, "dec": 5.0}, spectrum=spectrum)


def evidence(one, templates, tables, kinds=("star", "mixture"), **settings):
    return assess_all([one], templates, Settings(photosphere=templates.photosphere, **settings), kinds, tables)[0]


# Physics: a black body is a natural source, half of its light held back outside one band is none.
@pytest.mark.parametrize("source", ["planck", "grid"])
def test_a_band_pass_is_no_star_and_a_black_body_is_one(by_source, tables, source):
    natural, odd = (evidence(candidate(screen), by_source[source], tables)["star"] for screen in (plain, band_pass))
    assert natural.adequate and not natural.facts["spectrum_misfits"]
    assert odd.adequate is False and odd.facts["spectrum_misfits"] and odd.facts["spectrum_p"] < 1e-6


def test_with_a_grid_the_bound_refuses_the_band_pass_and_not_the_plain_star(by_source, tables):
    natural, odd = (evidence(candidate(screen), by_source["grid"], tables)["mixture"] for screen in (plain, band_pass))
    assert natural.adequate is True and natural.facts["points"] == len(BANDS) + WAVE_UM.size
    assert odd.adequate is False and "the spectrum at" in odd.facts["sentence"]


def test_with_planck_the_spectrum_stays_out_of_the_bound(planck, tables):
    found = evidence(candidate(band_pass), planck, tables)
    assert found["mixture"].facts["points"] == len(BANDS)
    assert any("not in the mixture bound" in caution for caution in found["mixture"].cautions)
    assert any("no lines" in caution for caution in found["star"].cautions)


def test_a_grid_of_black_bodies_gives_the_numbers_of_planck(by_source, tables):
    stars = [evidence(candidate(), by_source[source], tables, ("star",))["star"] for source in ("planck", "grid")]
    first, second = (one.best for one in stars)
    assert second.chi2 == pytest.approx(first.chi2, abs=0.2)
    assert second.params["teff"].value == pytest.approx(first.params["teff"].value, rel=1e-3)


def test_the_scale_of_a_spectrum_is_free_by_its_common_error(planck, tables):
    fits = [evidence(candidate(scale=scale), planck, tables, ("star",))["star"].best for scale in (1.0, 1.1, 0.9)]
    true, off, below = fits
    assert off.params["teff"].value == pytest.approx(true.params["teff"].value, rel=2e-3)
    assert off.chi2 + below.chi2 - 2 * true.chi2 == pytest.approx(2.0, abs=0.5)  # 10 % is one sigma of the scale
    assert max(abs(pull) for band, pull in off.pulls.items() if is_point(band)) < 3.5


# Many good points would make any one bad band adequate in the chi-square of all.
def test_a_good_spectrum_hides_no_bad_band(planck, tables):
    found = evidence(candidate(excess=lambda wave: wave * 1.3), planck, tables, ("star",))["star"]
    assert found.best.p > 0.01 and found.adequate is False
    assert found.facts["oddness"] > 2.3 and found.facts["odd_band"] == "W2"


@pytest.mark.parametrize(("screen", "misfits"), [(plain, False), (band_pass, True)])
def test_with_dwarfs_the_broad_shape_alone_is_compared(by_source, tables, screen, misfits):
    one = candidate(screen)
    only = replace(one, measurements=candidate().measurements)  # photometry of the plain star
    found = evidence(only, by_source["dwarfs"], tables, ("star", "dust", "mixture"))
    assert found["star"].facts["spectrum_misfits"] is misfits
    assert found["star"].facts["spectrum_dof"] <= 3 and not any(is_point(band) for band in found["star"].bands)
    assert any("not in the fits" in caution for caution in found["star"].cautions)
    assert any("cannot say whether" in caution for caution in found["dust"].cautions) is misfits
    if misfits:
        assert found["star"].adequate is False


def test_what_the_templates_do_not_hold_stays_out_of_the_fits(planck):
    one = candidate()
    assert len(as_measured(one, planck).measurements) == len(BANDS) + WAVE_UM.size
    other = replace(one, spectrum=replace(one.spectrum, wave_um=WAVE_UM * 1.01))
    assert as_measured(other, planck) is other
    assert own_settings(Settings(), planck).common == {"spectrum": 0.1}
    assert own_settings(Settings(common={"spectrum": 0.3}), planck).common == {"spectrum": 0.3}


def test_a_spectrum_is_dropped_by_its_name(planck):
    one = candidate()
    whole = probe(one, "star", {}, frozenset(), planck, Settings(photosphere="planck"))
    without = probe(one, "star", {}, frozenset({"spectrum"}), planck, Settings(photosphere="planck"))
    assert len(whole.pulls) == len(BANDS) + WAVE_UM.size and tuple(without.pulls) == BANDS


def test_parts_and_names():
    fit = Fit("star", 13.0, 1, 0.5, 0.0, 0.0, {}, {"J": 2.0, "spectrum:0.5": 3.0, "spectrum:0.6": 0.0})
    assert parts(fit) == [(4.0, 1), (9.0, 2)] and ln_p_of_parts(fit) == pytest.approx(-4.5 + np.log(2))  # Q(1, 4.5)
    assert parts(replace(fit, pulls={"J": 2.0})) == [] and named(["J"]) == ["J"]
