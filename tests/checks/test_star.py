"""Star alone: adequate or not, how odd, and what its brightness says."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy import stats

from tests.checks.making import make, sequence_parallax
from tui.checks import assess, oddness
from tui.model import Candidate, Measurement, Settings
from tui.physics import composite as c


@pytest.fixture(scope="module")
def look(templates, tables):
    def look_at(*candidates, **settings):
        found = assess("star", candidates, templates, Settings(**settings), tables)
        return found[0] if len(found) == 1 else found

    return look_at


def test_a_plain_star_is_plain(look, templates):
    found = look(make(templates, c.STAR, 5772.0, seed=1))
    assert found.adequate is True
    assert found.best.params["teff"].value == pytest.approx(5772.0, rel=0.02)
    # theta = exp(-45/2) radian in mas
    assert found.best.params["theta"].value == pytest.approx(np.exp(-22.5) * 180 / np.pi * 3.6e6, rel=0.02)
    assert found.best.model == "star" and found.best.dof == len(found.best.pulls) - 2
    assert found.best.params["teff"].low < found.best.params["teff"].value < found.best.params["teff"].high


def test_an_excess_is_odd_and_its_band_is_named(look, templates):
    found = look(make(templates, c.STAR, 5772.0, factors={"W4": 3.0}))
    told = oddness(found)
    assert found.adequate is False
    assert told.band == "W4" and told.pull > 5
    # the sigma of p by scipy.stats
    assert told.sigma == pytest.approx(stats.norm.isf(stats.chi2.sf(found.best.chi2, found.best.dof)), rel=1e-6)


def test_an_oddness_beyond_doubles_is_still_a_number(look, templates):
    wild = make(templates, c.STAR, 5772.0, error=1e-4, factors={"W4": 1e4, "W3": 1e3})
    told = oddness(look(wild, source_floor=1e-4, floors={}))
    assert np.isfinite(told.sigma) and told.sigma > 20


def test_criteria_follow_their_definitions(look, templates):
    best = look(make(templates, c.STAR, 4800.0, seed=2)).best
    assert best.aic == pytest.approx(best.minus2lnl + 2 * 2)
    assert best.bic == pytest.approx(best.minus2lnl + 2 * np.log(10))
    assert best.p == pytest.approx(stats.chi2.sf(best.chi2, best.dof))


@pytest.mark.parametrize(("ratio", "expected"), [(1.0, 0.0), (2.0, 0.753), (3.0, 1.193)], ids=["one", "pair", "triple"])
def test_over_luminosity_of_equal_stars(look, templates, ratio, expected):
    # 2.5 log10 of 1, 2 and 3 equal stars
    parallax = sequence_parallax(templates, 5000.0)
    flux = {band: ratio for band in templates.names}
    facts = {"parallax": parallax, "parallax_error": 0.01 * parallax}
    found = look(make(templates, c.STAR, 5000.0, factors=flux, facts=facts))
    assert found.facts["over_luminosity"] == pytest.approx(expected, abs=0.02)
    assert found.facts["over_luminosity_error"] > 0.25  # the scatter of real dwarfs, and more


def test_far_too_bright_and_far_too_faint_are_remarked(look, templates):
    parallax = sequence_parallax(templates, 5000.0)
    giant, subdwarf = (
        look(make(templates, c.STAR, 5000.0, factors={band: ratio for band in templates.names},
                  facts={"parallax": parallax, "parallax_error": 0.01 * parallax}))
        for ratio in (30.0, 0.3)
    )  # fmt: skip
    assert any("evolved or young" in remark for remark in giant.cautions)
    assert any("subdwarf" in remark for remark in subdwarf.cautions)
    assert giant.adequate is True  # a caution refuses nothing


@pytest.mark.parametrize(
    ("facts", "words"),
    [({"parallax": 20.0, "parallax_error": 0.1, "ruwe": 2.2}, "RUWE"), ({"parallax": 0.4, "parallax_error": 0.2},
     "5 times")],
    ids=["RUWE", "too uncertain"],
)
def test_why_a_parallax_is_not_used(look, templates, facts, words):
    found = look(make(templates, c.STAR, 5000.0, facts=facts))
    assert any(words in remark for remark in found.cautions)
    assert not np.isfinite(found.facts["over_luminosity"])


def test_the_end_of_the_sequence_is_said(look):
    # a source bluer than any dwarf
    blue = [Measurement(band, 1e-3 * (0.5 / wave) ** 2.3, 1e-5) for band, wave in
            (("Gaia_BP", 0.51), ("Gaia_RP", 0.78), ("J", 1.24), ("H", 1.65), ("Ks", 2.16))]  # fmt: skip
    found = look(Candidate("blue", tuple(blue)))
    assert any("hottest template" in remark for remark in found.cautions)


def test_errors_that_are_too_large_are_said(look, templates):
    found = look(make(templates, c.STAR, 5772.0, error=0.2))
    assert found.best.p > 0.99
    assert any("errors look too large" in remark for remark in found.cautions)


def test_an_error_that_was_not_given_is_said_and_the_floor_stands_for_it(look, templates):
    given = make(templates, c.STAR, 5772.0)
    lacking = replace(given, measurements=tuple(
        replace(one, error_jy=float("nan")) if one.band in ("H", "W2") else one for one in given.measurements))  # fmt: skip
    assert any("No error was given for H and W2" in remark for remark in look(lacking).cautions)
    assert not any("No error was given" in remark for remark in look(given).cautions)
    assert look(lacking).adequate is True


@pytest.mark.parametrize(
    "measurements",
    [(), (Measurement("W4", 1e-3, float("nan"), True),), (Measurement("J", 1.0, 0.1, exclude=True),)],
    ids=["none", "a limit", "excluded"],
)
def test_nothing_to_fit_is_untestable(look, measurements):
    found = look(Candidate("empty", measurements))
    assert found.adequate is None and found.best is None
    assert found.cautions and np.isnan(oddness(found).sigma)


def test_two_bands_are_untestable_unless_hopeless(look, templates):
    two = tuple(m for m in make(templates, c.STAR, 5772.0).measurements if m.band in ("J", "Ks"))
    assert look(Candidate("two", two)).adequate is None
    wild = (two[0], Measurement("Ks", 500 * two[1].flux_jy, 5 * two[1].flux_jy))
    assert look(Candidate("wild", wild)).adequate is False


def test_a_limit_that_is_overshot_counts_and_one_that_is_met_does_not(look, templates):
    met = look(make(templates, c.STAR, 5772.0, limits=("W4",), factors={"W4": 5.0}))
    over = look(make(templates, c.STAR, 5772.0, limits=("W4",), factors={"W4": 0.1}))
    assert met.best.pulls["W4"] == 0.0 and met.adequate is True
    assert over.best.pulls["W4"] < -3 and over.adequate is False
    assert met.best.dof == over.best.dof == 8  # all bands count in n


def test_the_threshold_is_the_queues(look, templates):
    candidate = make(templates, c.STAR, 5772.0, factors={"W4": 1.26})
    p = look(candidate).best.p
    assert 1e-6 < p < 0.9
    assert look(candidate, p_min=p * 1.01).adequate is False and look(candidate, p_min=p * 0.99).adequate is True


def test_order_is_kept_and_company_does_not_matter(look, templates):
    stars = [make(templates, c.STAR, kelvin, name=str(kelvin), seed=int(kelvin)) for kelvin in (3300.0, 9000.0, 5772.0)]
    together = look(*stars)
    for star, found in zip(stars, together, strict=True):
        assert found.best.params["teff"].value == pytest.approx(look(star).best.params["teff"].value, rel=1e-4)
