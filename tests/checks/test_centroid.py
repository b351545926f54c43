"""Where a second source would have to lie that pulls a centroid, against pictures with two sources in them."""

from __future__ import annotations

import numpy as np
import pytest

from tui.checks.centroid import centroid_shifts, shift_sentences
from tui.checks.match import catalogue_matches
from tui.checks.surroundings import surroundings
from tui.data.load import bands
from tui.model import Candidate, Measurement, Settings, canonical_json

STAR_JY = 0.010


def seen(east, north, second_jy, *, sigma=0.05, error=0.01):
    """A candidate whose AllWISE position is off by so much, with `second_jy` of its W1 and W2 not its own."""
    facts = {"ra": 50.0, "dec": 30.0, "pmra": 0.0, "pmdec": 0.0, "pmra_error": 0.0, "pmdec_error": 0.0}
    facts |= {"wise_ra": 50.0 + east / 3600 / np.cos(np.radians(30.0)), "wise_dec": 30.0 + north / 3600}
    facts["wise_position_error"] = sigma
    fluxes = {band: STAR_JY + second_jy for band in ("W1", "W2")}
    return Candidate("one", tuple(Measurement(b, f, error * f) for b, f in fluxes.items()), facts)


def shifts(candidate, second_jy, pull=20.0):
    left = {band: second_jy for band in ("W1", "W2")}
    matches = catalogue_matches(candidate)
    return centroid_shifts(candidate, matches, left, dict.fromkeys(left, pull), bands())


def centroid(second_jy, apart, fwhm, rng):
    """First moments of a picture with two sources as wide as the beam, with noise; arcsec east and north."""
    y, x = np.mgrid[-16:16:0.5, -16:16:0.5]

    def source(flux, east):
        return flux * np.exp(-4 * np.log(2) * ((x - east) ** 2 + y**2) / fwhm**2)

    picture = source(STAR_JY, 0.0) + source(second_jy, apart) + 1e-6 * rng.standard_normal(x.shape)
    return float((picture * x).sum() / picture.sum()), float((picture * y).sum() / picture.sum())


@pytest.mark.parametrize(("second_jy", "apart"), [(0.004, 2.5), (0.002, 4.0), (0.010, 1.2)])
def test_the_second_source_is_put_where_the_picture_has_it(second_jy, apart):
    east, north = centroid(second_jy, apart, 6.1, np.random.default_rng(5))
    (shift,) = shifts(seen(east, north, second_jy), second_jy)
    assert shift.share == pytest.approx(second_jy / (STAR_JY + second_jy))
    assert shift.source_arcsec == pytest.approx(apart, rel=0.02) and shift.is_pulled
    assert shift.within_arcsec > apart
    (text,) = shift_sentences([shift])
    assert f"{apart:.1f} arcsec away" in text and "W1, W2" in text


def test_a_centred_excess_is_called_off_no_oftener_than_p_says():
    rng, alarms = np.random.default_rng(8), 0
    for east, north in 0.05 * rng.standard_normal((2000, 2)):
        (shift,) = shifts(seen(east, north, 0.005), 0.005)
        alarms += shift.is_pulled
    assert abs(alarms / 2000 - 0.01) < 4 * np.sqrt(0.01 * 0.99 / 2000)  # p < 0.01 of right positions


@pytest.mark.parametrize("apart", [0.0, 0.4, 1.5])
def test_the_bound_holds_the_source_in_at_least_97_7_of_100_draws(apart):
    """One side of a Gaussian at 2 sigma: the bound is missed where the noise takes 2 sigma or more off the shift."""
    rng = np.random.default_rng(9)
    drawn = 0.05 * rng.standard_normal((2000, 2)) + [apart / 3, 0.0]
    held = [shifts(seen(east, north, 0.005), 0.005)[0].within_arcsec >= apart for east, north in drawn]
    assert np.mean(held) > 0.9772 - 4 * np.sqrt(0.9772 * 0.0228 / 2000)


def test_what_lies_beyond_the_beam_is_a_wrong_match_and_no_blend():
    (shift,) = shifts(seen(3.0, 0.0, 0.004), 0.004)  # 3 arcsec over 29 %: 10.5 arcsec, and the beam is 6.1
    assert not shift.is_pulled and shift_sentences([shift]) == ()


@pytest.mark.parametrize(("second_jy", "pull"), [(0.005, 1.0), (-0.002, -9.0), (0.0001, 5.0)])
def test_without_an_excess_there_is_nothing_to_place(second_jy, pull):
    assert shifts(seen(1.0, 0.0, second_jy), second_jy, pull) == []


def test_a_catalogue_without_measurements_is_left_out():
    facts = {"ra": 1.0, "dec": 1.0, "twomass_ra": 1.0, "twomass_dec": 1.0}
    candidate = Candidate("one", (Measurement("W1", 1.0, 0.01),), facts)
    found = centroid_shifts(candidate, catalogue_matches(candidate), {"W1": 0.5}, {"W1": 9.0}, bands())
    assert found == []


def test_it_is_part_of_what_blend_tells(tables):
    candidate = seen(0.8, 0.0, 0.005)
    left = {"W1": 0.005, "W2": 0.005}
    around = surroundings(candidate, left, {"W1": 20.0, "W2": 20.0}, bands(), tables, Settings())
    assert any("the centroid is 0.80" in text and "2.4 arcsec away" in text for text in around.cautions)
    assert around.facts["centroid_shifts"][0]["share"] == pytest.approx(1 / 3)
    assert canonical_json(around.facts)
