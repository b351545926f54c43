"""A screen of interstellar dust: recovered, bounded by its line of sight, and doubted where laws differ."""

from __future__ import annotations

import numpy as np
import pytest
from astropy.coordinates import SkyCoord

from tests.checks.making import make
from tui.checks import assess
from tui.checks.extinction import av_limit, galactic_latitude
from tui.model import Candidate, Settings
from tui.physics import composite as c


@pytest.fixture(scope="module")
def look(templates, tables):
    return lambda candidate, **settings: assess("extinction", [candidate], templates, Settings(**settings), tables)[0]


@pytest.mark.parametrize(("kelvin", "av"), [(5772.0, 0.9), (4300.0, 2.5), (9500.0, 6.0)])
def test_a_screen_is_recovered(look, templates, kelvin, av):
    found = look(make(templates, c.STAR_AV, kelvin, av=av))
    assert found.adequate is True
    assert found.best.model == "star + A_V"
    param = found.best.params["av"]
    assert param.low <= av <= param.high
    assert found.facts["law"] == "g23" and found.facts["delta_chi2"] > 0


def test_no_screen_is_a_limit(look, templates):
    found = look(make(templates, c.STAR, 5772.0, factors={"Gaia_BP": 1.05}))
    param = found.best.params["av"]
    assert param.value == 0.0 and param.limit and 0.0 < param.high < 2.0
    assert any("star alone fits" in remark for remark in found.cautions)


def test_an_infrared_excess_is_no_screen(look, templates):
    found = look(make(templates, c.STAR, 5772.0, factors={"W3": 4.0, "W4": 9.0}))
    assert found.adequate is False
    assert {"W3", "W4"} & set(found.best.pulls) and found.best.pulls["W4"] > 3


def test_more_than_the_line_of_sight_holds_is_a_caution_only(look, templates):
    found = look(make(templates, c.STAR_AV, 5772.0, av=3.0, facts={"av_max": 0.2}))
    assert found.adequate is True
    assert any("line of sight" in remark and "0.20" in remark for remark in found.cautions)


def test_thick_screens_warn_of_the_laws_and_an_excess_is_tried_on_another(look, templates):
    found = look(make(templates, c.STAR_AV, 5772.0, av=4.0))
    assert any("Wang & Chen" in remark for remark in found.cautions)
    excess = look(make(templates, c.STAR_AV, 7000.0, av=4.0, factors={"W4": 8.0}))
    assert excess.adequate is False
    assert excess.facts["other_law"] == "wc19" and excess.facts["excess_survives_other_law"] is True


def disc_by_sum(distance_kpc, latitude_rad):
    """1.8 mag a kpc times exp(-z/0.1 kpc) (Whittet 2003, a disc of scale height 100 pc), summed along the way."""
    s = np.linspace(0.0, distance_kpc, 20001)
    return 1.8 * np.trapezoid(np.exp(-s * abs(np.sin(latitude_rad)) / 0.1), s)


@pytest.mark.parametrize(("ra", "dec", "parallax"), [(192.86, 27.13, 2.0), (10.0, 60.0, 1.0), (266.4, -28.9, 0.5),
    (83.8, -5.4, 20.0)])
def test_ceiling_of_a_dust_disc(ra, dec, parallax):
    ceiling, cause = av_limit(Candidate("x", facts={"ra": ra, "dec": dec}), parallax)
    latitude = SkyCoord(ra, dec, unit="deg").galactic.b.rad
    # the plane itself is taken as endless
    assert ceiling == pytest.approx(disc_by_sum(1 / parallax, latitude), rel=5e-3)
    assert "1.8 mag" in cause


def test_ceiling_from_the_candidate_or_from_nothing():
    assert av_limit(Candidate("x", facts={"av_max": 0.7, "ra": 1.0, "dec": 2.0}), 5.0)[0] == 0.7
    assert av_limit(Candidate("x"), float("nan"))[0] == float("inf")


def test_galactic_latitude_against_astropy():
    rng = np.random.default_rng(3)
    for ra, dec in zip(rng.uniform(0, 360, 50), np.degrees(np.arcsin(rng.uniform(-1, 1, 50))), strict=True):
        assert galactic_latitude(ra, dec) == pytest.approx(SkyCoord(ra, dec, unit="deg").galactic.b.rad, abs=1e-5)


def test_free_r_v_is_tried_and_recovered(grids, tables):
    names = ("U", "B", "V", "Rc", "Ic", "J", "H", "Ks", "W1", "W2")
    local = grids.take([name for name in grids.names if name in names])
    settings = Settings(r_v="free")
    found = assess("extinction", [make(local, c.STAR_AV_RV, 20000.0, av=3.0, r_v=4.6)], grids, settings, tables)[0]
    assert {fit.model for fit in found.fits} == {"star + A_V", "star + A_V, R_V"}
    free = next(fit for fit in found.fits if "R_V" in fit.model)
    assert free.params["r_v"].value == pytest.approx(4.6, abs=0.5)
    assert free.params["av"].value == pytest.approx(3.0, rel=0.08)
