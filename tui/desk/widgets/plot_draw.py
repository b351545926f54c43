"""The spectrum plot as rows of styled text: log-log fluxes above, pulls in sigma below. Pure: no terminal needed."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from rich.cells import cell_len

from tui.desk.text import safe, short_band, wrap
from tui.desk.widgets.plot_canvas import Canvas
from tui.desk.widgets.plot_data import NU_FNU, PlotCurve, PlotData, PlotPoint, PlotView, quantity, shown_y
from tui.desk.widgets.plot_legend import COMPONENT_DASH, OTHER_DASH, SPECTRUM_DASH, TOTAL_DASH, header
from tui.desk.widgets.plot_residuals import draw_residuals
from tui.desk.widgets.plot_scale import Scale, flux_unit, tick_text, ticks
from tui.desk.widgets.rows import Row, fit_row, fit_rows, paragraph
from tui.model import FloatArray

GUTTER = 6  # columns left of the axis: "0.001" and a space
LEAST = (30, 10)  # columns, rows: below this nothing can be read
CLEAR_DOTS = 12.0  # a letter this far from other curves is clear of them


@dataclass(frozen=True, slots=True)
class Frame:
    """Where the parts of a plot lie (cell rows and columns), and its two scales (in dots)."""

    left: int
    right: int  # one past the last column
    top: int
    bottom: int  # one past the last row of fluxes
    strip: int  # first row of the residual strip
    strip_rows: int
    x: Scale
    y: Scale

    def x_dot(self, wave_um: float) -> float:
        """Dot column of a wavelength, counted from the canvas's own left edge."""
        return 2 * self.left + float(self.x.dot(math.log10(wave_um)))

    def column(self, wave_um: float) -> int:
        """Cell column of a wavelength."""
        return int((self.x_dot(wave_um) + 0.5) // 2)

    def y_dot(self, log_flux: float) -> float:
        """Dot row of a log flux."""
        return 4 * self.top + float(self.y.dot(log_flux))

    def holds(self, column: int) -> bool:
        """Whether a cell column lies inside."""
        return self.left <= column < self.right


class Line(NamedTuple):
    """A curve in dots: its row at every dot column, shape (2 width,), and how it is drawn."""

    dots: FloatArray
    style: str
    dash: tuple[int, int]
    letter: str = ""


def draw_spectrum(width: int, height: int, plot: PlotData, view: PlotView, unicode: bool = True) -> list[Row]:
    """A whole plot in exactly `height` rows of `width` columns, each a list of (text, style, action) spans.

    Args:
        plot: points and curves, in Jy and micron.
        view: zoom, quantity and cursor.
        unicode: braille dots; without them letters and plain marks that any terminal has.
    """
    if width < LEAST[0] or height < LEAST[1]:
        return fit_rows(
            paragraph(f"The plot needs {LEAST[0]} columns and {LEAST[1]} rows.", width, "label"), width, height
        )
    frame = _frame(width, height, plot, view)
    canvas = Canvas(width, height - 1, unicode)
    _draw_axes(canvas, frame, view)
    _draw_cursor(canvas, frame, plot, view)
    lines = _lines(canvas, frame, plot, view)
    for line in lines:
        canvas.stroke(line.dots, line.style, frame.top, frame.bottom, line.dash)
    draw_points(canvas, frame, plot, view)
    draw_residuals(canvas, frame, plot, view)
    _draw_band_names(canvas, frame, plot, view)
    _draw_message(canvas, frame, plot)
    _draw_letters(canvas, frame, lines)
    return [header(width, plot, view, frame.y.high, unicode), *(fit_row(line, width) for line in canvas.rows())]


def strip_height(height: int) -> int:
    """Rows of the residual strip: odd, five at least, about a quarter of the plot."""
    rows = min(max(5, height // 4), 13)
    return rows if rows % 2 else rows - 1


def _frame(width: int, height: int, plot: PlotData, view: PlotView) -> Frame:
    strip = strip_height(height)
    bottom = height - 1 - strip - 2  # the header is not on the canvas; band names and wavelengths take one row each
    left, right = GUTTER + 1, width - 1
    low_x, high_x = view.shown_x(plot)
    low_y, high_y = shown_y(plot, view)
    x = Scale(low_x, high_x, 2 * (right - left))
    y = Scale(low_y, high_y, 4 * bottom, flip=True)
    return Frame(left, right, 0, bottom, bottom + 1, strip, x, y)


def _draw_axes(canvas: Canvas, frame: Frame, view: PlotView) -> None:
    axis_dot = 2 * frame.left - 1
    for top, bottom in ((frame.top, frame.bottom), (frame.strip, frame.strip + frame.strip_rows)):
        canvas.vertical(axis_dot, 4 * top, 4 * bottom - 1, "axis", top, bottom)
    power = 0 if view.nu_fnu else flux_unit(frame.y.high)[0]
    room = max(2, 3 * (frame.bottom - frame.top) // 4)
    for value in ticks(frame.y.low - power, frame.y.high - power, room):
        line = int((frame.y_dot(math.log10(value) + power) + 0.5) // 4)
        if frame.top <= line < frame.bottom:
            canvas.put(line, 0, tick_text(value).rjust(GUTTER - 1), "axis")
            canvas.horizontal(frame.y_dot(math.log10(value) + power), axis_dot - 1, axis_dot, "axis")
    _draw_wavelengths(canvas, frame)


def _draw_wavelengths(canvas: Canvas, frame: Frame) -> None:
    line = canvas.height - 1
    unit = "micron"
    canvas.put(line, canvas.width - len(unit), unit, "axis")
    room = max(2, (frame.right - frame.left) // 5)
    last_strip = frame.strip + frame.strip_rows - 1
    for value in ticks(frame.x.low, frame.x.high, room):
        text = tick_text(value)
        column = frame.column(value)
        start = column - (len(text) - 1) // 2
        if start + len(text) < canvas.width - len(unit) and canvas.is_free(line, start - 1, len(text) + 2):
            canvas.put(line, start, text, "axis")
            if frame.bottom - frame.top >= 16:
                canvas.vertical(
                    frame.x_dot(value), 4 * frame.top, 4 * frame.bottom - 1, "grid", frame.top, frame.bottom, 4
                )
            canvas.vertical(
                frame.x_dot(value), 4 * last_strip + 3, 4 * last_strip + 3, "axis", last_strip, last_strip + 1
            )


def _draw_cursor(canvas: Canvas, frame: Frame, plot: PlotData, view: PlotView) -> None:
    if view.cursor is None or view.cursor >= len(plot.points):
        return
    x_dot = frame.x_dot(plot.points[view.cursor].wave_um)
    if frame.holds(int((x_dot + 0.5) // 2)):
        bottom = frame.strip + frame.strip_rows
        canvas.vertical(x_dot, 4 * frame.top, 4 * bottom - 1, "cursor-line", frame.top, bottom, 2)


def _lines(canvas: Canvas, frame: Frame, plot: PlotData, view: PlotView) -> list[Line]:
    """Every curve as the canvas draws it; a component's place among the components picks its dashes and colour."""
    lines, turn = [], 0
    for curve in plot.curves:
        dots = _curve_dots(frame, curve, view, canvas.dots.shape[1])
        if curve.role == "component":
            lines.append(Line(dots, f"component-{'abcd'[turn % 4]}", COMPONENT_DASH[turn % 4], curve.letter))
            turn += 1
        else:
            dash = {"total": TOTAL_DASH, "other": OTHER_DASH}.get(curve.role, SPECTRUM_DASH)
            lines.append(Line(dots, curve.role, dash, curve.letter))
    return lines


def _curve_dots(frame: Frame, curve: PlotCurve, view: PlotView, columns: int) -> FloatArray:
    """Dot row of the curve at every dot column of the canvas, NaN outside frame and curve."""
    dots = np.full(columns, np.nan)
    if curve.wave_um.size < 2:
        return dots
    inside = np.arange(2 * frame.left, 2 * frame.right)
    log_wave = frame.x.low + (inside - 2 * frame.left) / (frame.x.dots - 1) * (frame.x.high - frame.x.low)
    values = quantity(curve.flux_jy, curve.wave_um, view.nu_fnu)
    dots[inside] = 4 * frame.top + frame.y.dot(
        np.interp(log_wave, np.log10(curve.wave_um), values, left=np.nan, right=np.nan)
    )
    return dots


def draw_points(canvas: Canvas, frame: Frame, plot: PlotData, view: PlotView) -> None:
    """Points with error bars and band widths; the one under the cursor last, so that it lies on top."""
    order = sorted(range(len(plot.points)), key=lambda index: (index == view.cursor, not plot.points[index].dropped))
    for index in order:
        point = plot.points[index]
        column = frame.column(point.wave_um)
        if frame.holds(column):
            _draw_point(canvas, frame, point, view, column, "cursor" if index == view.cursor else "")


def _draw_point(canvas: Canvas, frame: Frame, point: PlotPoint, view: PlotView, column: int, style: str) -> None:
    scale = NU_FNU / point.wave_um if view.nu_fnu else 1.0
    ends = [_log(flux * scale) for flux in (point.flux_jy - point.error_low_jy, point.flux_jy + point.error_high_jy)]
    bottom_dot = 4 * frame.bottom - 1
    low, high = (frame.y_dot(end) if math.isfinite(end) else bottom_dot for end in ends)
    centre = _log(point.flux_jy * scale)
    y_dot = frame.y_dot(centre) if math.isfinite(centre) else math.inf
    mark, mark_style = _mark(point)
    if y_dot > bottom_dot:
        canvas.put(frame.bottom - 1, column, "_", style or "far")
        return
    if y_dot < 4 * frame.top - 0.5:
        canvas.put(frame.top, column, "^", style or "far")
        return
    if not point.limit and point.error_high_jy > 0:
        canvas.vertical(frame.x_dot(point.wave_um), low, high, "bar", frame.top, frame.bottom)
    canvas.horizontal(y_dot, max(frame.x_dot(point.low_um), 2 * frame.left),
                      min(frame.x_dot(point.high_um), 2 * frame.right - 1), "width")  # fmt: skip
    canvas.put(int((y_dot + 0.5) // 4), column, mark, style or mark_style)


def _mark(point: PlotPoint) -> tuple[str, str]:
    if point.dropped:
        return "x", "dropped"
    return ("v", "limit") if point.limit else ("o", "point")


def _log(flux: float) -> float:
    return math.log10(flux) if flux > 0 else -math.inf


def _draw_band_names(canvas: Canvas, frame: Frame, plot: PlotData, view: PlotView) -> None:
    """Between fluxes and pulls, as many names as fit: the cursor's first, then by size of pull."""
    line = frame.bottom
    canvas.put(line, 0, "sigma".rjust(GUTTER - 1), "axis")

    def weight(index: int) -> tuple[bool, float]:
        pull = plot.points[index].pull
        return index != view.cursor, -abs(pull) if math.isfinite(pull) else 1.0

    named: set[str] = set()
    for index in sorted(range(len(plot.points)), key=weight):
        point = plot.points[index]
        name = short_band(point.band)
        column = frame.column(point.wave_um)
        start = min(max(column - (len(name) - 1) // 2, frame.left), frame.right - len(name))
        if name in named or not frame.holds(column) or not canvas.is_free(line, start, len(name)):
            continue
        if all(canvas.is_free(line, side, 1) for side in (start - 1, start + len(name)) if 0 <= side < canvas.width):
            canvas.put(line, start, name, "cursor" if index == view.cursor else "label")
            named.add(name)


def _draw_message(canvas: Canvas, frame: Frame, plot: PlotData) -> None:
    if not plot.message:
        return
    room = frame.right - frame.left - 2
    for line, text in enumerate(wrap(safe(plot.message), room)[:3], start=frame.top):
        column = frame.left + 2 + max(0, (room - cell_len(text)) // 2)
        canvas.wipe(line, column - 1, cell_len(text) + 2)
        canvas.put(line, column, text, "label")


def _draw_letters(canvas: Canvas, frame: Frame, lines: list[Line]) -> None:
    """Each letter on its own curve where it stands clear of everything, so that lines need no colour."""
    for line in lines:
        if line.letter and canvas.unicode:
            others = [other.dots for other in lines if other is not line and (other.letter or other.style == "total")]
            _put_letter(canvas, frame, line, others)


def _put_letter(canvas: Canvas, frame: Frame, line: Line, others: list[FloatArray]) -> None:
    own = line.dots
    with np.errstate(invalid="ignore"):
        places = np.flatnonzero((own > 4 * frame.top + 1) & (own < 4 * frame.bottom - 2))
    if not places.size:
        return
    away = np.full(places.size, CLEAR_DOTS)
    for dots in others:
        away = np.minimum(away, np.nan_to_num(np.abs(dots[places] - own[places]), nan=CLEAR_DOTS))
    from_middle = np.abs(places - np.median(places)) / own.size
    best_first = places[np.argsort(from_middle * CLEAR_DOTS / 2 - away, kind="stable")]
    for place in best_first[:: max(1, places.size // 40)]:
        row_index, column = int((own[place] + 0.5) // 4), int(place // 2)
        if canvas.is_free(row_index, column - 1, 3):
            canvas.put(row_index, column, line.letter, line.style)
            return


def point_at(width: int, height: int, plot: PlotData, view: PlotView, column: int, line: int) -> int | None:
    """Index of the point nearest to a cell of the plot, within a few columns; None where there is none."""
    if width < LEAST[0] or height < LEAST[1]:
        return None
    frame = _frame(width, height, plot, view)
    best, reach = None, 4.0
    for index, point in enumerate(plot.points):
        at = frame.column(point.wave_um)
        if not frame.holds(at):
            continue
        scale = NU_FNU / point.wave_um if view.nu_fnu else 1.0
        height_of = _log(point.flux_jy * scale)
        own_line = (frame.y_dot(height_of) + 0.5) // 4 + 1 if height_of > -300 else frame.bottom
        apart = abs(at - column) + (0.3 * abs(own_line - line) if line <= frame.bottom else 0.0)
        if apart < reach:
            best, reach = index, apart
    return best
