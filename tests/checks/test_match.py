"""Position matches at another catalogue's epoch, against simulation and a star that moves fast."""

from __future__ import annotations

import numpy as np
import pytest
from astropy import units
from astropy.coordinates import SkyCoord
from astropy.time import Time

from tui.checks.match import catalogue_matches, match_sentences, nearest_source, worst_match
from tui.model import Candidate, Neighbour

# Barnard's star, Gaia DR3 4472832130942575872: epoch 2016.0
BARNARD = {
    "ra": 269.4485025254384, "dec": 4.739420051112412, "ref_epoch": 2016.0, "pmra": -801.551, "pmdec": 10362.394,
    "ra_error": 0.026, "dec_error": 0.029, "pmra_error": 0.032, "pmdec_error": 0.036,
}  # fmt: skip


def at_epoch(facts, year):
    star = SkyCoord(
        facts["ra"] * units.deg, facts["dec"] * units.deg, pm_ra_cosdec=facts["pmra"] * units.mas / units.yr,
        pm_dec=facts["pmdec"] * units.mas / units.yr, distance=1.83 * units.pc, obstime=Time(2016.0, format="jyear"),
    )  # fmt: skip
    moved = star.apply_space_motion(Time(year, format="jyear"))
    return moved.ra.deg, moved.dec.deg


def test_fast_star_is_met_where_it_was():
    ra, dec = at_epoch(BARNARD, 2000.0)
    facts = {**BARNARD, "twomass_ra": ra, "twomass_dec": dec, "twomass_epoch": 2000.0}
    (match,) = catalogue_matches(Candidate("one", (), facts))
    assert match.moved_arcsec == pytest.approx(166.3, abs=0.1)  # 10.39 arcsec a year for 16 years
    assert match.separation_arcsec < 0.03  # straight-line motion on the sky, good to hundredths over so far a way
    assert match.p > 0.5


def test_without_its_motion_the_same_star_is_a_wrong_match():
    ra, dec = at_epoch(BARNARD, 2000.0)
    facts = {k: v for k, v in BARNARD.items() if not k.startswith("pm")}
    (match,) = catalogue_matches(Candidate("one", (), {**facts, "twomass_ra": ra, "twomass_dec": dec}))
    assert match.p == 0.0
    assert "no proper motion" in match_sentences([match])[0]


def test_p_of_right_matches_is_uniform():
    rng = np.random.default_rng(31)
    p = []
    for _ in range(3000):
        years = 2010.5589 - 2016.0
        pm = rng.normal(scale=30.0, size=2)
        error = np.hypot(0.12, 1e-3 * abs(years) * 2.0)  # AllWISE's own and the drift of a 2 mas/yr error
        east, north = 1e-3 * pm * years + rng.normal(scale=error, size=2)
        facts = {
            "ra": 40.0, "dec": 60.0, "pmra": pm[0], "pmdec": pm[1], "pmra_error": 2.0, "pmdec_error": 2.0,
            "wise_ra": 40.0 + east / 3600 / np.cos(np.radians(60.0)), "wise_dec": 60.0 + north / 3600,
            "wise_position_error": 0.12, "ra_error": 0.0, "dec_error": 0.0,
        }  # fmt: skip
        p.append(catalogue_matches(Candidate("one", (), facts))[0].p)
    for level in (0.01, 0.1, 0.5):
        assert abs(np.mean(np.array(p) < level) - level) < 4 * np.sqrt(level * (1 - level) / 3000)


def test_a_shifted_centroid_is_told():
    facts = {"ra": 10.0, "dec": 0.0, "pmra": 0.0, "pmdec": 0.0, "wise_ra": 10.0 + 1.0 / 3600, "wise_dec": 0.0}
    matches = catalogue_matches(Candidate("one", (), {**facts, "twomass_ra": 10.0, "twomass_dec": 0.0}))
    assert worst_match(matches)["match_catalogue"] == "AllWISE"
    (text,) = match_sentences(matches)
    assert "AllWISE" in text and "another source, or the light of two mixed" in text


def test_second_nearest_source():
    facts = {"ra": 10.0, "dec": 0.0, "twomass_ra": 10.0, "twomass_dec": 0.0, "twomass_prox": 7.5}
    candidate = Candidate("one", (), facts, (Neighbour(9.0), Neighbour(4.2)))
    assert nearest_source(candidate, catalogue_matches(candidate)) == 4.2
    assert np.isnan(nearest_source(Candidate("one"), []))


def test_no_position_no_match():
    assert catalogue_matches(Candidate("one", (), {"wise_ra": 1.0, "wise_dec": 1.0})) == []
    assert worst_match([]) == {}
