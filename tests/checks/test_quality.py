"""Saturation, depth, apertures, W4 and Gaia's numbers as reasons to doubt a band."""

from __future__ import annotations

import math

import numpy as np
import pytest

from tui.checks.apertures import aperture_differences
from tui.checks.brightness import brightness_doubts
from tui.checks.colours import w4_red_excess, w4_sentence
from tui.checks.doubts import Doubt, sentences, suspect_bands
from tui.checks.gaia_quality import gaia_doubts, gaia_facts, gaia_numbers
from tui.checks.quality import candidate_quality
from tui.data.load import bands
from tui.model import Candidate, Measurement
from tui.physics.gaia import expected_excess, quiet_scatter

BANDS = bands()


def at_mag(band, mag, error=0.02, **more):
    flux = BANDS[band].zero_point_jy * 10 ** (-0.4 * mag)
    return Measurement(band, flux, error * flux, **more)


@pytest.mark.parametrize(
    ("band", "mag", "kind", "is_suspicion"),
    [
        ("W1", 7.0, "saturation", True),  # AllWISE saturates at W1 8.1
        ("W1", 8.3, "saturation", False),  # near it
        ("W2", 6.0, "saturation", True),
        ("J", 4.0, "saturation", True),
        ("W4", 8.6, "depth", False),  # beyond the 5 sigma depth of 7.9
        ("Gaia_BP", 20.6, "depth", True),  # Riello et al. 2021: BP of faint red sources is too bright
    ],
)
def test_brightness(band, mag, kind, is_suspicion):
    (doubt,) = brightness_doubts(Candidate("one", (at_mag(band, mag),)), BANDS)
    assert (doubt.kind, doubt.is_suspicion) == (kind, is_suspicion)


def test_ordinary_brightness_and_limits_say_nothing():
    ordinary = (at_mag("W1", 10.0), at_mag("Gaia_G", 12.0), at_mag("W4", 9.5, limit=True), Measurement("B", -1.0, 1.0))
    assert brightness_doubts(Candidate("one", ordinary), BANDS) == []


@pytest.mark.parametrize("more", [{"error": 0.7}, {"flags": {"ph_qual": "U"}}], ids=["1.4 sigma", "U"])
def test_depth_says_nothing_of_what_was_not_detected(more):
    assert brightness_doubts(Candidate("one", (at_mag("W4", 12.2, **more),)), BANDS) == []


def test_what_says_that_all_is_well_is_only_counted(tables):
    columns = {"w3mag": "9.42", "w3sigm": "0.05"}
    found = candidate_quality(Candidate("one", (at_mag("W3", 9.42, flags=columns),)), BANDS, tables, {}, {})
    assert found.as_facts()["doubts"] == [] and found.as_facts()["doubts_fine"] == 1


def test_bright_gaia_names_the_correction():
    (doubt,) = brightness_doubts(Candidate("one", (at_mag("Gaia_G", 4.0),)), BANDS)
    assert "-0.0" in doubt.text or "+0.0" in doubt.text
    assert not doubt.is_suspicion


def test_apertures():
    columns = {"w3mag": "9.40", "w3sigm": "0.05"}
    (wide,) = aperture_differences(Candidate("one", (at_mag("W3", 10.0, flags=columns),)), BANDS)
    assert wide.difference_mag == pytest.approx(-0.6)
    assert wide.as_doubt().is_suspicion and "beside the star" in wide.as_doubt().text
    (same,) = aperture_differences(Candidate("one", (at_mag("W3", 9.42, flags=columns),)), BANDS)
    assert not same.as_doubt().is_suspicion
    twomass = {"j_m_stdap": "10.3", "j_msig_stdap": "0.02"}
    (other,) = aperture_differences(Candidate("one", (at_mag("J", 10.0, flags=twomass),)), BANDS)
    assert other.difference_mag == pytest.approx(0.3) and other.is_odd
    assert aperture_differences(Candidate("one", (at_mag("J", 10.0),)), BANDS) == []


def test_w4_of_red_sources():
    # Brown, Jarrett & Cluver 2014: effective wavelength 22.8 micron; F_nu ~ wavelength^2 reads (22.8/22.194)^2 high
    flat = {"W3": 1.0, "W4": 1.0}
    steep = {"W3": 1.0, "W4": (22.194 / 12.073) ** 2}
    star = {"W3": 1.0, "W4": 0.3}
    assert w4_red_excess(steep) == pytest.approx((22.8 / 22.194) ** 2 - 1)
    assert w4_red_excess(flat) == w4_red_excess(star) == w4_red_excess({"W4": 1.0}) == 0.0
    assert "22.8 micron" in w4_sentence(w4_red_excess(steep))[0] and w4_sentence(0.0) == ()


def gaia_candidate(tables, factor=1.0, scatter=1.0):
    colour, g = 0.82, 14.0
    facts = {
        "phot_bp_rp_excess_factor": factor * float(expected_excess(np.array([colour]), tables.excess)[0]),
        "bp_rp": colour, "phot_g_mean_mag": g, "phot_g_n_obs": 400,
        "phot_g_mean_flux_over_error": 20.0 / (scatter * float(quiet_scatter(np.array([g]), tables.quiet)[0])),
    }  # fmt: skip
    return Candidate("one", tuple(at_mag(band, g) for band in ("Gaia_G", "Gaia_BP", "Gaia_RP")), facts)


def doubts_of(candidate, tables):
    facts = gaia_facts(gaia_numbers([candidate], BANDS, tables.excess, tables.quiet), 0)
    return facts, gaia_doubts(facts, [m.band for m in candidate.measurements])


def test_gaia_of_an_ordinary_star(tables):
    facts, doubts = doubts_of(gaia_candidate(tables), tables)
    assert facts["c_star"] == pytest.approx(0.0, abs=1e-5)
    assert facts["gaia_scatter_ratio"] == pytest.approx(1.0, abs=1e-4)
    assert doubts == []


def test_gaia_blend_raises_bp_and_rp(tables):
    facts, doubts = doubts_of(gaia_candidate(tables, factor=1.3), tables)
    assert facts["c_star_significance"] > 5  # sigma at G 14 is about 0.011, the excess 0.36
    assert suspect_bands(doubts) == {"Gaia_BP", "Gaia_RP"}


def test_gaia_variable_raises_all_three(tables):
    facts, doubts = doubts_of(gaia_candidate(tables, scatter=15.0), tables)
    assert facts["gaia_scatter_ratio"] == pytest.approx(15.0, rel=1e-3)
    assert suspect_bands(doubts) == {"Gaia_G", "Gaia_BP", "Gaia_RP"}


def test_no_gaia_columns_no_facts(tables):
    facts, doubts = doubts_of(Candidate("one", (at_mag("J", 10.0),)), tables)
    assert facts == {} and doubts == []
    assert math.isnan(gaia_numbers([Candidate("one")], BANDS, tables.excess, tables.quiet)["c_star"][0])


def test_sentences_gather_bands():
    halo = [Doubt(band, "flag", "halo", "suspicion") for band in ("W1", "W2")]
    assert sentences([*halo, Doubt("W3", "flag", "fine")]) == ("W1, W2: halo.",)
