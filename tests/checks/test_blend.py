"""A second source in the beam: each kind recovered, the parallax as a datum, sizes that make sense."""

from __future__ import annotations

import numpy as np
import pytest

from tests.checks.making import make, sequence_parallax
from tui.checks import assess
from tui.model import Settings
from tui.physics import composite as c

OPTICAL = ("B", "V", "Gaia_BP", "Gaia_G", "Gaia_RP", "SDSS_g", "SDSS_r", "SDSS_i", "SDSS_z")
INFRARED = ("J", "H", "Ks", "W1", "W2", "W3", "W4")
TIGHT = {"source_floor": 0.005, "r_v": "free"}


@pytest.fixture(scope="module")
def sharp(tables):
    """Grids of 16 bands with a small spread: what colours could tell if real stars were all alike."""
    from tui.workflow.templates import build

    settings = Settings(**TIGHT)
    templates = build(settings, {})
    local = templates.take([name for name in templates.names if name in (*OPTICAL, *INFRARED)])

    def look(candidate):
        return assess("blend", [candidate], templates, settings, tables)[0]

    return local, look


@pytest.fixture(scope="module")
def look(templates, tables):
    return lambda candidate: assess("blend", [candidate], templates, Settings(), tables)[0]


def fit_of(found, model):
    return next(fit for fit in found.fits if fit.model == model)


def test_every_kind_is_tried_and_the_best_comes_first(look, templates):
    found = look(make(templates, c.FREE_PAIR, 6500.0, x=3300.0, amount=0.5))
    assert {fit.model for fit in found.fits} == {"bound pair", "free pair", "star + compact", "star + galaxy"}
    scores = [fit.bic for fit in found.fits]
    assert scores == sorted(scores)


def test_a_free_pair_is_recovered(sharp):
    local, look = sharp
    found = fit_of(look(make(local, c.FREE_PAIR, 7500.0, x=3400.0, amount=0.7)), "free pair")
    assert found.p > 0.5
    assert found.params["teff1"].value == pytest.approx(7500.0, rel=0.04)
    assert found.params["teff2"].value == pytest.approx(3400.0, rel=0.06)
    assert found.params["flux_ratio"].value == pytest.approx(0.7, rel=0.25)
    assert found.params["teff1"].value > found.params["teff2"].value  # the hotter one is the first


def test_a_hot_compact_companion_is_recovered(sharp):
    local, look = sharp
    found = look(make(local, c.COMPACT, 3200.0, x=20000.0, amount=(0.013 / 0.25) ** 2))
    fit = fit_of(found, "star + compact")
    assert found.best.model == "star + compact" and found.adequate is True
    assert fit.params["radius_ratio"].value == pytest.approx(0.013 / 0.25, rel=0.25)
    assert fit.params["teff2"].value == pytest.approx(20000.0, rel=0.35)  # the Rayleigh-Jeans side fixes little


def test_a_companion_of_impossible_size_is_remarked(sharp):
    local, look = sharp
    found = []
    for kelvin, hot, ratio in ((8000.0, 60000.0, 0.5), (3200.0, 20000.0, 0.013 / 0.25)):
        parallax = sequence_parallax(local, kelvin)
        facts = {"parallax": parallax, "parallax_error": 0.01 * parallax}
        found.append(look(make(local, c.COMPACT, kelvin, x=hot, amount=ratio**2, facts=facts)))
    assert [one.best.model for one in found] == ["star + compact"] * 2
    huge, small = ([remark for remark in one.cautions if "hot companion's radius" in remark] for one in found)
    assert huge and not small  # 0.5 of 1.8 R_sun is no white dwarf; 0.013 R_sun is one


def test_a_background_galaxy_is_recovered(sharp):
    local, look = sharp
    found = look(make(local, c.GALAXY, 5500.0, x=1.5, amount=0.3))
    fit = fit_of(found, "star + galaxy")
    assert found.best.model == "star + galaxy" and found.adequate is True
    assert fit.params["slope"].value == pytest.approx(1.5, abs=0.15)
    assert fit.params["flux_ratio"].value == pytest.approx(0.3, rel=0.2)


def test_an_equal_bound_pair_needs_its_parallax(look, templates):
    # Two like stars have the colours of one: only brightness at a known distance tells them from it.
    parallax = sequence_parallax(templates, 5200.0)
    twice = {band: 2.0 for band in templates.names}
    known = look(make(templates, c.STAR, 5200.0, factors=twice, facts={"parallax": parallax,
        "parallax_error": 0.01 * parallax}))
    assert known.facts["over_luminosity"] == pytest.approx(0.753, abs=0.05)
    pair = fit_of(known, "bound pair")
    assert pair.params["teff2"].value == pytest.approx(5200.0, rel=0.12)
    assert any("0.753" in remark for remark in known.cautions)
    assert pair.dof == 10 + 1 - 4 or pair.params["av"].value == 0.0  # the parallax counts as a point
    blind = look(make(templates, c.STAR, 5200.0, factors=twice))
    assert any("No usable parallax" in remark for remark in blind.cautions)


def test_a_single_star_at_a_known_distance_is_as_bright_as_one(look, templates):
    parallax = sequence_parallax(templates, 5200.0)
    found = look(make(templates, c.STAR, 5200.0, facts={"parallax": parallax, "parallax_error": 0.01 * parallax}))
    assert abs(found.facts["over_luminosity"]) < 0.05
    assert any("As bright as one dwarf" in remark for remark in found.cautions)
    assert any("star alone fits" in remark for remark in found.cautions)


def test_the_planck_photosphere_knows_no_sequence(tables):
    from tui.workflow.templates import build

    settings = Settings(photosphere="planck")
    templates = build(settings, {})
    local = templates.take(["Gaia_BP", "Gaia_RP", "J", "Ks", "W1", "W2"])
    candidate = make(local, c.STAR, 6000.0, facts={"parallax": 10.0, "parallax_error": 0.1})
    found = assess("blend", [candidate], templates, settings, tables)[0]
    assert "bound pair" not in {fit.model for fit in found.fits}
    assert found.facts["over_luminosity"] is None or not np.isfinite(found.facts["over_luminosity"])
