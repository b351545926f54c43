"""The instrument check on stars made from the templates, with one thing wrong at a time."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tui.checks import star
from tui.checks.instrument import NOTHING_LOADED, NOT_THE_DATA, assess
from tui.checks.record import fits_of
from tui.model import Candidate, Measurement, Neighbour, Settings
from tui.physics.composite import STAR
from tui.physics.fitting import fit
from tui.physics.problem import build_problem

SETTINGS = Settings()
CLEAN = {"cc_flags": "0", "ph_qual": "A"}
HALO = {"cc_flags": "h", "ph_qual": "A"}


@pytest.fixture
def run(templates, tables):
    def run(candidates, change=lambda evidence: evidence):
        nothing, most = np.full(len(candidates), np.nan), np.full(len(candidates), 5.0)
        batch = fit(build_problem(candidates, templates, parallaxes=(nothing, nothing), av_max=most), STAR)
        evidence = [change(one) for one in star.assess(candidates, batch, SETTINGS)]
        return assess(candidates, batch, evidence, fits_of, tables, SETTINGS)

    return run


@pytest.fixture
def made(templates):
    """A 5600 K star of W1 about 10 mag; `factor` multiplies fluxes, `flags` go to bands."""

    def made(factor=None, flags=None, **more):
        ln_flux, _ = templates.star.at(np.array([np.log(5600.0)]))
        flux = dict(zip(templates.names, np.exp(ln_flux[0] - 44.5), strict=True))
        flux = {name: value * (factor or {}).get(name, 1.0) for name, value in flux.items()}
        flags = flags or {}
        rows = (Measurement(name, value, 0.01 * value, flags=flags.get(name, {})) for name, value in flux.items())
        return Candidate("one", tuple(rows), **more)

    return made


def test_flagged_band_explains(run, made):
    (evidence,) = run([made({"W4": 3.0}, {"W4": HALO, "W3": CLEAN})])
    assert evidence.adequate is True
    assert evidence.facts["carrier_band"] == "W4" and evidence.facts["carrier_suspect"] is True
    assert evidence.facts["carrier_p"] < 1e-6 and evidence.facts["carrier_pull"] > 6
    assert evidence.facts["suspect_bands"] == ["W4"]
    assert evidence.facts["p_without_suspects"] > 0.01
    assert [f.model for f in evidence.fits] == ["star without W4", "star"]
    assert "W4" not in evidence.fits[0].pulls
    assert any("scattered light" in text for text in evidence.cautions)


def test_carrier_without_a_flag_is_no_explanation(run, made):
    (evidence,) = run([made({"W4": 3.0}, {"W4": CLEAN})])
    assert evidence.adequate is False
    assert evidence.facts["carrier_band"] == "W4" and evidence.facts["carrier_suspect"] is False
    assert evidence.facts["suspect_bands"] == []
    assert any("Nothing independent" in text for text in evidence.cautions)
    assert any("end of the spectrum" in text for text in evidence.cautions)


def test_a_flag_on_another_band_explains_nothing(run, made):
    (evidence,) = run([made({"W4": 3.0}, {"W1": HALO, "W4": CLEAN})])
    assert evidence.adequate is False
    assert evidence.facts["suspect_bands"] == ["W1"]
    assert [f.model for f in evidence.fits] == ["star", "star without W1"]


def test_ordinary_star_stands(run, made):
    (evidence,) = run([made(None, {"W4": CLEAN})])
    assert evidence.adequate is True
    assert not any("carries" in text for text in evidence.cautions)


def test_untestable_without_any_quality_column(run, made):
    odd, plain = run([made({"W4": 3.0}), made()])
    assert odd.adequate is None and plain.adequate is None
    assert NOTHING_LOADED in odd.cautions
    assert odd.facts["carrier_band"] == "W4"  # the carrier is told all the same


@pytest.mark.parametrize("cause", ["neighbour", "epoch", "aperture", "gaia"])
def test_each_independent_evidence_counts(run, made, cause):
    odd = made({"W3": 2.0})
    w3 = next(m for m in odd.measurements if m.band == "W3")
    rest = tuple(m for m in odd.measurements if m.band != "W3")
    if cause == "neighbour":
        odd = replace(odd, neighbours=(Neighbour(1.0, fluxes_jy={"W3": 0.5 * w3.flux_jy}),))
    elif cause == "epoch":
        other = replace(w3, flux_jy=0.8 * w3.flux_jy, epoch="55300")
        odd = replace(odd, measurements=(*rest, replace(w3, flux_jy=1.2 * w3.flux_jy, epoch="55500"), other))
    elif cause == "aperture":
        mag = -2.5 * np.log10(w3.flux_jy / 31.674)
        odd = replace(odd, measurements=(*rest, replace(w3, flags={"w3mag": f"{mag + 0.75:.3f}", "w3sigm": "0.03"})))
    else:
        odd = made({"Gaia_BP": 1.6}, facts={"phot_bp_rp_excess_factor": 1.7, "bp_rp": 0.8, "phot_g_mean_mag": 11.0})
    (evidence,) = run([odd])
    assert evidence.adequate is True
    expected = "Gaia_BP" if cause == "gaia" else "W3"
    assert expected in evidence.facts["suspect_bands"]
    assert {"epoch": "epoch", "gaia": "colour excess"}.get(cause, cause) in {
        doubt["kind"] for doubt in evidence.facts["doubts"] if doubt["severity"] == "suspicion"
    }


def test_few_bands_left_are_told(run, made):
    flags = {name: HALO for name in ("W1", "W2", "W3", "W4")} | {n: {"cc_flg": "c"} for n in ("H", "Ks")}
    (evidence,) = run([made({"W4": 3.0}, flags)])
    assert any("4 are left to fit" in text for text in evidence.cautions)


def test_a_dip_is_no_fault_of_a_band(run, made):
    def dipping(evidence):
        return replace(evidence, adequate=False, facts={"dip_stands": True})

    (evidence,) = run([made({"W4": 3.0}, {"W4": HALO})], dipping)
    assert evidence.adequate is False and NOT_THE_DATA in evidence.cautions
    (plain,) = run([made(None, {"W4": CLEAN})], lambda e: replace(e, adequate=False))
    assert plain.adequate is False and NOT_THE_DATA in plain.cautions


def test_red_excess_says_how_high_w4_reads(run, made):
    (evidence,) = run([made({"W3": 1.5, "W4": 12.0}, {"W4": CLEAN})])
    assert evidence.facts["w4_reads_high"] > 0
    assert any("22.8 micron" in text for text in evidence.cautions)


def test_carrier_may_be_an_instrument(run, made):
    (evidence,) = run([made({"J": 1.5, "H": 0.7, "Ks": 1.5}, {"J": {"ph_qual": "A"}})])
    assert evidence.facts["carrier_band"] == "2MASS"
    assert evidence.facts["carrier_bands"] == ["J", "H", "Ks"]


def test_candidates_of_different_bands_share_a_run(run, made):
    few = made({"W4": 3.0}, {"W4": HALO})
    few = replace(few, measurements=tuple(m for m in few.measurements if m.band in ("J", "W3", "W4")))
    many = made({"W4": 3.0}, {"W4": HALO})
    first, second = run([few, many])
    assert second.adequate is True
    assert first.facts.get("carrier_band") is None  # taking one of three away leaves nothing to test
    assert first.adequate is False  # refused as it is, and two bands test nothing


def test_evidence_is_plain_json(run, made):
    from tui.model import canonical_json

    (evidence,) = run([made({"W4": 3.0}, {"W4": HALO}, neighbours=(Neighbour(2.0, fluxes_jy={"W4": 1e-3}),))])
    assert canonical_json(evidence.facts)
