"""The strip of pulls under a plot: (measured - model)/sigma, with what lies off the scale written as a number.

Points of the candidate's own spectrum are dots between the bands; they have no numbers, there are too many.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from tui.desk.widgets.plot_canvas import Canvas
from tui.desk.widgets.plot_data import PlotData, PlotPoint, PlotView

if TYPE_CHECKING:
    from tui.desk.widgets.plot_draw import Frame

SPANS = (3.0, 5.0, 10.0)  # sigma: half heights of the strip
INSIDE = 0.6  # share of the points that the strip must hold: the rest may be written as numbers


def strip_span(plot: PlotData) -> float:
    """Half height of the strip in sigma: the smallest that holds most of the points."""
    sizes = sorted(abs(point.pull) for point in plot.points if math.isfinite(point.pull))
    if not sizes:
        return SPANS[0]
    reach = sizes[min(len(sizes) - 1, int(INSIDE * len(sizes)))]
    return next((span for span in SPANS if reach <= span), SPANS[-1])


def draw_residuals(canvas: Canvas, frame: Frame, plot: PlotData, view: PlotView) -> None:
    """Stems from zero to each pull; off the scale an arrow and the number."""
    span, top, rows = strip_span(plot), frame.strip, frame.strip_rows
    middle = top + rows // 2
    for line, value in ((top, span), (middle, 0.0), (top + rows - 1, -span)):
        canvas.put(line, 0, f"{value:+.0f}".rjust(5) if value else "0".rjust(5), "axis")
    canvas.horizontal(4 * middle + 1.5, 2 * frame.left, 2 * frame.right - 1, "zero", every=2)
    for inner in (-span, span):
        canvas.horizontal(_y(inner, span, top, rows), 2 * frame.left, 2 * frame.right - 1, "grid", every=6)
    _draw_spectrum(canvas, frame, plot, span)
    order = sorted(
        range(len(plot.points)), key=lambda index: (index == view.cursor, abs(_finite(plot.points[index].pull)))
    )
    for index in order:
        point = plot.points[index]
        if frame.holds(frame.column(point.wave_um)):
            _draw_pull(canvas, frame, point, span, "cursor" if index == view.cursor else "")
    for index in reversed(order):
        point = plot.points[index]
        if frame.holds(frame.column(point.wave_um)) and abs(_finite(point.pull)) > span:
            _write_pull(canvas, frame, point, "cursor" if index == view.cursor else "far")


def _draw_spectrum(canvas: Canvas, frame: Frame, plot: PlotData, span: float) -> None:
    """The points of the spectrum as dots, off the scale along its very edge; the bands' marks lie above them."""
    if plot.spectrum is None:
        return
    top, rows = frame.strip, frame.strip_rows
    for wave, pull in zip(plot.spectrum.wave_um.tolist(), plot.spectrum.pulls.tolist(), strict=True):
        column = frame.column(wave)
        if not frame.holds(column) or not math.isfinite(pull):
            continue
        place = _y(pull, span, top, rows)
        if abs(pull) > span:
            place = 4 * top if pull > 0 else 4 * (top + rows) - 1
        canvas.vertical(frame.x_dot(wave), place, place + (abs(pull) <= span), "spectrum", top, top + rows)


def pull_text(pull: float) -> str:
    """A pull as short as it can stand: +8.2, -12, +3e4.

    >>> [pull_text(pull) for pull in (8.21, -12.4, 31234.0)]
    ['+8.2', '-12', '+3e4']
    """
    if abs(pull) < 9.95:
        return f"{pull:+.1f}"
    if abs(pull) < 9999.5:
        return f"{pull:+.0f}"
    mantissa, power = f"{pull:+.0e}".split("e")
    return f"{mantissa}e{int(power)}"


def _draw_pull(canvas: Canvas, frame: Frame, point: PlotPoint, span: float, style: str) -> None:
    top, rows = frame.strip, frame.strip_rows
    column, middle_dot = frame.column(point.wave_um), 4 * (top + rows // 2) + 1.5
    if math.isfinite(point.other_pull):
        _put_mark(canvas, frame, point.other_pull, span, column, "+", "other")
    if not math.isfinite(point.pull):
        return
    if abs(point.pull) > span:
        canvas.vertical(
            frame.x_dot(point.wave_um), middle_dot, _y(point.pull, span, top, rows), "stem", top, top + rows
        )
        canvas.put(top if point.pull > 0 else top + rows - 1, column, "^" if point.pull > 0 else "_", style or "far")
        return
    canvas.vertical(frame.x_dot(point.wave_um), middle_dot, _y(point.pull, span, top, rows), "stem", top, top + rows)
    mark, mark_style = ("x", "dropped") if point.dropped else ("v", "limit") if point.limit else ("o", "point")
    _put_mark(canvas, frame, point.pull, span, column, mark, style or mark_style)


def _put_mark(canvas: Canvas, frame: Frame, pull: float, span: float, column: int, mark: str, style: str) -> None:
    inside = min(max(pull, -span), span)
    line = int((_y(inside, span, frame.strip, frame.strip_rows) + 0.5) // 4)
    canvas.put(min(max(line, frame.strip), frame.strip + frame.strip_rows - 1), column, mark, style)


def _write_pull(canvas: Canvas, frame: Frame, point: PlotPoint, style: str) -> None:
    """The number beside its arrow, on the first of three places that is free."""
    text = pull_text(point.pull)
    column, high = frame.column(point.wave_um), point.pull > 0
    edge = frame.strip if high else frame.strip + frame.strip_rows - 1
    inward = 1 if high else -1
    places = ((edge, column + 1), (edge, column - len(text)), (edge + inward, column - len(text) // 2),
              (edge + inward, column + 1), (edge + inward, column - len(text)))  # fmt: skip
    for line, start in places:
        if start < frame.left or start + len(text) > frame.right or not canvas.is_free(line, start, len(text)):
            continue
        if all(
            _is_clear(canvas, line, side, line == edge and side == column) for side in (start - 1, start + len(text))
        ):
            canvas.put(line, start, text, style)
            return


def _is_clear(canvas: Canvas, line: int, column: int, own_arrow: bool) -> bool:
    """Whether a cell beside a number holds no text of another point."""
    return own_arrow or not 0 <= column < canvas.width or canvas.is_free(line, column, 1)


def _y(pull: float, span: float, top: int, rows: int) -> float:
    """Dot row of a pull: the strip's first and last cells are centred on plus and minus `span`."""
    middle, reach = 4 * (top + rows // 2) + 1.5, 4 * (rows // 2)
    share = min(max(pull / span, -1.2), 1.2)
    return middle - share * reach


def _finite(value: float) -> float:
    return value if math.isfinite(value) else 0.0
