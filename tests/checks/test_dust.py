"""Warm dust: temperature and amount recovered, limits where there is none, physical remarks."""

from __future__ import annotations

import numpy as np
import pytest

from tests.checks.making import make, sequence_parallax
from tui.checks import assess
from tui.checks.dust import LIMIT_TEMPERATURES_K
from tui.model import Settings
from tui.physics import composite as c


@pytest.fixture(scope="module")
def look(templates, tables):
    return lambda candidate: assess("dust", [candidate], templates, Settings(), tables)[0]


@pytest.mark.parametrize(("kelvin", "fraction"), [(300.0, 0.01), (700.0, 0.03), (1400.0, 0.05)])
def test_dust_is_recovered(look, templates, kelvin, fraction):
    found = look(make(templates, c.DUST, 6500.0, x=kelvin, amount=fraction))
    best = found.best
    assert found.adequate is True and best.model == "star + dust"
    assert best.params["dust_temperature"].value == pytest.approx(kelvin, rel=0.1)
    assert best.params["dust_fractional_luminosity"].value == pytest.approx(fraction, rel=0.15)
    assert best.params["dust_temperature"].low <= kelvin <= best.params["dust_temperature"].high


def test_bands_that_carry_the_excess_are_named(look, templates):
    found = look(make(templates, c.DUST, 6500.0, x=250.0, amount=0.005))
    assert set(found.facts["carried_by"]) >= {"W3", "W4"}
    assert found.facts["delta_chi2"] > 30


def test_radius_of_black_grains(look, templates):
    # A dwarf of 5772 K is 1.06 L_sun here; black grains of 278.33 K lie at 1 au from 1 L_sun (Backman & Paresce 1993)
    parallax = sequence_parallax(templates, 5772.0)
    facts = {"parallax": parallax, "parallax_error": 0.01 * parallax}
    found = look(make(templates, c.DUST, 5772.0, x=278.33, amount=0.01, facts=facts)).best
    kelvin = found.params["dust_temperature"].value
    star_m = found.params["theta"].value / (180 / np.pi * 3.6e6) * 1000 * 3.0856775814913674e16 / (parallax + 0.017)
    luminosity = 4 * np.pi * star_m**2 * 5.670374419e-8 * found.params["teff"].value ** 4 / 3.828e26
    assert found.params["dust_radius"].value == pytest.approx((278.33 / kelvin) ** 2 * np.sqrt(luminosity), rel=1e-3)
    assert found.params["dust_radius"].value == pytest.approx(1.0, rel=0.25)
    assert found.params["dust_radius"].unit == "au"


def test_no_parallax_no_radius(look, templates):
    assert "dust_radius" not in look(make(templates, c.DUST, 5772.0, x=300.0, amount=0.01)).best.params


@pytest.mark.parametrize("kelvin", LIMIT_TEMPERATURES_K)
def test_limits_where_no_excess_is_seen(look, templates, kelvin):
    # Dust of twice the 95 % limit at that temperature has to be seen: chi-square of the plain star rises by 2.71 or
    # more
    plain = look(make(templates, c.STAR, 6000.0))
    place = plain.facts["limit_temperature_k"].index(kelvin)
    limit = plain.facts["limit_fractional_luminosity"][place]
    assert limit > 0
    more = look(make(templates, c.DUST, 6000.0, x=kelvin, amount=2.0 * limit))
    assert more.facts["delta_chi2"] > 2.0
    less = look(make(templates, c.DUST, 6000.0, x=kelvin, amount=0.1 * limit))
    assert less.facts["delta_chi2"] < 2.0


def test_colder_dust_hides_more(look, templates):
    limits = look(make(templates, c.STAR, 6000.0)).facts["limit_fractional_luminosity"]
    assert limits[0] > limits[2] > limits[4]
    found = look(make(templates, c.STAR, 6000.0, factors={"W4": 0.97}))
    assert any("No dust needed" in remark and "300 K" in remark for remark in found.cautions)


def test_hot_and_extreme_dust_is_remarked_and_not_refused(look, templates):
    found = look(make(templates, c.DUST, 6500.0, x=1800.0, amount=0.2))
    assert found.adequate is True
    assert any("silicates" in remark for remark in found.cautions)
    assert any("extreme" in remark for remark in found.cautions)
    most = look(make(templates, c.DUST, 6500.0, x=400.0, amount=0.8))
    assert any("more than a disc" in remark for remark in most.cautions)


def test_one_band_fixes_no_temperature(look, templates):
    found = look(make(templates, c.STAR, 6000.0, factors={"W4": 4.0}))
    assert any("W4" in remark and "one band" in remark for remark in found.cautions)


def test_old_bright_dust_is_transient(look, templates):
    # Wyatt et al. 2007, eq. 18 at 1 au: f_max 0.16e-3/t_Myr; 0.01 at 5000 Myr is 3e5 times as much
    parallax = sequence_parallax(templates, 5772.0)
    facts = {"parallax": parallax, "parallax_error": 0.01 * parallax, "age_myr": 5000.0}
    found = look(make(templates, c.DUST, 5772.0, x=300.0, amount=0.01, facts=facts))
    assert any("transient dust" in remark for remark in found.cautions)
    young = look(make(templates, c.DUST, 5772.0, x=150.0, amount=1e-3, facts={**facts, "age_myr": 10.0}))
    assert not any("transient" in remark for remark in young.cautions)


def test_two_temperatures_only_where_asked_for(grids, tables):
    names = ("V", "J", "H", "Ks", "W1", "W2", "W3", "W4", "MIPS24", "MIPS70", "PACS100", "PACS160", "IRAC3", "IRAC4")
    local = grids.take([name for name in grids.names if name in names])
    one = make(local, c.DUST, 9000.0, name="one", x=150.0, amount=1e-3)
    x = np.array([[np.log(9000.0), -45.0, 0.0, 3.1, np.log(450.0), 6e-3, np.log(60.0), 4e-3]])
    from tui.model import Candidate, Measurement
    from tui.physics.composite import kit_for, predict

    flux = predict(kit_for(c.TWO_DUST, local), x).flux[0]
    two = Candidate("two", tuple(Measurement(n, float(f), 0.01 * float(f)) for n, f in zip(local.names, flux,
        strict=True)))
    settings = Settings(r_v="free")
    plain, double = assess("dust", [one, two], grids, settings, tables)
    assert all("two" not in fit.model for fit in plain.fits)
    assert double.best.model == "star + two dusts, A_V" and double.adequate is True
    found = sorted(double.best.params[name].value for name in ("dust_temperature", "dust2_temperature"))
    assert found == pytest.approx([60.0, 450.0], rel=0.15)
