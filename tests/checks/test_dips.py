"""Dip evidence: grey bodies, dust, and what standing dips ask of the other checks."""

from __future__ import annotations

import numpy as np
import pytest

from tui.checks.dips import GREY, LAW, POWER, all_of, assess, model_depths, with_dips
from tui.data.load import bands
from tui.model import Candidate, Dip, Evidence, Settings, canonical_json
from tui.physics.dips import screen_depth
from tui.physics.extinction import extinction_curve

BANDS = bands()
NAMES = ("SDSS_u", "SDSS_g", "SDSS_r", "SDSS_i", "SDSS_z", "J", "Ks")
WAVE = np.array([BANDS[name].pivot_um for name in NAMES])


def evidence(depths, error=0.001, event="first", names=NAMES):
    dips = tuple(Dip(event, name, float(depth), error) for name, depth in zip(names, depths, strict=True))
    return assess([Candidate("one", dips=dips)], BANDS, Settings())[0]


GREY_DEPTH = np.full(len(NAMES), 0.05)
ISM_DEPTH = screen_depth(0.3 * extinction_curve(WAVE, "g23", 3.1))
RAYLEIGH = screen_depth(0.05 * (WAVE / 0.55) ** -4.0)  # grains far smaller than the wavelength scatter so
REVERSED = 0.05 * WAVE / 0.55


def test_opaque_body():
    found = evidence(GREY_DEPTH)
    assert found.adequate is True and found.facts["refused"] == [LAW]
    assert found.facts["grey_adequate"] is True and found.facts["law_adequate"] is False
    assert found.facts["slope_low"] <= 0.0 <= found.facts["slope_high"]
    grey = next(fit for fit in found.fits if fit.model == GREY)
    assert grey.params["depth"].value == pytest.approx(0.05, rel=0.01)


def test_interstellar_colours():
    found = evidence(ISM_DEPTH)
    assert found.facts["law_adequate"] is True and found.facts["grey_adequate"] is False
    assert GREY in found.facts["refused"] and found.facts["delta_chi2_grey"] > 100
    law = next(fit for fit in found.fits if fit.model == LAW)
    assert law.params["r_v"].low <= 3.1 <= law.params["r_v"].high


def test_small_grains():
    found = evidence(RAYLEIGH)
    assert found.facts["coloured_adequate"] is True and found.facts["law_adequate"] is False
    assert found.facts["slope"] == pytest.approx(4.0, abs=0.1)
    assert found.fits[0].model == POWER


def test_a_dip_that_nothing_makes():
    depths = np.where(np.arange(len(NAMES)) % 2, 0.08, 0.01)
    found = evidence(depths)
    assert found.adequate is False
    assert any("neither a grey body nor dust" in text for text in found.cautions)


def test_reversed_colours_are_told():
    assert any("deeper in the red" in text for text in evidence(REVERSED).cautions)


def test_what_standing_dips_ask_of_the_checks():
    grey, ism, small = evidence(GREY_DEPTH), evidence(ISM_DEPTH), evidence(RAYLEIGH)
    assert with_dips("star", True, grey) is False
    assert with_dips("instrument", True, grey) is False
    assert [with_dips("blend", True, one) for one in (grey, ism, small)] == [True, False, False]
    assert [with_dips("extinction", True, one) for one in (grey, ism, small)] == [False, True, False]
    assert with_dips("dust", True, small) is True and with_dips("dust", True, ism) is True
    assert with_dips("dust", False, small) is False
    assert with_dips("mixture", True, small) is True


@pytest.mark.parametrize("kind", ["star", "instrument", "extinction", "blend", "dust"])
@pytest.mark.parametrize("answer", [True, False, None])
def test_no_dip_asks_nothing(kind, answer):
    noise = evidence(np.full(len(NAMES), 0.001))
    assert noise.facts["stands"] is False and noise.adequate is None
    nothing = assess([Candidate("one")], BANDS, Settings())[0]
    assert nothing.adequate is None and nothing.fits == () and nothing.facts == {}
    for dips in (noise, nothing, None):
        assert with_dips(kind, answer, dips) is answer


def test_a_grey_dip_is_no_coloured_dust():
    """A power law of slope zero is grey under another name; so is one that is redder than grey."""
    grey, red = evidence(GREY_DEPTH), evidence(REVERSED)
    for found in (grey, red):
        assert found.facts["coloured_adequate"] is False and with_dips("dust", True, found) is False
    assert any("is no colour" in text for text in grey.cautions)
    assert any("deeper in the red" in text for text in red.cautions)


def test_shallow_colours_that_the_errors_allow_to_be_grey_are_said_to_tell_nothing():
    found = evidence(ISM_DEPTH, error=0.2 * ISM_DEPTH.max())
    assert found.facts["stands"] is True
    assert found.facts["grey_adequate"] is True and found.facts["coloured_adequate"] is True
    assert any("cannot tell a grey body from dust" in text for text in found.cautions)


def test_one_band_tests_nothing():
    found = evidence([0.05], names=("SDSS_r",))
    assert found.adequate is None and found.facts["stands"] is True
    assert with_dips("dust", True, found) is None and with_dips("star", True, found) is False
    assert any("too few" in text for text in found.cautions)


def test_several_events_are_judged_one_by_one():
    pairs = [("deep", GREY_DEPTH), ("shallow", ISM_DEPTH * 0.5), ("noise", np.zeros(len(NAMES)))]
    rows = [(event, name, float(depth)) for event, depths in pairs for name, depth in zip(NAMES, depths, strict=True)]
    dips = tuple(Dip(event, name, depth, 0.001) for event, name, depth in rows)
    (found,) = assess([Candidate("one", dips=dips)], BANDS, Settings())
    assert set(found.facts["events"][:2]) == {"deep", "shallow"}  # the most significant first
    assert set(found.facts["standing_events"]) == {"deep", "shallow"}
    assert found.adequate is True  # each is made by something
    assert found.facts["grey_adequate"] is False and found.facts["law_adequate"] is False  # no one thing makes both
    assert len(found.fits) == 9 and all("(" in fit.model for fit in found.fits)


def test_faulty_rows_are_left_out_and_told():
    dips = (Dip("a", "nowhere", 0.1, 0.01), Dip("a", "J", 0.1, 0.0), Dip("a", "J", float("nan"), 0.1))
    (found,) = assess([Candidate("one", dips=dips)], BANDS, Settings())
    assert found.fits == () and "a nowhere" in found.cautions[0]


def test_curves_pass_through_the_fitted_depths():
    found = evidence(ISM_DEPTH)
    for fit in found.fits:
        drawn = model_depths(fit, WAVE, "g23")
        fitted = ISM_DEPTH - np.array([fit.pulls[name] for name in NAMES]) * 0.001
        if fit.model != GREY:  # whose errors hold the floor for limb darkening
            assert drawn == pytest.approx(fitted, abs=2e-4)
        else:
            assert np.ptp(drawn) == 0.0


def test_three_valued_and():
    assert all_of([True, True]) is True
    assert all_of([True, None]) is None and all_of([]) is None
    assert all_of([None, False]) is False


def test_plain_json():
    assert canonical_json(evidence(ISM_DEPTH).facts)
    assert isinstance(evidence(ISM_DEPTH), Evidence)
