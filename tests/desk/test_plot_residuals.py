"""The strip of pulls: points of a candidate's own spectrum stand between its bands."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest

from tui.desk.screens.questions import question
from tui.desk.widgets.plot_data import PlotCurve, PlotData, PlotPoint, PlotView, SpectrumPulls
from tui.desk.widgets.plot_draw import draw_spectrum, strip_height
from tui.desk.widgets.plot_points import spectrum_pulls
from tui.desk.widgets.rows import row_text
from tui.model import Candidate, Evidence, Fit, Spectrum

WAVE = np.array([0.50, 0.55, 0.60, 0.65])
FLUX = np.array([1.0, 2.0, 3.0, 4.0])
CANDIDATE = Candidate("SM-1", spectrum=Spectrum(WAVE, FLUX, np.full(4, 0.5)))


def fit_with(**pulls: float) -> Fit:
    return Fit("star", 1.0, 1, 0.5, 1.0, 1.0, pulls={name.replace("_", ":"): pull for name, pull in pulls.items()})


def test_points_that_were_fitted_have_the_fits_own_pulls_by_wavelength():
    fit = Fit("star", 1.0, 1, 0.5, 1.0, 1.0, pulls={"J": 0.4, "spectrum:0.6": -7.5, "spectrum:0.5": 1.5})
    found = spectrum_pulls(CANDIDATE, fit, None)
    assert found.fitted and found.wave_um.tolist() == [0.5, 0.6] and found.pulls.tolist() == [1.5, -7.5]


def test_points_that_were_not_are_held_against_the_drawn_curve_in_their_own_errors():
    """(1 - 2)/0.5 = -2, (2 - 2)/0.5 = 0 and so on, under a flat curve of 2 Jy that ends at 0.62 micron."""
    curve = SimpleNamespace(wave_um=np.array([0.4, 0.62]), total_jy=np.array([2.0, 2.0]), components={})
    found = spectrum_pulls(CANDIDATE, fit_with(J=0.1), curve)
    assert not found.fitted and found.wave_um.tolist() == [0.5, 0.55, 0.6]
    assert found.pulls == pytest.approx([-2.0, 0.0, 2.0])


def test_without_a_spectrum_or_a_curve_there_are_none():
    curve = SimpleNamespace(wave_um=WAVE, total_jy=FLUX, components={})
    assert spectrum_pulls(Candidate("SM-1"), fit_with(J=0.1), curve) is None
    assert spectrum_pulls(CANDIDATE, None, None) is None


def strip_of(plot: PlotData, size=(54, 16), unicode: bool = True) -> list[list]:
    rows = draw_spectrum(*size, plot, PlotView(), unicode)
    return rows[-1 - strip_height(size[1]) : -1]


def make_plot(pulls, fitted: bool = True) -> PlotData:
    points = tuple(
        PlotPoint(name, wave, 0.95 * wave, 1.05 * wave, 1.0, pull=0.5) for name, wave in (("V", 0.45), ("J", 1.2))
    )
    curve = PlotCurve("spectrum", WAVE, FLUX, "spectrum")
    return PlotData(points, (curve,), SpectrumPulls(WAVE, np.array(pulls), fitted))


@pytest.mark.parametrize("unicode", [True, False])
def test_spectrum_points_appear_in_the_strip_above_below_and_beyond_its_scale(unicode):
    for pulls, wanted in (([2.5] * 4, {0, 1}), ([-2.5] * 4, {3, 4}), ([40.0] * 4, {0}), ([-40.0] * 4, {4})):
        lines = strip_of(make_plot(pulls), unicode=unicode)
        drawn = {number for number, line in enumerate(lines) if any(span.style == "spectrum" for span in line)}
        assert drawn and drawn <= wanted, pulls


def test_bands_keep_their_marks_among_the_points():
    text = "\n".join(row_text(line) for line in strip_of(make_plot([0.5] * 4), size=(150, 45)))
    assert text.count("o") == 2


@pytest.mark.parametrize(("fitted", "said"), [(True, "spectrum"), (False, "spectrum, not fitted")])
def test_the_legend_says_whether_the_spectrum_is_in_the_fit(fitted, said):
    head = row_text(draw_spectrum(80, 24, make_plot([0.1] * 4, fitted), PlotView())[0])
    assert f" {said} " in head and ("not fitted" in head) is not fitted


def test_a_question_names_tens_of_points_as_one_spectrum():
    pulls = {"W3": 9.0} | {f"spectrum:{wave:.3g}": 5.0 for wave in np.linspace(0.4, 0.9, 40)}
    fit = Fit("star", 1.0, 1, 0.5, 1.0, 1.0, pulls=pulls)
    asked = question("dust", {"star": Evidence("star", 1, None, (fit,), ())}, room=78)
    assert asked == "Can warm dust near the star make W3 and its spectrum this bright?"
