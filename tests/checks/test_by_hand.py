"""Curves for the plot and fits with parameters held."""

from __future__ import annotations

import numpy as np
import pytest

from tests.checks.making import make
from tui.checks import assess, curve, probe
from tui.errors import InputError
from tui.model import Settings
from tui.physics import composite as c
from tui.physics.planck import planck_jy

WAVE = np.geomspace(0.35, 30.0, 4000)
NONE = frozenset()
CASES = [("star", c.STAR, {}), ("extinction", c.STAR_AV, {"av": 1.5}), ("dust", c.DUST, {"x": 350.0, "amount": 0.02}),
         ("blend", c.COMPACT, {"x": 20000.0, "amount": 0.01}), ("blend", c.GALAXY, {"x": 1.5,
         "amount": 0.5})]  # fmt: skip


def probed(candidate, check, fixed, templates, dropped=NONE):
    return probe(candidate, check, fixed, dropped, templates, Settings())


@pytest.mark.parametrize(("check", "model", "values"), CASES, ids=[case[1].name for case in CASES])
def test_a_curve_passes_through_its_bands(templates, tables, check, model, values):
    # measurements are drawn at their bands' pivots, and the curve has to meet them there: 4 %, since neighbouring
    # bands' offsets are averaged by three; the curve is for the eye
    candidate = make(templates, model, 4500.0 if check == "blend" else 6000.0, **values)
    fit = assess(check, [candidate], templates, Settings(), tables)[0].best
    drawn = curve(candidate, fit, check, templates, Settings(), WAVE)
    assert np.all(drawn.total_jy >= 0) and drawn.total_jy == pytest.approx(sum(drawn.components.values()))
    off = []
    for measurement in candidate.measurements:
        band = next(b for b in templates.bands if b.name == measurement.band)
        seen = np.exp(np.interp(np.log(band.pivot_um), np.log(WAVE), np.log(drawn.total_jy)))
        off.append(abs(seen / measurement.flux_jy - 1))
    assert np.median(off) < 0.04 and max(off) < 0.15, off


def test_the_dust_of_a_curve_is_planck(templates, tables):
    candidate = make(templates, c.DUST, 6000.0, x=350.0, amount=0.02)
    fit = assess("dust", [candidate], templates, Settings(), tables)[0].best
    dust = curve(candidate, fit, "dust", templates, Settings(), WAVE).components["dust"]
    kelvin = fit.params["dust_temperature"].value
    ratio = dust / planck_jy(WAVE, kelvin)
    assert ratio == pytest.approx(np.full(ratio.shape, np.median(ratio)), rel=1e-6)


def test_a_curve_of_another_check_is_refused(templates, tables):
    from dataclasses import replace

    candidate = make(templates, c.STAR, 6000.0)
    fit = assess("star", [candidate], templates, Settings(), tables)[0].best
    with pytest.raises(InputError):
        curve(candidate, replace(fit, model="star + nonsense"), "star", templates, Settings(), WAVE)


def test_nothing_held_is_the_checks_own_fit(templates, tables):
    candidate = make(templates, c.DUST, 6000.0, x=350.0, amount=0.02, seed=3)
    own = assess("dust", [candidate], templates, Settings(), tables)[0]
    found = probed(candidate, "dust", {}, templates)
    bare = next(fit for fit in own.fits if fit.model == "star + dust")
    assert found.model == "star + dust"
    assert found.chi2 == pytest.approx(bare.chi2, abs=0.1)
    assert found.params["dust_temperature"].value == pytest.approx(bare.params["dust_temperature"].value, rel=0.02)


@pytest.mark.parametrize(
    ("check", "name", "value"),
    [("star", "teff", 5600.0), ("star", "theta", 0.034), ("extinction", "av", 0.6), ("dust", "dust_temperature", 200.0),
     ("dust", "dust_fractional_luminosity", 0.01), ("dust", "av", 0.3), ("blend", "teff2", 3500.0), ("blend",
     "flux_ratio", 0.3),
     ("blend", "radius_ratio", 0.1), ("blend", "slope", 1.2)],
)  # fmt: skip
def test_what_is_held_stays_and_costs(templates, check, name, value):
    candidate = make(templates, c.DUST, 6000.0, x=350.0, amount=0.005, seed=4)
    held = probed(candidate, check, {name: value}, templates)
    assert held.params[name].value == pytest.approx(value, rel=1e-6)
    if held.model in ("star", "star + dust"):
        assert held.chi2 >= probed(candidate, check, {}, templates).chi2 - 0.3  # errors follow the model a little


def test_holding_the_best_value_changes_nothing(templates):
    candidate = make(templates, c.STAR, 5772.0, seed=5)
    best = probed(candidate, "star", {}, templates)
    again = probed(candidate, "star", {"teff": best.params["teff"].value}, templates)
    assert again.chi2 == pytest.approx(best.chi2, abs=0.01)


def test_a_dropped_band_no_longer_counts(templates):
    candidate = make(templates, c.STAR, 5772.0, factors={"W4": 5.0})
    whole, without = (probed(candidate, "star", {}, templates, dropped) for dropped in (NONE, frozenset({"W4"})))
    assert "W4" in whole.pulls and "W4" not in without.pulls
    assert without.dof == whole.dof - 1 and without.chi2 < whole.chi2 - 20


def test_what_cannot_be_done_is_said(templates):
    candidate = make(templates, c.STAR, 5772.0)
    with pytest.raises(InputError, match="teff"):
        probed(candidate, "star", {"dust_temperature": 300.0}, templates)
    with pytest.raises(InputError):
        probed(candidate, "star", {}, templates, frozenset(templates.names))


def test_another_model_can_be_asked_for_with_intervals(templates, tables):
    # The free pair and its intervals as in the check, where it leads there; the name is refused where it has none.
    candidate = make(templates, c.FREE_PAIR, 6500.0, x=3300.0, amount=0.5)
    found = assess("blend", [candidate], templates, Settings(), tables)[0].best
    asked = probe(candidate, "blend", {}, frozenset(), templates, Settings(), model=found.model, with_intervals=True)
    assert asked.chi2 == pytest.approx(found.chi2, abs=0.1)
    for name, param in found.params.items():
        assert asked.params[name].high == pytest.approx(param.high, rel=0.02)
    with pytest.raises(InputError, match="it has bound pair"):
        probe(candidate, "blend", {}, frozenset(), templates, Settings(), model="star + dust")


def test_what_is_held_has_no_interval_and_narrows_the_others(templates):
    candidate = make(templates, c.STAR_AV, 5772.0, av=1.0)
    free = probe(candidate, "extinction", {}, frozenset(), templates, Settings(), with_intervals=True).params
    held = probe(candidate, "extinction", {"av": 1.0}, frozenset(), templates, Settings(), with_intervals=True).params
    assert np.isnan(held["av"].low) and np.isnan(held["av"].high)
    assert held["teff"].high - held["teff"].low < 0.7 * (free["teff"].high - free["teff"].low)
