"""Signs of a second star, and blend's context as one piece."""

from __future__ import annotations

import pytest

from tui.checks.multiplicity import multiplicity
from tui.checks.surroundings import surroundings
from tui.data.load import bands
from tui.model import Candidate, Measurement, Neighbour, Settings, canonical_json

SINGLE = {"ruwe": 1.02, "ipd_frac_multi_peak": 0, "non_single_star": 0, "ipd_gof_harmonic_amplitude": 0.02}


def test_a_single_star_raises_nothing():
    facts, cautions = multiplicity(Candidate("one", (), SINGLE), Settings())
    assert cautions == () and facts["ruwe"] == 1.02 and facts["non_single_star"] == 0
    assert multiplicity(Candidate("one"), Settings()) == ({}, ())


@pytest.mark.parametrize(
    ("change", "word"),
    [
        ({"ruwe": 1.5}, "RUWE 1.50"),
        ({"ipd_frac_multi_peak": 39}, "39 %"),  # HD 159176, an O + O binary, has 39
        ({"non_single_star": 3}, "astrometric, spectroscopic"),
        ({"ipd_gof_harmonic_amplitude": 0.3}, "scan direction"),
        ({"phot_bp_n_obs": 40, "phot_bp_n_blended_transits": 20}, "50 %"),
    ],
)
def test_each_sign_is_told(change, word):
    _, cautions = multiplicity(Candidate("one", (), {**SINGLE, **change}), Settings())
    assert len(cautions) == 1 and word in cautions[0]


def test_ruwe_limit_is_a_setting():
    star = Candidate("one", (), {"ruwe": 1.3})
    assert multiplicity(star, Settings())[1] == ()
    assert multiplicity(star, Settings(ruwe_max=1.25))[1] != ()


def test_excess_noise_speaks_where_ruwe_is_missing():
    noisy = {"astrometric_excess_noise": 0.8, "astrometric_excess_noise_sig": 30.0}
    assert "0.80 mas" in multiplicity(Candidate("one", (), noisy), Settings())[1][0]
    assert multiplicity(Candidate("one", (), {**noisy, "ruwe": 1.0}), Settings())[1] == ()


def test_one_piece(tables):
    facts = {"ra": 10.0, "dec": 60.0, "pmra": 0.0, "pmdec": 0.0, "ruwe": 2.0}
    facts |= {"wise_ra": 10.0, "wise_dec": 60.0 + 1.0 / 3600}
    star = Candidate("one", (Measurement("W3", 0.02, 0.001),), facts, (Neighbour(2.0, fluxes_jy={"W3": 0.01}),))
    around = surroundings(star, {"W3": 0.012}, {"W3": 9.0}, bands(), tables, Settings(n_searched=100000))
    assert around.facts["neighbours_in_beam"] == 1 and around.facts["nearest_source"] == 2.0
    assert around.facts["match_catalogue"] == "AllWISE" and around.facts["match_p"] < 1e-6
    assert 0 < around.facts["chance_alignment"] < 1
    text = " ".join(around.cautions)
    for word in ("leaking from neighbours", "AllWISE", "RUWE", "stars searched"):
        assert word in text
    assert canonical_json(around.facts)


def test_a_source_in_the_beam_without_a_flux(tables):
    star = Candidate("one", (Measurement("W4", 0.02, 0.001),), {"twomass_prox": 8.0})
    around = surroundings(star, {"W4": 0.012}, {"W4": 9.0, "J": 0.1}, bands(), tables, Settings())
    assert any("8.0 arcsec away, inside the beam of W4" in text for text in around.cautions)


def test_an_empty_candidate(tables):
    around = surroundings(Candidate("one"), {}, {}, bands(), tables, Settings())
    assert around.cautions == () and "chance_alignment" not in around.facts
