"""Depth of a dip against wavelength, with every model that was fitted to it: rows of styled text."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

import numpy as np

from tui.desk.text import p_text, safe, short_band
from tui.desk.widgets.plot_canvas import Canvas, dash_sample
from tui.desk.widgets.plot_legend import COMPONENT_DASH
from tui.desk.widgets.plot_scale import Scale, tick_text, ticks
from tui.desk.widgets.rows import Row, Span, fit_row, hanging
from tui.model import Band, Dip
from tui.workflow.dip_curves import DipCurve

GUTTER = 6  # columns left of the axis
LEAST = (30, 6)
LETTERS = {"grey": "g", "A(lambda), R_V": "A", "lambda^-alpha": "p"}
WORDS = {
    "grey": "grey: one depth",
    "A(lambda), R_V": "A(lambda): the extinction law",
    "lambda^-alpha": "lambda^-alpha: a power law",
}
STEPS = (1.0, 2.0, 5.0)


def dip_plot(
    width: int,
    height: int,
    dips: Sequence[Dip],
    curves: Sequence[DipCurve],
    bands: Mapping[str, Band],
    unicode: bool = True,
) -> list[Row]:
    """One event in `height` rows: depth in percent upwards, log wavelength to the right; then one row a model.

    Args:
        dips: of one event.
        curves: of the same event.
    """
    points = [one for one in dips if one.band in bands and bands[one.band].pivot_um > 0 and math.isfinite(one.depth)]
    if not points:
        return []
    legend = [row for order, curve in enumerate(curves) for row in _legend(width, order, curve, unicode)]
    if width < LEAST[0] or height < LEAST[1]:
        return legend
    canvas, top, bottom = Canvas(width, height, unicode), 0, height - 2
    x, y = _scales(points, curves, bands, width, bottom)
    _axes(canvas, x, y, bottom)
    for order, curve in enumerate(curves):
        _curve(canvas, order, curve, x, y, bottom)
    _points(canvas, points, bands, x, y, (top, bottom))
    return [*(fit_row(line, width) for line in canvas.rows()), *legend]


def _scales(
    points: Sequence[Dip], curves: Sequence[DipCurve], bands: Mapping[str, Band], width: int, bottom: int
) -> tuple[Scale, Scale]:
    """Log micron in dots from the axis on, and percent in dots downwards."""
    pivots = [bands[one.band].pivot_um for one in points]
    low_x, high_x = math.log10(min(pivots)) - 0.06, math.log10(max(pivots)) + 0.06
    errors = [one.depth_error if math.isfinite(one.depth_error) else 0.0 for one in points]
    high = max(one.depth + error for one, error in zip(points, errors, strict=True))
    low = min(0.0, *(one.depth - error for one, error in zip(points, errors, strict=True)))
    drawn = [float(value) for curve in curves for value in (curve.depth.min(), curve.depth.max())]
    high = max([high, *(min(value, 1.5 * high) for value in drawn)])
    room = 0.06 * (high - low) or 0.01
    y = Scale(100 * (low - (room if low < 0 else 0.0)), 100 * (high + room), 4 * bottom, flip=True)
    return Scale(low_x, high_x, 2 * (width - GUTTER - 2)), y


def _axes(canvas: Canvas, x: Scale, y: Scale, bottom: int) -> None:
    axis = 2 * GUTTER + 1
    canvas.vertical(axis, 0, 4 * bottom - 1, "axis", 0, bottom)
    for value in _even(y.low, y.high, max(2, bottom // 2)):
        line = y.cell(value, 4)
        if 0 <= line < bottom:
            canvas.put(line, 0, tick_text(round(value, 6)).rjust(GUTTER - 1), "axis")
            canvas.horizontal(float(y.dot(value)), axis - 1, axis, "axis")
    if y.low < 0 < y.high:
        canvas.horizontal(float(y.dot(0.0)), axis + 1, canvas.width * 2, "zero", 3)
    last, unit = canvas.height - 1, "micron"
    canvas.put(last, canvas.width - len(unit), unit, "axis")
    canvas.put(last, 0, "%".rjust(GUTTER - 1), "axis")
    for value in ticks(x.low, x.high, max(2, (canvas.width - GUTTER) // 6)):
        text = tick_text(value)
        column = GUTTER + 1 + x.cell(math.log10(value), 2) - (len(text) - 1) // 2
        if column + len(text) < canvas.width - len(unit) and canvas.is_free(last, column - 1, len(text) + 2):
            canvas.put(last, column, text, "axis")


def _even(low: float, high: float, room: int) -> list[float]:
    """At most `room` + 1 round values from low to high, evenly spaced.

    >>> _even(0.0, 5.3, 4)
    [0.0, 2.0, 4.0]
    """
    raw = (high - low) / max(room, 1)
    power = 10.0 ** math.floor(math.log10(raw))
    step = next(step * power for step in (*STEPS, 10.0) if step * power >= raw * (1 - 1e-9))
    first = math.ceil(low / step - 1e-9)
    return [float(f"{step * (first + count):.6g}") for count in range(int((high - step * first) / step + 1e-9) + 1)]


def _curve(canvas: Canvas, order: int, curve: DipCurve, x: Scale, y: Scale, bottom: int) -> None:
    dots = np.full(2 * canvas.width, np.nan)
    inside = np.arange(2 * (GUTTER + 1), 2 * (GUTTER + 1) + x.dots)
    log_wave = x.low + (inside - inside[0]) / (x.dots - 1) * (x.high - x.low)
    dots[inside] = y.dot(100 * np.interp(log_wave, np.log10(curve.wave_um), curve.depth))
    canvas.stroke(dots, _style(order), 0, bottom, COMPONENT_DASH[order % len(COMPONENT_DASH)])
    if not canvas.unicode:
        return
    for place in inside[4 + 6 * order :: 8]:  # a letter on each line: no colour is needed to tell them apart
        line = int((dots[place] + 0.5) // 4)
        if 0 <= line < bottom and canvas.is_free(line, place // 2 - 1, 3):
            canvas.put(line, int(place // 2), _letter(curve), _style(order))
            return


def _points(
    canvas: Canvas, points: Sequence[Dip], bands: Mapping[str, Band], x: Scale, y: Scale, rows: tuple[int, int]
) -> None:
    """Depths with their errors, and as many band names above the wavelengths as fit."""
    for one in sorted(points, key=lambda dip: -(abs(dip.depth) / dip.depth_error if dip.depth_error > 0 else 0.0)):
        log_wave = math.log10(bands[one.band].pivot_um)
        x_dot = 2 * (GUTTER + 1) + float(x.dot(log_wave))
        column = int((x_dot + 0.5) // 2)
        ends = [float(y.dot(100 * (one.depth + sign * one.depth_error))) for sign in (-1, 1)]
        if one.depth_error > 0:
            canvas.vertical(x_dot, *ends, "bar", *rows)
        line = y.cell(100 * one.depth, 4)
        if rows[0] <= line < rows[1]:
            canvas.put(line, column, "o", "point")
        name = short_band(one.band)
        start = min(max(column - (len(name) - 1) // 2, GUTTER + 1), canvas.width - len(name))
        if canvas.is_free(rows[1], start, len(name)) and (
            start == 0 or canvas.is_free(rows[1], start - 1, min(len(name) + 2, canvas.width - start + 1))
        ):
            canvas.put(rows[1], start, name, "label")


def _legend(width: int, order: int, curve: DipCurve, unicode: bool) -> list[Row]:
    """One model: its line, what it is, and how well it meets the depths."""
    dash = COMPONENT_DASH[order % len(COMPONENT_DASH)]
    sample = dash_sample(dash) + _letter(curve) if unicode else _PLAIN[order % 4] * 4
    words = f"{WORDS.get(curve.model, safe(curve.model))}  chi2 {curve.chi2:.1f}  dof {curve.dof}  p {p_text(curve.p)}"
    return hanging([Span("  "), Span(sample, _style(order)), Span("  ")], words, width)


_PLAIN = "abcd"


def _style(order: int) -> str:
    return f"component-{'abcd'[order % 4]}"


def _letter(curve: DipCurve) -> str:
    return LETTERS.get(curve.model, "?")
