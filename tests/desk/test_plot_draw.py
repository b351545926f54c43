"""The spectrum plot as text: what is drawn, where, and that nothing is lost at any size."""

from __future__ import annotations

from dataclasses import replace
from time import process_time

import numpy as np
import pytest
from rich.cells import cell_len

from tui.desk.widgets.plot_data import PlotCurve, PlotData, PlotPoint, PlotView
from tui.desk.widgets.plot_draw import draw_spectrum, point_at, strip_height
from tui.desk.widgets.rows import row_text

WAVE = np.geomspace(0.1, 200, 400)
STAR = WAVE**-3 / np.expm1(14387.77 / (WAVE * 5600.0)) * 2.0
DUST = WAVE**-3 / np.expm1(14387.77 / (WAVE * 300.0)) * 2200
PIVOTS = {
    "SDSS_u": 0.36,
    "Gaia_BP": 0.51,
    "Gaia_G": 0.62,
    "J": 1.235,
    "H": 1.65,
    "Ks": 2.16,
    "W1": 3.37,
    "W2": 4.62,
    "W3": 12.1,
    "W4": 22.2,
}
PULLS = {"W3": 8.2, "W4": 6.9, "SDSS_u": -5.3}
SIZES = [(30, 10), (51, 15), (54, 16), (80, 24), (126, 45), (150, 45), (260, 80)]


def make_plot(**changes) -> PlotData:
    total = STAR + DUST
    points = [
        PlotPoint(
            band,
            wave,
            0.85 * wave,
            1.15 * wave,
            flux := float(np.interp(wave, WAVE, total)),
            0.03 * flux,
            0.03 * flux,
            dropped=band == "H",
            pull=PULLS.get(band, 0.4),
        )
        for band, wave in PIVOTS.items()
    ]
    points.append(PlotPoint("MIPS70", 71.4, 62.0, 82.0, 0.01, limit=True, pull=0.0))
    curves = (
        PlotCurve("star", WAVE, STAR, letter="a"),
        PlotCurve("dust", WAVE, DUST, letter="b"),
        PlotCurve("total", WAVE, total, "total"),
    )
    return replace(PlotData(tuple(points), curves), **changes)


def drawn(width: int, height: int, plot: PlotData | None = None, view: PlotView | None = None, **options) -> list[str]:
    return [row_text(line) for line in draw_spectrum(width, height, plot or make_plot(), view or PlotView(), **options)]


@pytest.mark.parametrize("unicode", [True, False])
@pytest.mark.parametrize(("width", "height"), [*SIZES, (1, 1), (0, 0), (29, 9), (300, 10), (30, 90)])
def test_exact_size_at_every_size(width, height, unicode):
    lines = drawn(width, height, unicode=unicode)
    assert len(lines) == height
    assert all(cell_len(line) == width for line in lines)


@pytest.mark.parametrize(("width", "height"), SIZES[2:])
def test_no_title_is_clipped_and_the_marks_are_told(width, height):
    lines = drawn(width, height)
    assert lines[0].startswith("F_nu mJy")
    assert lines[-1].endswith("micron")
    assert any(line.startswith("sigma") for line in lines)
    assert all(word in lines[0] for word in ("total", "a star", "b dust", "x dropped"))


@pytest.mark.parametrize(("width", "height"), SIZES[1:])
def test_strip_has_five_rows_or_more_and_off_scale_pulls_are_numbers(width, height):
    lines = drawn(width, height)
    top = next(index for index, line in enumerate(lines) if line.startswith("sigma")) + 1
    strip = lines[top:-1]
    assert len(strip) == strip_height(height) >= 5
    assert all(number in "\n".join(strip) for number in ("+8.2", "+6.9"))
    assert "^" in strip[0]


def test_low_pulls_have_their_number_at_the_bottom():
    points = tuple(replace(point, pull=-47.0) if point.band == "Ks" else point for point in make_plot().points)
    lines = drawn(80, 24, make_plot(points=points))
    assert "_-47" in lines[-2]


def test_every_point_is_drawn_once_with_its_mark():
    body = "\n".join(drawn(126, 45)[1:32])
    upper = body.split("sigma")[0].replace("micron", "")
    assert upper.count("o") == 9 and upper.count("x") == 1 and upper.count("v") == 1


def test_components_are_told_apart_by_letter_without_colour():
    upper = "\n".join(drawn(80, 24)[1:18])
    assert "a" in upper and "b" in upper


def test_plain_drawing_is_ascii_and_has_the_letters_for_lines():
    lines = drawn(80, 24, unicode=False)
    assert all(line.isascii() for line in lines)
    assert "\n".join(lines).count("b") > 8


def test_narrow_flux_axis_has_at_least_two_numbers():
    for width, height in SIZES[1:]:
        gutter = [line[:5].strip() for line in drawn(width, height)[1 : height - strip_height(height) - 2]]
        assert sum(bool(text) for text in gutter) >= 2


@pytest.mark.parametrize(("width", "height"), [(54, 16), (126, 45)])
def test_point_sits_at_its_wavelength_between_ticks(width, height):
    lines = drawn(width, height)
    axis = lines[-1]
    names = next(line for line in lines if line.startswith("sigma"))
    assert axis.index("10") <= names.index("W3") + 1 <= axis.index("20")


def test_cursor_is_marked_in_both_parts_and_named():
    rows = draw_spectrum(80, 24, make_plot(), PlotView(cursor=8))
    marked = " ".join(span.text for line in rows for span in line if span.style == "cursor")
    assert {"W3", "o", "^+8.2"} == set(marked.split())


def test_zoom_and_pan_stay_inside_and_come_back():
    plot, view = make_plot(), PlotView(cursor=8)
    full = view.shown_x(plot)
    for _ in range(10):
        view = view.zoomed(plot, 0.6)
    low, high = view.shown_x(plot)
    assert high - low == pytest.approx(0.2)
    assert low <= np.log10(12.1) <= high
    for _ in range(60):
        view = view.panned(plot, 0.25)
    assert view.shown_x(plot)[1] <= full[1] + 1e-9
    for _ in range(12):
        view = view.zoomed(plot, 1 / 0.6)
    assert view.x_range is None
    assert "zoomed" in drawn(54, 16, plot, PlotView(x_range=(0.5, 1.2)))[0]


def test_arrows_walk_by_wavelength_and_draw_the_view_along():
    plot = make_plot()
    view = PlotView(x_range=(-0.5, 0.0))
    seen = []
    for _ in range(20):
        view = view.stepped(plot, 1)
        seen.append(plot.points[view.cursor].wave_um)
        low, high = view.shown_x(plot)
        assert low <= np.log10(seen[-1]) <= high
    assert seen == sorted(seen) and seen[-1] == 71.4
    assert PlotView().stepped(plot, -1).cursor == 10


def test_nu_f_nu_shows_other_numbers_in_its_unit():
    lines = drawn(80, 24, view=PlotView(nu_fnu=True))
    assert lines[0].startswith("nu F_nu W/m2")
    assert any("1e-1" in line[:5] for line in lines)


@pytest.mark.parametrize(
    "points",
    [
        (),
        (PlotPoint("J", 1.2, 1.1, 1.3, -0.5, 0.1, 0.1, pull=-4.0),),
        (PlotPoint("J", 1.2, 1.1, 1.3, 0.0, 0.1, 0.1),),
        (PlotPoint("J", 1.2, 1.1, 1.3, 1e-30, 1.0, 1.0, pull=float("nan")),),
        (PlotPoint("J", 1.2, 1.2, 1.2, 1e30, 0.0, 0.0, pull=1e300),),
        (PlotPoint("x", 1e-9, 1e-9, 1e-9, 1.0), PlotPoint("y", 1e9, 1e9, 1e9, 1e-9)),
        (PlotPoint("[/]\x1b日本", 1.0, 0.9, 1.1, 1.0, pull=5.0),),
    ],
    ids=["none", "negative", "zero", "tiny", "huge", "far apart", "hostile name"],
)
def test_odd_points_are_drawn_without_harm(points):
    for curves in ((), make_plot().curves):
        lines = drawn(54, 16, PlotData(points, curves))
        assert all(cell_len(line) == 54 and line.isprintable() for line in lines)


def test_negative_flux_is_marked_below_the_scale():
    points = (*make_plot().points, PlotPoint("IRAS60", 60.0, 50.0, 70.0, -0.01, 0.02, 0.02))
    lines = drawn(80, 24, make_plot(points=points))
    assert "_" in lines[24 - strip_height(24) - 3]


def test_message_stands_in_the_plot_when_there_is_no_curve():
    assert any(
        "computing the evidence" in line
        for line in drawn(54, 16, make_plot(curves=(), message="computing the evidence ..."))
    )


def test_click_finds_the_point_and_misses_politely():
    plot = make_plot()
    lines = drawn(80, 24, plot)
    names = next(line for line in lines if line.startswith("sigma"))
    assert plot.points[point_at(80, 24, plot, PlotView(), names.index("W4"), 20)].band == "W4"
    assert point_at(80, 24, plot, PlotView(), 79, 2) is None
    assert point_at(5, 5, plot, PlotView(), 1, 1) is None


@pytest.mark.parametrize(("width", "height"), [(54, 16), (150, 45)])
def test_drawing_takes_a_few_milliseconds(width, height):
    plot, view = make_plot(), PlotView(cursor=3)
    best = min(_timed(lambda: draw_spectrum(width, height, plot, view)) for _ in range(12))
    assert best < 0.015  # measured 2 and 4 ms on an idle core; the rest is for a busy one


def _timed(job) -> float:
    start = process_time()
    job()
    return process_time() - start
