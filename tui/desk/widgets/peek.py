"""The chosen candidate's data beside the list: facts, and each band's flux with its pull from the star alone."""

from __future__ import annotations

import os
from collections.abc import Mapping

from textual.app import ComposeResult
from textual.containers import Vertical
from textual.content import Content
from textual.geometry import Size
from textual.widget import Widget

from tui.desk.text import decimal_aligned, fit, number, plural, safe, short_band, signed, wrap
from tui.desk.widgets.plot_data import PlotData, PlotView
from tui.desk.widgets.plot_points import plot_points, spectrum_curve
from tui.desk.widgets.spectrum_plot import SpectrumPlot, braille_works
from tui.model import Band, Candidate, Evidence, Measurement

Line = list[tuple[str, str]]
FACTS = (("ra", "deg"), ("dec", "deg"), ("parallax", "mas"), ("ruwe", ""), ("sp_type", ""), ("otype", ""))
PLOT_LEAST = 16  # lines: a lower plot says less than the bars above it
SIGMA_A_CELL = 1.0
BAR_CELLS = 9  # to each side; a longer pull ends in a sign that it goes on
STYLES = ("plain", "quiet", "strong", "limit", "title")


class PeekLines(Widget):
    """The candidate in words and numbers."""

    COMPONENT_CLASSES = {f"peek--{name}" for name in STYLES}
    DEFAULT_CSS = "PeekLines { height: auto; }"

    def __init__(self) -> None:
        super().__init__()
        self.drawn: list[Line] = []

    def get_content_height(self, container: Size, viewport: Size, width: int) -> int:
        """As many lines as there are."""
        return len(self.drawn)

    def render(self) -> Content:
        """The lines that there is room for."""
        style = {name: self.get_visual_style(f"peek--{name}") for name in STYLES}
        lines = self.drawn
        if len(lines) > self.size.height > 0:
            left_out = len(lines) - self.size.height + 1
            lines = [*lines[: self.size.height - 1], [(f"and {plural(left_out, 'line')} more: Enter opens", "quiet")]]
        return Content("\n").join(Content.assemble(*((text, style[name]) for text, name in line)) for line in lines)


class Peek(Vertical):
    """What was measured, in numbers and, where there is room below them, as a spectrum; no rulings, nobody's."""

    DEFAULT_CSS = """
    Peek SpectrumPlot { height: 1fr; min-height: 14; margin-top: 1; }
    Peek .rows--grid { color: $plot-grid; }
    Peek .rows--point, Peek .rows--far { color: $series-point; text-style: bold; }
    Peek .rows--limit { color: $series-limit; text-style: bold; }
    Peek .rows--dropped { color: $series-dropped; }
    Peek .rows--zero, Peek .rows--width, Peek .rows--bar, Peek .rows--stem { color: $quiet; }
    Peek .rows--spectrum { color: $series-3; }
    """

    def compose(self) -> ComposeResult:
        """Numbers above, the plot below."""
        yield PeekLines()
        yield SpectrumPlot(unicode=braille_works(os.environ))

    def show(self, candidate: Candidate, evidence: Mapping[str, Evidence], bands: Mapping[str, Band]) -> None:
        """Draw a candidate."""
        star = evidence.get("star")
        lines, plot = self.query_one(PeekLines), self.query_one(SpectrumPlot)
        lines.drawn = peek_lines(candidate, star, bands, max(40, self.size.width - 3))
        lines.refresh(layout=True)
        fitted = star.bands if star else ()
        points = plot_points(candidate, bands, star.best if star else None, fitted=fitted)
        plot.show(PlotData(points, spectrum_curve(candidate)), PlotView())
        plot.display = bool(points) and self.size.height - len(lines.drawn) >= PLOT_LEAST


def peek_lines(candidate: Candidate, star: Evidence | None, bands: Mapping[str, Band], width: int) -> list[Line]:
    """Title, facts, one line a band by wavelength with a bar for its pull, what else there is."""
    lines: list[Line] = [[(safe(candidate.name), "title")]]
    lines += [[(text, "quiet")] for text in wrap(_fact_text(candidate), width)]
    pulls = star.best.pulls if star and star.best else {}
    measured = sorted(candidate.measurements, key=lambda one: _pivot(one.band, bands))
    fluxes = decimal_aligned([number(one.flux_jy * 1e3) for one in measured])
    errors = decimal_aligned(["" if one.limit else number(one.error_jy * 1e3, 2) for one in measured])
    waves = decimal_aligned([number(_pivot(one.band, bands)) for one in measured])
    heads = ("band", 8, "left"), ("micron", 8, "right"), ("flux, mJy", 12, "right"), ("error", 11, "right")
    head = "".join(fit(word, cells, align=align) for word, cells, align in heads)
    lines += [[], [(f"{head}   measured - star, sigma", "quiet")]]
    for one, *cells in zip(measured, waves, fluxes, errors, strict=True):
        lines.append(_band_line(one, cells, pulls.get(one.band)))
    beside = [text for said in _beside(candidate, star) for text in wrap(said, width)]
    return [*lines, *([[]] if beside else []), *([(text, "quiet")] for text in beside)]


def _fact_text(candidate: Candidate) -> str:
    said = []
    for name, unit in FACTS:
        value = candidate.facts.get(name)
        if value is None or value == "":
            continue
        text = number(value, 6 if unit == "deg" else 3) if isinstance(value, float) else safe(value)
        said.append(f"{name} {text} {unit}".rstrip())
    return "   ".join(said) or "no facts beside the measurements"


def _band_line(measured: Measurement, cells: list[str], pull: float | None) -> Line:
    wave, flux, error = cells
    text = f"{fit(short_band(measured.band), 8)}{fit(wave, 8, align='right')}"
    line: Line = [(text, "plain"), (fit("<" + flux.lstrip() if measured.limit else flux, 12, align="right"), "plain")]
    line.append((fit("limit", 11, align="right") if measured.limit else fit(error, 11, align="right"), "quiet"))
    if measured.exclude:
        return [*line, ("   kept, not fitted", "quiet")]
    return line if pull is None else [*line, ("   ", "plain"), *_bar(pull)]


def _bar(pull: float) -> Line:
    """A pull as a bar from the middle, and its number."""
    cells = min(round(abs(pull) / SIGMA_A_CELL), BAR_CELLS)
    style = "strong" if abs(pull) >= 3 else "plain"
    goes_on = abs(pull) > SIGMA_A_CELL * (BAR_CELLS + 0.5)
    if pull < 0:
        body = fit(("<" if goes_on else "") + "-" * (cells - goes_on), BAR_CELLS, align="right") + "|" + " " * BAR_CELLS
    else:
        body = " " * BAR_CELLS + "|" + fit("+" * (cells - goes_on) + (">" if goes_on else ""), BAR_CELLS)
    return [(body, style), (fit(signed(pull), 8, align="right"), style)]


def _beside(candidate: Candidate, star: Evidence | None) -> list[str]:
    said = []
    if candidate.neighbours:
        nearest = min(n.separation_arcsec for n in candidate.neighbours)
        said.append(f"{plural(len(candidate.neighbours), 'neighbour')}, the nearest at {number(nearest)} arcsec")
    if candidate.dips:
        events = len({dip.event for dip in candidate.dips})
        said.append(f"{plural(events, 'dip')}, {plural(len(candidate.dips), 'depth')} measured")
    if candidate.spectrum is not None:
        said.append(f"a spectrum of {plural(len(candidate.spectrum.wave_um), 'point')}")
    said += [f"caution: {safe(text)}" for text in (star.cautions if star else ())]
    return said


def _pivot(band: str, bands: Mapping[str, Band]) -> float:
    return bands[band].pivot_um if band in bands else float("inf")
