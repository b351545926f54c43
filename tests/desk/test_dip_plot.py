"""Depth against wavelength: points where they belong, a line a model, exact rows at any size."""

from __future__ import annotations

import numpy as np
import pytest

from tui.desk.widgets.dip_plot import dip_plot
from tui.desk.widgets.rows import row_text, row_width
from tui.model import Band, Dip
from tui.workflow.dip_curves import DipCurve

PIVOTS = {"B": 0.44, "V": 0.55, "Rc": 0.64, "Ic": 0.79, "J": 1.24}
BANDS = {
    name: Band(name, wave, "Vega", 1.0, 0.02, "any", np.array([wave]), np.ones(1)) for name, wave in PIVOTS.items()
}
DIPS = [Dip("June", name, 0.2 * (0.55 / wave), 0.01) for name, wave in PIVOTS.items()]
WAVE = np.geomspace(0.4, 1.4, 50)
CURVES = [
    DipCurve("June", "lambda^-alpha", 3.0, 3, 0.4, WAVE, 0.2 * 0.55 / WAVE),
    DipCurve("June", "A(lambda), R_V", 5.0, 3, 0.2, WAVE, 0.22 * 0.55 / WAVE),
    DipCurve("June", "grey", 78.0, 4, 5e-16, WAVE, np.full(50, 0.13)),
]


@pytest.mark.parametrize("unicode", [True, False])
@pytest.mark.parametrize("size", [(78, 12), (40, 8), (198, 40), (30, 6)])
def test_rows_are_exact_and_the_bluest_stands_highest(size, unicode):
    rows = dip_plot(*size, DIPS, CURVES, BANDS, unicode)
    assert all(row_width(line) <= size[0] for line in rows)
    plot = [row_text(line) for line in rows[: size[1]]]
    places = [(line, text.index("o")) for line, text in enumerate(plot[: size[1] - 2]) if "o" in text]
    assert places and places == sorted(places, key=lambda one: (one[0], one[1]))
    assert "micron" in plot[-1] and "%" in plot[-1] and "B" in plot[-2] and "J" in plot[-2]
    assert unicode or all(text.isascii() for text in plot)


def test_models_are_told_apart_by_letter_and_word():
    rows = [row_text(line) for line in dip_plot(78, 14, DIPS, CURVES, BANDS)]
    legend = "\n".join(rows[14:])
    assert "grey: one depth  chi2 78.0" in legend and "extinction law" in legend and "a power law" in legend
    drawn = "".join(rows[:12])
    assert all(letter in drawn for letter in "Agp")


def test_ticks_are_in_percent():
    rows = [row_text(line) for line in dip_plot(78, 14, DIPS, CURVES, BANDS)]
    assert any(text.startswith("   20 ") for text in rows) and any(text.startswith("    0 ") for text in rows)


def test_brightenings_and_faulty_rows_are_drawn_or_left_out_in_peace():
    rows = dip_plot(60, 12, [Dip("x", "J", -0.05, 0.01), Dip("x", "V", 0.0, float("nan"))], [], BANDS)
    assert sum("o" in row_text(line)[6:54] for line in rows[:10]) == 2
    assert dip_plot(60, 12, [Dip("x", "nowhere", 0.1, 0.01), Dip("x", "J", float("nan"), 0.1)], [], BANDS) == []
