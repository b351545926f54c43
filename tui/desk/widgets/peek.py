"""The chosen candidate's data beside the list: facts, and each band's flux with its pull from the star alone."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING

from textual.content import Content
from textual.widget import Widget

from tui.desk.text import fit, number, plural, safe, short_band, signed
from tui.model import Candidate, Evidence, Measurement

if TYPE_CHECKING:
    from tui.data.load import BandRow

Line = list[tuple[str, str]]
FACTS = (("ra", "deg"), ("dec", "deg"), ("parallax", "mas"), ("ruwe", ""), ("sp_type", ""), ("otype", ""))
SIGMA_A_CELL = 1.0
BAR_CELLS = 9  # to each side; a longer pull ends in a sign that it goes on
STYLES = ("plain", "quiet", "strong", "limit", "title")


class Peek(Widget):
    """What was measured; no rulings, nobody's."""

    COMPONENT_CLASSES = {f"peek--{name}" for name in STYLES}

    def __init__(self, *, id: str | None = None) -> None:
        super().__init__(id=id)
        self._lines: list[Line] = []

    def show(
        self, candidate: Candidate | None, evidence: Mapping[str, Evidence], bands: Mapping[str, BandRow]
    ) -> None:
        """Draw a candidate, or nothing."""
        self._lines = [] if candidate is None else peek_lines(candidate, evidence.get("star"), bands)
        self.refresh()

    def render(self) -> Content:
        """The lines that there is room for."""
        style = {name: self.get_visual_style(f"peek--{name}") for name in STYLES}
        lines = self._lines
        if len(lines) > self.size.height > 0:
            left_out = len(lines) - self.size.height + 1
            lines = [*lines[: self.size.height - 1], [(f"and {plural(left_out, 'line')} more: Enter opens", "quiet")]]
        return Content("\n").join(Content.assemble(*((text, style[name]) for text, name in line)) for line in lines)


def peek_lines(candidate: Candidate, star: Evidence | None, bands: Mapping[str, BandRow]) -> list[Line]:
    """Title, facts, one line a band by wavelength with a bar for its pull."""
    lines: list[Line] = [[(safe(candidate.name), "title")], [(_fact_text(candidate), "quiet")], []]
    fit_of_star = star.best if star else None
    pulls = fit_of_star.pulls if fit_of_star else {}
    head = f"{fit('band', 8)}{fit('micron', 8, align='right')}{fit('flux, mJy', 12, align='right')}"
    lines.append([(head + f"{fit('error', 10, align='right')}   measured - star, sigma", "quiet")])
    for measured in sorted(candidate.measurements, key=lambda m: _pivot(m.band, bands)):
        lines.append(_band_line(measured, _pivot(measured.band, bands), pulls.get(measured.band)))
    lines.append([])
    lines += [[(text, "quiet")] for text in _beside(candidate, star)]
    return lines


def _fact_text(candidate: Candidate) -> str:
    said = []
    for name, unit in FACTS:
        value = candidate.facts.get(name)
        if value is None or value == "":
            continue
        text = number(value, 6 if unit == "deg" else 3) if isinstance(value, float) else safe(value)
        said.append(f"{name} {text} {unit}".rstrip())
    return "   ".join(said) or "no facts beside the measurements"


def _band_line(measured: Measurement, pivot_um: float, pull: float | None) -> Line:
    flux = f"{'<' if measured.limit else ''}{number(measured.flux_jy * 1e3)}"
    error = "limit" if measured.limit else number(measured.error_jy * 1e3, 2)
    text = f"{fit(short_band(measured.band), 8)}{fit(number(pivot_um), 8, align='right')}{fit(flux, 12, align='right')}"
    line: Line = [(text, "plain"), (fit(error, 10, align="right"), "limit" if measured.limit else "quiet")]
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


def _pivot(band: str, bands: Mapping[str, BandRow]) -> float:
    return bands[band].pivot_um if band in bands else float("inf")
