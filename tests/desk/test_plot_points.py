"""From a candidate and its evidence to what the plot draws, and the point under the cursor in words."""

from __future__ import annotations

import math
from types import SimpleNamespace

import numpy as np
import pytest

from tui.desk.widgets.plot_data import PlotData
from tui.desk.widgets.plot_points import band_ends, plot_curves, plot_points, point_words
from tui.model import Band, Candidate, Fit, Measurement

NAN = math.nan


def band(name: str, pivot: float, wave=None, response=None) -> Band:
    wave = np.array([pivot]) if wave is None else np.array(wave)
    return Band(
        name, pivot, "Vega", 1.0, 0.02, "any", wave, np.ones(wave.size) if response is None else np.array(response)
    )


BANDS = {
    "J": band("J", 1.235),
    "W3": band("W3", 12.07, [7.0, 9.0, 12.0, 16.0, 18.0], [0.0, 0.6, 1.0, 0.6, 0.0]),
    "W4": band("W4", 22.2),
}
CANDIDATE = Candidate(
    "SM-1",
    (
        Measurement("J", 0.1, 0.002, source="2MASS"),
        Measurement("J", 0.11, 0.003, source="other", exclude=True),
        Measurement("W3", 0.02, NAN, flags={"cc_flags": "d[/]\x1b"}),
        Measurement("W4", 0.01, NAN, limit=True, nsigma=2.0),
        Measurement("nowhere", 1.0, 0.1),
    ),
)
FIT = Fit("star", 1.0, 1, 0.5, 1.0, 1.0, pulls={"J": 0.4, "W3": 8.2, "W4": 0.0})
DRAWN = [one for one in CANDIDATE.measurements if one.band in BANDS]


def test_points_carry_errors_limits_pulls_and_what_was_left_out():
    points = plot_points(CANDIDATE, BANDS, FIT, fitted=("J", "W3", "W4"), dropped={"W3"})
    assert [point.band for point in points] == ["J", "J", "W3", "W4"]
    assert [point.dropped for point in points] == [False, True, True, False]
    assert points[2].error_high_jy == pytest.approx(0.02 * 0.02)  # no error given: the band's floor
    assert points[3].limit and points[3].error_high_jy == 0
    assert [point.pull for point in points] == [0.4, 0.4, 8.2, 0.0]
    assert [one.band for one in DRAWN] == [point.band for point in points]


def test_band_not_fitted_is_drawn_as_left_out():
    points = plot_points(CANDIDATE, BANDS, FIT, fitted=("J",))
    assert [point.dropped for point in points] == [False, True, True, True]


def test_band_ends_are_where_the_response_is_half_its_peak():
    assert band_ends(BANDS["W3"]) == (9.0, 16.0)
    low, high = band_ends(BANDS["J"])
    assert low < 1.235 < high


def test_compared_fit_gives_second_pulls():
    points = plot_points(CANDIDATE, BANDS, FIT, other=Fit("other", 1, 1, 1, 1, 1, pulls={"W3": -1.0}))
    assert points[2].other_pull == -1.0 and math.isnan(points[0].other_pull)


def test_curves_have_letters_by_component_and_one_total():
    wave = np.array([1.0, 2.0])
    two = SimpleNamespace(wave_um=wave, total_jy=wave, components={"star": wave, "dust\x1b": wave})
    lines = plot_curves(two, two, "warm dust")
    assert [(line.role, line.letter, line.label) for line in lines] == [
        ("component", "a", "star"),
        ("component", "b", "dust\ufffd"),
        ("total", "", "total"),
        ("other", "+", "warm dust"),
    ]
    alone = SimpleNamespace(wave_um=wave, total_jy=wave, components={"star": wave})
    assert [line.role for line in plot_curves(alone)] == ["total"]
    assert plot_curves(None) == ()


@pytest.mark.parametrize(
    ("index", "words"),
    [
        (0, "J 1.24 micron: 100 +- 2.0 mJy (fit error at least 2.8), 0.4 sigma above the model"),
        (2, "W3 12.1 micron: 20.0 mJy, 8.2 sigma above the model, not fitted; cc_flags d[/]\ufffd"),
        (3, "W4 22.2 micron: below 10.0 mJy (2 sigma), limit met"),
    ],
)
def test_point_in_words(index, words):
    plot = PlotData(plot_points(CANDIDATE, BANDS, FIT, dropped={"W3"}))
    assert point_words(plot, index, DRAWN[index]) == words


def test_a_band_that_the_drawn_fit_did_without_is_no_used_point():
    """The check of the instrument fits the star without its suspects: they stand in the plot as what they are."""
    fit = Fit("star without W3", 1.0, 1, 0.5, 1.0, 1.0, pulls={"J": 0.4, "W4": 0.0})
    points = plot_points(CANDIDATE, BANDS, fit, fitted=("J", "W3", "W4"))
    assert [point.dropped for point in points if point.band == "W3"] == [True]
    assert not any(point.dropped for point in points if point.band == "W4")
