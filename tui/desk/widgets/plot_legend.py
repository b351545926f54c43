"""The plot's head line: what is drawn, in which unit, and what each line and mark means. It never lies over data."""

from __future__ import annotations

from tui.desk.widgets.plot_canvas import dash_sample
from tui.desk.widgets.plot_data import PlotData, PlotView
from tui.desk.widgets.plot_scale import flux_unit
from tui.desk.widgets.rows import Row, Span, fit_row, row_width

TOTAL_DASH = (1, 0)
SPECTRUM_DASH = (1, 1)
OTHER_DASH = (7, 3)
COMPONENT_DASH = ((2, 2), (5, 2), (1, 2), (3, 3))
GAP = "  "


def header(width: int, plot: PlotData, view: PlotView, high_y: float, unicode: bool) -> Row:
    """Quantity and unit, then as much of the legend as fits, the lines before the marks."""
    name = "nu F_nu W/m2" if view.nu_fnu else f"F_nu {flux_unit(high_y)[1]}"
    if view.x_range is not None:
        name += " zoomed"
    line: Row = [Span(name, "axis")]
    entries = [*_lines(plot, unicode), *_marks(plot)]
    needed = row_width(line) + sum(row_width(entry) + len(GAP) for entry in entries)
    gap = GAP if needed < width else " "
    for entry in entries:
        if row_width(line) + len(gap) + row_width(entry) >= width:
            break
        line += [Span(gap), *entry]
    return fit_row(line, width)


def _lines(plot: PlotData, unicode: bool) -> list[Row]:
    entries: list[Row] = []
    for curve in plot.curves:
        if curve.role == "total":
            entries.append([Span(dash_sample(TOTAL_DASH, 2) if unicode else "...", "total"), Span(f" {curve.label}")])
        elif curve.role == "other":
            sample = dash_sample(OTHER_DASH, 4) if unicode else ":::"
            entries.append([Span(f"{sample}{curve.letter}", "other"), Span(f" {curve.label}")])
    components = [curve for curve in plot.curves if curve.role == "component"]
    for index, curve in enumerate(components):
        turn = index % len(COMPONENT_DASH)
        sample = dash_sample(COMPONENT_DASH[turn]) if unicode else curve.letter * 3
        lead = f"{sample}{curve.letter}" if unicode and curve.letter else sample
        entries.append([Span(lead, f"component-{'abcd'[turn]}"), Span(f" {curve.label}")])
    return entries + [_spectrum(plot, unicode) for curve in plot.curves if curve.role == "spectrum"]


def _spectrum(plot: PlotData, unicode: bool) -> Row:
    """The candidate's own spectrum, and whether its points are in the fit."""
    fitted = plot.spectrum is None or plot.spectrum.fitted
    sample = dash_sample(SPECTRUM_DASH, 2) if unicode else ",,,"
    return [Span(sample, "spectrum"), Span(" spectrum" if fitted else " spectrum, not fitted")]


def _marks(plot: PlotData) -> list[Row]:
    """Marks that need a word, the rarest first; a used point needs it least."""
    entries = []
    if any(point.dropped for point in plot.points):
        entries.append([Span("x", "dropped"), Span(" dropped")])
    if any(point.limit and not point.dropped for point in plot.points):
        entries.append([Span("v", "limit"), Span(" limit")])
    if any(not point.limit and not point.dropped for point in plot.points):
        entries.append([Span("o", "point"), Span(" used")])
    return entries
