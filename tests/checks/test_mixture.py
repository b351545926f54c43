"""The mixture bound on candidates: what nature can make is not refused, what it cannot make is."""

from __future__ import annotations

import json

import numpy as np
import pytest

from tests.bench.natural_mixtures import FOURTEEN, S1, Sky, in_order, observed, random_mixture
from tui.checks import assess, assess_all, mixture
from tui.checks.mixture_words import SPECTRUM_CAUTION
from tui.model import KINDS, Candidate, Evidence, Fit, Measurement, Settings, Spectrum, canonical_json
from tui.physics.natural_sources import drude
from tui.physics.planck import planck_jy
from tui.workflow.templates import build


@pytest.fixture(scope="module")
def templates():
    return build(Settings(), {})


@pytest.fixture(scope="module")
def sky(templates):
    return Sky(templates, in_order(templates, FOURTEEN))


def plain_candidate(sky, flux, error=0.01, **more):
    rows = tuple(Measurement(name, one, error * one) for name, one in zip(sky.names, flux, strict=True))
    return Candidate("c", rows, **more)


def notched(sky):
    """A 5772 K star with two thirds of its light gone in H."""
    return sky.star(5772.0) * np.where(np.array(sky.names) == "H", 1 / 3, 1.0)


@pytest.mark.parametrize("common", [{}, {"Gaia": 0.02, "2MASS": 0.02, "WISE": 0.03}], ids=["floors", "common errors"])
@pytest.mark.parametrize("names", [S1, FOURTEEN], ids=["ten bands", "fourteen bands"])
def test_random_natural_mixtures_are_refused_no_more_than_nominal(templates, names, common):
    sky, rng = Sky(templates, in_order(templates, names)), np.random.default_rng(2026)
    stars = [
        observed(rng, sky, *random_mixture(rng, sky), depth=10.0 ** rng.uniform(-4, -1.3), common=common)
        for _ in range(150)
    ]
    assert any(one.limit for star in stars for one in star.measurements)
    evidence = mixture.assess(stars, templates, Settings(common=common))
    refused = sum(one.adequate is False for one in evidence)
    assert refused <= 5  # nominal 1.5 of 150; more than 5 has probability 0.004


def test_ordinary_discs_are_not_refused(templates, sky):
    star = sky.star(5772.0)
    spectra = [
        lambda w: planck_jy(w, 200.0) * np.minimum(1, 10 / w),  # beta 1
        lambda w: planck_jy(w, 300.0) * (0.3 + 2 * drude(w, np.array([9.7]), np.array([0.25]))[0]),  # silicates
        lambda w: planck_jy(w, 350.0) * (0.1 + drude(w, np.array([11.3]), np.array([0.03]))[0]),  # PAH
    ]
    discs = [star + 6 * star[-1] * flux / flux[-1] for flux in map(sky.seen, spectra)]
    evidence = mixture.assess([plain_candidate(sky, flux) for flux in discs], templates, Settings())
    assert [one.adequate for one in evidence] == [True, True, True]


def test_a_notch_is_refused_with_its_witness(templates, sky):
    flux = notched(sky)
    (found,) = mixture.assess([plain_candidate(sky, flux)], templates, Settings())
    facts = found.facts
    assert found.adequate is False and found.kind == "mixture" and found.bands == sky.names
    assert facts["points"] == 14 and facts["p"] < 1e-4 and not facts["at_most"]
    assert facts["chi2"] <= facts["chi2_found"]
    assert min(facts["witness"], key=facts["witness"].get) == "H"
    assert "too bright against H" in facts["sentence"]
    assert "no mixture of dwarf photospheres and (modified) black bodies" in facts["sentence"]
    assert json.loads(canonical_json(facts))["parts"]


def test_weights_add_up_to_the_root_of_chi_square():
    covariance = np.array([[0.04, 0.01], [0.01, 0.09]])
    v = np.array([2.0, -1.0])
    weights = mixture.witness(["J", "H"], v, covariance)
    flux, sigma = np.array([5.0, 1.0]), np.sqrt(np.diag(covariance))
    total = sum(weights[name] * one / s for name, one, s in zip(["J", "H"], flux, sigma, strict=True))
    assert total == pytest.approx(v @ flux / np.sqrt(v @ covariance @ v))


def test_a_fit_that_lies_in_the_cone_saves_the_solve(templates, sky):
    (found,) = mixture.assess([plain_candidate(sky, notched(sky))], templates, Settings(), [9.5])
    assert found.adequate is True and found.facts["at_most"] and found.facts["chi2"] == 9.5
    assert "at most 9.5" in found.facts["sentence"] and found.facts["witness"] == {}


def test_only_the_star_alone_counts_as_known_since_it_is_always_fitted():
    def evidence(kind, model, chi2):
        return Evidence(kind, 1, True, fits=(Fit(model, chi2, 5, 0.5, 0.0, 0.0),))

    found = {"star": evidence("star", "star", 30.0), "dust": evidence("dust", "star + dust", 8.0)}
    assert mixture.known_from(found) == 30.0
    assert np.isnan(mixture.known_from({"dust": found["dust"]}))
    assert np.isnan(mixture.known_from({"star": Evidence("star", 1, None)}))


def test_one_band_tests_nothing(templates):
    lone = Candidate("c", (Measurement("J", 1.0, 0.02),))
    (found,) = mixture.assess([lone], templates, Settings())
    assert found.adequate is None and "1" in found.facts["sentence"] and "chi2" not in found.facts


def test_order_and_mates_do_not_matter(templates, sky):
    stars = [plain_candidate(sky, notched(sky)), plain_candidate(sky, sky.star(4000.0, 2.0)), Candidate("none")]
    together = mixture.assess(stars, templates, Settings())
    alone = [mixture.assess([star], templates, Settings())[0] for star in stars]
    assert [one.adequate for one in together] == [False, True, None] == [one.adequate for one in alone]
    assert together[0].facts["chi2"] == pytest.approx(alone[0].facts["chi2"], rel=0.01)


def test_what_else_is_asked_for_changes_nothing(templates, sky, tables):
    warm = sky.seen(lambda wave: planck_jy(wave, 300.0))
    dusty = sky.star(5772.0) + 4.0 * sky.star(5772.0)[-1] * warm / warm[-1]
    fluxes = (dusty, notched(sky), sky.star(4000.0), sky.star(6500.0, 1.5))
    stars = [plain_candidate(sky, flux) for flux in fluxes]
    alone = assess("mixture", stars, templates, Settings(), tables)
    beside = [one["mixture"] for one in assess_all(stars, templates, Settings(), KINDS, tables)]
    assert alone == beside and [one.adequate for one in alone] == [True, False, True, True]


@pytest.mark.parametrize("flux_jy", [1e-25, 1e-22, 1e10])
def test_how_faint_a_star_is_does_not_matter_where_its_errors_are_as_faint(templates, sky, flux_jy):
    flux = notched(sky) / notched(sky).max()
    (plain,) = mixture.assess([plain_candidate(sky, flux)], templates, Settings())
    (faint,) = mixture.assess([plain_candidate(sky, flux * flux_jy)], templates, Settings())
    assert faint.facts["chi2"] == pytest.approx(plain.facts["chi2"], rel=1e-3) and faint.adequate is False


def test_a_limit_can_be_what_refuses(templates, sky):
    flux = sky.star(5772.0)
    rows = {name: Measurement(name, one, 0.01 * one) for name, one in zip(sky.names, flux, strict=True)}
    rows["H"] = Measurement("H", rows["H"].flux_jy / 4, np.nan, limit=True, nsigma=3.0)
    (found,) = mixture.assess([Candidate("c", tuple(rows.values()))], templates, Settings())
    assert found.adequate is False and "the limit in H" in found.facts["sentence"] and found.cautions


def test_a_spectrum_is_left_out_and_said_so(templates, sky):
    wave = np.linspace(0.5, 0.6, 5)
    star = plain_candidate(sky, sky.star(5772.0), spectrum=Spectrum(wave, wave, wave))
    (found,) = mixture.assess([star], templates, Settings(), [1.0])
    assert any("spectrum" in caution for caution in found.cautions)


def test_points_of_a_spectrum_stay_out_where_the_photospheres_have_no_lines(templates, sky):
    star = plain_candidate(sky, sky.star(5772.0))
    point = Measurement("spectrum:0.55", 1e-9, 1e-12)
    (found,) = mixture.assess([Candidate("c", (*star.measurements, point))], templates, Settings())
    assert found.adequate is True and found.facts["points"] == 14
    assert found.cautions == (SPECTRUM_CAUTION,)


def test_no_real_star_is_refused(templates, real_stars):
    # stars with discs, without excess, reddened, and pairs: all natural, whatever the other checks make of them
    chosen = [star for star in real_stars if star.group in "abcd" and not star.doubtful]
    evidence = mixture.assess([star.candidate for star in chosen], templates, Settings())
    assert len(chosen) > 35
    assert [star.name for star, one in zip(chosen, evidence, strict=True) if one.adequate is False] == []


@pytest.mark.parametrize("values", [(0.0, np.nan), (-1e-3, 1e-3), (1e-30, 1e-33), (1e6, 1.0)], ids=str)
def test_strange_fluxes_give_plain_answers(templates, sky, values):
    flux = sky.star(5772.0) / sky.star(5772.0).max()
    rows = [Measurement(name, one, 0.02 * one) for name, one in zip(sky.names, flux, strict=True)]
    rows[3] = Measurement(sky.names[3], *values)
    (found,) = mixture.assess([Candidate("c", tuple(rows))], templates, Settings())
    assert found.adequate in (True, False) and 0 <= found.facts["p"] <= 1
    dark = [Measurement(name, 0.0, np.nan) for name in sky.names]
    (found,) = mixture.assess([Candidate("c", tuple(dark))], templates, Settings())
    assert found.adequate is True
