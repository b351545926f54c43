"""Chance alignment against sources thrown at random, and galactic positions against astropy."""

from __future__ import annotations

import numpy as np
import pytest
from astropy import units
from astropy.coordinates import SkyCoord

from tui.checks.chance import chance_of, chance_sentences, excess_band, galactic
from tui.data.load import bands
from tui.model import Candidate
from tui.physics.context import leak_fraction

BANDS = bands()
W3 = BANDS["W3"]
EXCESS = W3.zero_point_jy * 10 ** (-0.4 * 9.0)  # W3 excess of 9.0 mag


def chance(facts, tables, band="W3", excess=EXCESS):
    return chance_of(Candidate("one", (), facts), {band: excess}, {band: 8.0}, BANDS, tables.galaxies)


def test_against_sources_thrown_at_random(tables):
    # Sources with N(> F) ~ F^-1.5 on 4000 fields; a field is hit where one of them leaks the whole excess into the fit.
    density = 2e-3  # per square arcsec, as bright as the excess or brighter
    facts = {"density_galaxy": density, "density_galaxy_mag": 9.0, "density_galaxy_band": "W3"}
    p = chance(facts, tables).p_galaxy
    rng, side, least, hits = np.random.default_rng(41), 60.0, 1.0, 0
    for count in rng.poisson(density * side**2, size=4000):
        flux = least * rng.random(count) ** (-1 / 1.5)
        separation = np.hypot(*rng.uniform(-side / 2, side / 2, size=(2, count)))
        hits += bool(np.any(flux * leak_fraction(separation, W3.beam_fwhm_arcsec) >= least))
    assert abs(hits - 4000 * p) < 3.5 * np.sqrt(4000 * p * (1 - p))


def test_stars_and_galaxies_apart(tables):
    found = chance({"ra": 192.86, "dec": 27.13}, tables)  # galactic pole
    assert found.mag == pytest.approx(9.0)
    assert 0 < found.p_star < found.p_galaxy  # at 12 micron and high latitude galaxies outnumber stars at W3 = 9
    assert found.p == pytest.approx(1 - (1 - found.p_star) * (1 - found.p_galaxy))
    assert "Bahcall" in found.star_source and "W3" in found.galaxy_source
    low = chance({"ra": 266.4, "dec": -10.0}, tables)
    assert low.p_star > 3 * found.p_star


def test_brighter_excess_is_rarer(tables):
    pole = {"ra": 192.86, "dec": 27.13}
    assert chance(pole, tables, excess=10 * EXCESS).p < 0.1 * chance(pole, tables).p


def test_own_count_is_preferred_and_scaled(tables):
    facts = {"density_star": 1e-4, "density_star_mag": 8.0, "density_star_band": "W3", "density_star_slope": 0.3}
    found = chance(facts, tables)
    expected = np.pi * (W3.beam_fwhm_arcsec**2 / (3 * np.log(2))) * 1e-4 * 10**0.3
    assert found.p_star == pytest.approx(1 - np.exp(-expected))
    other = chance({**facts, "density_star_band": "J"}, tables)
    assert np.isnan(other.p_star) and "unknown" in other.star_source


def test_unknown_counts_stay_unknown(tables):
    found = chance({}, tables, band="GALEX_NUV", excess=1e-5)
    assert np.isnan(found.p_star) and np.isnan(found.p_galaxy) and np.isnan(found.p)
    assert not any("stars searched" in text for text in chance_sentences(found, 1000))


def test_a_faint_excess_in_a_large_beam(tables):
    (text,) = chance_sentences(chance({}, tables), None)  # W3 9.0 of a depth of 11.2, beam 6.5 arcsec
    assert "confusion is common" in text
    assert chance_sentences(chance({}, tables, excess=100 * EXCESS), None) == ()
    assert chance_sentences(None, 10) == ()


def test_no_excess_no_chance(tables):
    assert excess_band({"W3": 1.0, "W4": 2.0}, {"W3": 2.9, "W4": 2.5}) == ""
    assert excess_band({"W3": 1.0, "W4": 2.0, "J": -1.0}, {"W3": 5.0, "W4": 4.0, "J": -9.0}) == "W3"
    assert chance_of(Candidate("one"), {"W3": 1.0}, {"W3": 1.0}, BANDS, tables.galaxies) is None


def test_a_wide_search_is_told_how_many_it_meets(tables):
    found = chance({"ra": 192.86, "dec": 27.13}, tables)
    assert any("stars searched" in text for text in chance_sentences(found, 1_000_000))
    assert any("searched about one meets such" in text for text in chance_sentences(found, round(1.1 / found.p)))
    assert not any("stars searched" in text for text in chance_sentences(found, None))


@pytest.mark.parametrize(("ra", "dec"), [(10.0, 60.0), (266.4, -28.9), (192.86, 27.1), (350.0, -80.0)])
def test_galactic_against_astropy(ra, dec):
    there = SkyCoord(ra * units.deg, dec * units.deg).galactic
    lon, lat = galactic(Candidate("one", (), {"ra": ra, "dec": dec}))
    assert lat == pytest.approx(there.b.deg, abs=1e-4)
    assert (lon - there.l.deg + 180) % 360 - 180 == pytest.approx(0.0, abs=1e-4 / np.cos(np.radians(lat)))
    assert galactic(Candidate("one", (), {"glon": 3.0, "glat": 4.0})) == (3.0, 4.0)
