"""Natural sources through bands against direct integrals."""

from __future__ import annotations

import numpy as np
import pytest
from astropy import units as u
from astropy.modeling.models import BlackBody, Drude1D
from dust_extinction.parameter_averages import G23

from tui.data import load
from tui.physics.natural_sources import build_generators, drude, emissivity, light_at_nodes, refined, screen_grid
from tui.physics.photometry import Quadrature, band_flux, quadrature

NAMES = ("V", "J", "W1", "W3")


@pytest.fixture(scope="module")
def generators():
    bands = load.bands()
    teff = np.geomspace(3000.0, 10000.0, 9)
    spectrum = (np.array([0.1, 50.0]), np.array([1.0, 1.0]))
    ln_flux = np.log(np.stack([teff / 1e4, teff / 5e3, np.full(9, 2.0), np.full(9, 1.0)], axis=1))
    return build_generators([quadrature(bands[name]) for name in NAMES], teff, ln_flux, user={"flat": spectrum})


def find(generators, **wanted):
    """The column nearest to what is wanted."""
    named = [one for one in generators.layout.families if one.name == wanted["family"]]
    family = next(one for one in named if one.sources.max(initial=0.0) >= wanted.get("temperature", 0.0))
    if wanted["family"] == "planck":
        family = next(one for one in named if one.sources.max() <= 2000.0)  # the colder of the two ranges
    target = np.array([wanted[key] for key in family.keys])
    source = np.argmin(np.sum(np.log(family.sources / target) ** 2, axis=1)) if family.keys else 0
    screen = np.argmin(np.abs(family.screens[:, 0] - wanted["av"]) + np.abs(family.screens[:, 1] - wanted["r_v"]))
    return family.first + source * len(family.screens) + int(screen)


def integral(spectrum, name):
    """Trapezoid through the packaged response on 20 000 points."""
    band = load.bands()[name]
    wave = np.linspace(band.wave_um[0], band.wave_um[-1], 20_001)
    weight = np.interp(wave, band.wave_um, band.response) / wave
    return np.trapezoid(weight * spectrum(wave), wave) / np.trapezoid(weight, wave)


@pytest.mark.parametrize("family", ["planck", "modified", "feature"])
def test_columns_are_band_averages_of_screened_sources(generators, family):
    asked = {"temperature": 700.0, "beta": 1.25, "break_um": 4.0, "centre_um": 9.7, "width": 0.3, "av": 5.0, "r_v": 3.1}
    index = find(generators, family=family, **asked)
    told = generators.describe(index)

    def spectrum(wave):
        flux = BlackBody(told["temperature"] * u.K)(wave * u.um).value
        if family == "modified":
            flux = flux * np.minimum(1, told["break_um"] / wave) ** told["beta"]
        if family == "feature":
            frequency = 299792.458 / wave  # GHz
            centre = 299792.458 / told["centre_um"]
            flux = flux * Drude1D(1.0, centre, told["width"] * centre)(frequency)
        return flux * G23(Rv=told["r_v"]).extinguish(wave * u.um, Av=told["av"]) if told["av"] else flux

    exact = np.array([integral(spectrum, name) for name in NAMES])
    assert generators.column(np.array(index)) == pytest.approx(exact / exact.max(), rel=2e-3, abs=1e-12)


def test_a_photosphere_is_its_template_dimmed_as_its_black_body(generators):
    index = find(generators, family="photosphere", teff=5000.0, av=2.0, r_v=3.1)
    told = generators.describe(index)
    column = generators.column(np.array(index))

    def black(wave):
        return BlackBody(told["teff"] * u.K)(wave * u.um).value

    law = G23(Rv=told["r_v"])

    def dimmed(wave):
        return black(wave) * law.extinguish(wave * u.um, Av=told["av"])

    dim = [integral(dimmed, name) / integral(black, name) for name in NAMES]
    exact = np.array([told["teff"] / 1e4, told["teff"] / 5e3, 2.0, 1.0]) * dim
    assert column == pytest.approx(exact / exact.max(), rel=2e-3)


def test_a_users_template_comes_in_behind_every_screen(generators):
    family = generators.layout.families[-1]
    assert family.name == "template flat" and generators.added == ("flat",)
    assert len(family.screens) == len(generators.layout.families[0].screens)
    assert generators.column(np.array(family.first)) == pytest.approx(np.ones(4), rel=1e-4)


def test_screens_reach_every_av_and_rv():
    screens, level = screen_grid("g23", 16, 2)
    assert screens[0].tolist() == [0.0, 3.1] and screens[:, 0].max() == pytest.approx(40.0)
    assert screens[1:, 1].min() == 2.3 and screens[1:, 1].max() == 5.6 and len(screens) == 1 + 64 * 9
    assert np.sum(level == 4) == 1 + 16 * 3
    assert np.all(screen_grid("wc19", 16, 2)[0][:, 1] == 3.1)


def test_shapes_of_dust():
    wave = np.array([5.0, 10.0, 20.0])
    assert emissivity(wave, np.array([1.0]), np.array([10.0]))[0].tolist() == pytest.approx([1.0, 1.0, 0.5])
    profile = drude(wave, np.array([10.0]), np.array([0.2]))[0]
    assert profile[1] == 1.0 and profile[0] == pytest.approx(profile[2])  # even in ln wavelength
    assert drude(np.array([10.0 / 0.904988]), np.array([10.0]), np.array([0.2]))[0, 0] == pytest.approx(0.5, abs=1e-3)


def test_axes_are_refined_fourfold():
    axis = refined(20.0, 2000.0, 4)
    assert len(axis) == 17 and axis[::4] == pytest.approx(np.geomspace(20, 2000, 5))


@pytest.mark.parametrize("wave_um", [1.20, 1.2345, 1.3])
def test_a_line_between_nodes_is_not_lost(wave_um):
    # photometry.band_flux on a band of as many samples as the spectrum has is the direct integral
    band = load.bands()["J"]
    wave = np.arange(1.0, 1.5, 2e-4)
    flux = 1.0 + 40.0 * np.exp(-0.5 * ((wave - wave_um) / 5e-4) ** 2)
    fine = np.interp(wave, band.wave_um, band.response, left=0.0, right=0.0) / wave
    direct = np.trapezoid(flux * fine, wave) / np.trapezoid(fine, wave)
    assert light_at_nodes(quadrature(band, 120), wave, flux).sum() == pytest.approx(direct, rel=2e-3)
    assert direct > 1.05


def test_a_spectrum_is_dark_outside_its_range_and_read_at_a_lone_node():
    rule = quadrature(load.bands()["W3"], 120)
    wave = np.linspace(0.5, 2.0, 50)
    assert light_at_nodes(rule, wave, np.ones(50)).tolist() == [0.0] * rule.wave_um.size
    lone = Quadrature(np.array([1.5]), np.ones(1))
    assert light_at_nodes(lone, wave, wave).tolist() == pytest.approx([1.5])


def test_light_at_nodes_is_that_of_the_band():
    band = load.bands()["V"]
    wave = np.linspace(0.4, 0.8, 300)
    flux = wave**2
    assert light_at_nodes(quadrature(band, 120), wave, flux).sum() == pytest.approx(band_flux(wave, flux, band), rel=1e-3)
