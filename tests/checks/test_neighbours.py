"""Leaks of neighbours into a band's fit."""

from __future__ import annotations

import pytest

from tui.checks.neighbours import neighbour_doubts, neighbour_leaks, neighbour_sentences
from tui.data.load import bands
from tui.model import Candidate, Measurement, Neighbour

BANDS = bands()


def candidate(*neighbours):
    return Candidate("one", (Measurement("W3", 0.010, 0.0002), Measurement("J", 1.0, 0.02)), {}, neighbours)


def test_leak_is_summed_over_neighbours():
    # One FWHM away a quarter of the flux leaks, exp(-2 ln 2) = 1/4; far away nothing does.
    beam = BANDS["W3"].beam_fwhm_arcsec
    star = candidate(Neighbour(beam, fluxes_jy={"W3": 0.004}), Neighbour(0.0, fluxes_jy={"W3": 0.001}),
                     Neighbour(60.0, fluxes_jy={"W3": 5.0, "J": 2.0}))  # fmt: skip
    leaks = {leak.band: leak for leak in neighbour_leaks(star, BANDS, {"W3": 0.004, "J": -0.1})}
    assert leaks["W3"].leak_jy == pytest.approx(0.002)
    assert leaks["W3"].share == pytest.approx(0.2)
    assert leaks["W3"].anomaly_share == pytest.approx(0.5)
    assert leaks["W3"].n_in_beam == 1 and leaks["W3"].nearest_arcsec == 0.0
    assert leaks["J"].leak_jy < 1e-100 and leaks["J"].anomaly_share != leaks["J"].anomaly_share  # NaN: J is faint


def test_only_leaks_beyond_error_and_floor_are_suspicions():
    floor = BANDS["W3"].floor
    for leaked, is_suspicion in ((0.5 * floor, False), (2 * floor, True)):
        star = candidate(Neighbour(0.0, fluxes_jy={"W3": leaked * 0.010}))
        (doubt,) = neighbour_doubts(star, BANDS, neighbour_leaks(star, BANDS))
        assert (doubt.band, doubt.is_suspicion) == ("W3", is_suspicion)


def test_sentences_speak_of_the_anomaly():
    star = candidate(Neighbour(0.0, fluxes_jy={"W3": 0.005}))
    assert neighbour_sentences(neighbour_leaks(star, BANDS, {"W3": 0.010}))[0].endswith(
        "makes 50 % of what the star alone leaves over."
    )
    assert "makes all" in neighbour_sentences(neighbour_leaks(star, BANDS, {"W3": 0.004}))[0]
    assert neighbour_sentences(neighbour_leaks(star, BANDS)) == ()


def test_no_neighbours_no_leaks():
    assert neighbour_leaks(candidate(), BANDS) == []
