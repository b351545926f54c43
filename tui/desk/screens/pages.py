"""The further pages of a candidate. A page is a title and a function from what is known to rows: add one to PAGES."""

from __future__ import annotations

import math
import os
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from tui.desk.screens.walk import Walk
from tui.desk.text import RULING_WORDS, clock, fit, number, safe, short_band, signed
from tui.desk.widgets.cutout import cutout_rows
from tui.desk.widgets.dip_plot import dip_plot
from tui.desk.widgets.numbers import adequate_word, param_rows, statistic_rows
from tui.desk.widgets.rows import Row, paragraph, row
from tui.desk.widgets.spectrum_plot import braille_works
from tui.model import CHECK_TITLES, CHECKS, Dip, Measurement


@dataclass(frozen=True, slots=True)
class Page:
    """One page: its title on the tab line, and what draws it at a width, knowing the rows in sight."""

    title: str
    draw: Callable[[Walk, int, int], list[Row]]


def facts_page(walk: Walk, width: int, height: int) -> list[Row]:
    """What this check found beside its fits, other sources near the star, and what the catalogues say of it."""
    rows: list[Row] = []
    own = walk.own_evidence
    if own is not None:
        rows += [_head(f"what the check {CHECK_TITLES[walk.check]} found")]
        rows.append(row(("  adequate  ", "quiet"), adequate_word(own)))
        for caution in own.cautions:
            rows += [[*row(("  caution   ", "caution")), *line] for line in paragraph(caution, width - 12)]
        rows += [*_pairs(own.facts, width), []]
    rows += [_head("other sources near it"), *_neighbour_rows(walk, width), [], _head("facts of the catalogues")]
    return rows + (_pairs(walk.loaded.candidate.facts, width) or [_quiet("none beside the measurements")])


def _neighbour_rows(walk: Walk, width: int) -> list[Row]:
    rows: list[Row] = []
    for neighbour in sorted(walk.loaded.candidate.neighbours, key=lambda one: one.separation_arcsec):
        fluxes = ", ".join(f"{short_band(band)} {number(flux * 1e3)} mJy" for band, flux in neighbour.fluxes_jy.items())
        place = f"{neighbour.separation_arcsec:.1f} arcsec at {neighbour.position_angle_deg:.0f} deg"
        rows += paragraph(f"{place}  {fluxes}  {safe(neighbour.source)}", width, indent=4, lead="  ")
    return rows or [_quiet("none loaded")]


def measurements_page(walk: Walk, width: int, height: int) -> list[Row]:
    """Every measurement as given and as fitted, by wavelength."""
    bands, fitted = walk.loaded.bands, walk.own_evidence.bands if walk.own_evidence else ()
    pulls = walk.fit.pulls if walk.fit else {}
    roomy = width >= 100
    head = f"  {'band':<8}{'micron':>8}{'mJy':>11}{'error':>9}{'pull':>8}  {'source':<12}{'epoch':<12}"
    rows = [row((head if roomy else head.rstrip() + " flags", "head"), ("flags and notes" if roomy else "", "head"))]
    measurements = sorted(walk.loaded.candidate.measurements, key=lambda one: _pivot(one.band, bands))
    for one in measurements:
        rows += _measurement_rows(
            one, _pivot(one.band, bands), pulls.get(one.band), bool(fitted) and one.band not in fitted, width
        )
    return rows or [_quiet("nothing was measured")]


def mixture_page(walk: Walk, width: int, height: int) -> list[Row]:
    """Could any mixture of natural thermal sources make these fluxes, and which bands say no?"""
    found = walk.evidence.get("mixture")
    rows = [_head("mixture bound: could any mixture of natural thermal sources make these fluxes?"), []]
    if found is None:
        return [*rows, _quiet("not computed for this candidate")]
    if found.best is not None:
        rows += [*statistic_rows(width, found.best, None), []]
        rows += [_quiet("p is an upper bound: a refusal holds for every such mixture")]
    for key in ("sentence", "witness"):
        if found.facts.get(key):
            rows += [*paragraph(_words(found.facts[key]), width - 2, "strong" if key == "sentence" else ""), []]
    rows += _pairs({key: value for key, value in found.facts.items() if key not in ("sentence", "witness")}, width)
    rows += [line for caution in found.cautions for line in paragraph(caution, width - 2, "caution")]
    return [
        *rows,
        [],
        *paragraph(
            "Outside this family: sources that shine in lines, and stars unlike the templates.", width - 2, "quiet"
        ),
    ]


def fits_page(walk: Walk, width: int, height: int) -> list[Row]:
    """All checks side by side: their fits, the best parameters, and what the reader ruled."""
    rows: list[Row] = []
    for check in CHECKS:
        found = walk.evidence.get(check)
        own = walk.loaded.view.own.get(check)
        ruled = f"you ruled {RULING_WORDS[own.ruling]}" if own else "not ruled by you"
        rows.append(row((f"{CHECK_TITLES[check]}", "head"), (f"   {ruled}", "quiet")))
        for fitted in found.fits if found else ():
            rows.append(row(f"  {fit(safe(fitted.model), 24)} chi2 {fitted.chi2:9.1f}  dof {fitted.dof:3d}  "
                            f"p {number(fitted.p, 1):>7}  BIC {fitted.bic:9.1f}"))  # fmt: skip
        if found and found.best:
            rows += [[*row("    "), *line] for line in param_rows(width - 4, found.best.params)]
        rows.append([])
    return rows


def others_page(walk: Walk, width: int, height: int) -> list[Row]:
    """What the others ruled, once the seal is open to the reader; the reader's own rulings in any case."""
    view = walk.loaded.view
    rows = [_head("your rulings")]
    for line in view.own_history or ():
        rows += _ruling_rows(line.check, "you", line.ruling, line.utc, line.note, line.stale, width)
    if not view.own_history:
        for check, ruling in view.own.items():
            rows += _ruling_rows(check, "you", ruling.ruling, ruling.utc, ruling.note, view.stale.get(check, ""), width)
    rows += [] if view.own else [_quiet("none yet")]
    rows += [[], _head("rulings of others")]
    if not view.seal_open:
        return [
            *rows,
            *paragraph(
                "Sealed until you have been done with this candidate once: so that nobody steers you.", width, "quiet"
            ),
        ]
    for line in view.others:
        rows += _ruling_rows(line.check, line.handle, line.ruling, line.utc, line.note, line.stale, width)
    return rows if view.others else [*rows, _quiet("none so far")]


def pictures_page(walk: Walk, width: int, height: int) -> list[Row]:
    """Cutouts side by side in one of three stretches; a key swaps which come first."""
    if not walk.cutouts:
        return [_head("pictures"), _quiet("no cutouts were loaded: plainlight load QUEUE TABLE --cutouts DIR")]
    bands = walk.loaded.bands
    pictures = cutout_rows(
        width, height - 1, walk.cutouts, bands, walk.stretch, walk.first_cutout, braille_works(os.environ)
    )
    keys = row(("t ", "key", "stretch()"), ("stretch   ", "", "stretch()"), ("n ", "key", "swap()"))
    keys += row(("other bands", "", "swap()"), ("   north as in the file", "quiet"))
    return [keys, *pictures]


def dips_page(walk: Walk, width: int, height: int) -> list[Row]:
    """Each dimming event: depth against wavelength with its models, then the depths and what the fits say."""
    dips = walk.loaded.candidate.dips
    if not dips:
        return [_head("dips"), _quiet("no dips were loaded: plainlight load QUEUE TABLE --dips TABLE")]
    found = walk.evidence.get("dips")
    named = list(found.facts.get("events", [])) if found is not None else []
    events = [*named, *dict.fromkeys(one.event for one in dips if one.event not in named)]
    plotted, unicode = max(8, min(20, height - 6)), braille_works(os.environ)
    rows: list[Row] = []
    for event in events:
        rows.append(_head(f"dip {safe(event)}: depth against wavelength"))
        of_event = [one for one in dips if one.event == event]
        curves = [one for one in walk.dip_curves if one.event == event]
        rows += [*dip_plot(width, plotted, of_event, curves, walk.loaded.bands, unicode), []]
    if found is not None:
        rows += [line for caution in found.cautions for line in paragraph(caution, width - 2, "caution")]
    rows += [[], *_depth_rows(dips, walk)]
    if found is not None:
        rows += [[], *_pairs(found.facts, width)]
        for fitted in found.fits:
            rows += [row(f"  {safe(fitted.model)}"), *param_rows(width, fitted.params)]
    return rows


def _depth_rows(dips: tuple[Dip, ...], walk: Walk) -> list[Row]:
    rows = [row(("  event         band        depth, %    error  epoch", "quiet"))]
    for dip in sorted(dips, key=lambda one: (one.event, _pivot(one.band, walk.loaded.bands))):
        rows.append(row(f"  {fit(safe(dip.event), 13)} {fit(short_band(dip.band), 10)} {100 * dip.depth:9.2f} "
                        f"{100 * dip.depth_error:8.2f}  {safe(dip.epoch)}"))  # fmt: skip
    return rows


def lookalikes_page(walk: Walk, width: int, height: int) -> list[Row]:
    """Candidates whose pulls share a pattern with this one's, and what that means."""
    rows = [_head("look-alikes: candidates whose pulls share a pattern with this one's")]
    found = walk.look_alikes
    if found is None:
        waiting = "looking through the queue ..." if walk.looking else "the pulls of the star alone are not known here"
        return [*rows, _quiet(walk.alike_trouble or waiting)]
    rows += [[], *paragraph(found.sentence, width - 2, "strong")]
    if found.shared:
        said = ", ".join(f"{name} {p:.2f}" for name, p in found.shared.items())
        rows += paragraph(f"p that so many lie so close by chance: {said}; 0.01 or less counts as shared.",
                          width - 2, "quiet")  # fmt: skip
    rows += [[], row((f"  {'name':<22}{'cosine':>7}{short_band(found.band) + ' pull':>10}"
                      f"{short_band(found.mag_band) + ' mag':>11}{'apart, deg':>12}  epoch", "head"))]  # fmt: skip
    for one in found.candidates:
        rows.append(row(f"  {fit(safe(one.name), 22)}{one.cosine:7.3f}{signed(one.pull):>10}{_decimal(one.mag, 2):>11}"
                        f"{_decimal(one.apart_deg, 3):>12}  {safe(one.epoch)}"))  # fmt: skip
    more = found.count - len(found.candidates)
    rows += [_quiet(f"and {more} more")] if more > 0 else []
    return [*rows, [], *paragraph(f"Among {found.searched} candidates with evidence. It is a fact of this queue, "
                                  "and touches no check.", width - 2, "quiet")]  # fmt: skip


def _decimal(value: float, places: int) -> str:
    return f"{value:.{places}f}" if math.isfinite(value) else "--"


def story_page(walk: Walk, width: int, height: int) -> list[Row]:
    """What happened to the candidate, in time order, as far as the reader may know."""
    rows = [_head("story")]
    for line in walk.story:
        stamp = safe(line.utc[:16].replace("T", " "))
        new = "*" if line.since_mine else " "
        check = f" {CHECK_TITLES.get(line.check, safe(line.check))}" if line.check else ""
        text = f"{stamp}  {safe(line.what)}{check}  {safe(line.who)}  {line.text}"
        rows += paragraph(text, width, "strong" if line.since_mine else "", indent=4, lead=f"{new} ")
    if any(line.since_mine for line in walk.story):
        rows += [[], _quiet("* after your newest ruling here")]
    return rows if walk.story else [*rows, _quiet("nothing yet")]


PAGES = (
    Page("facts", facts_page),
    Page("measured", measurements_page),
    Page("all fits", fits_page),
    Page("mixture", mixture_page),
    Page("dips", dips_page),
    Page("pictures", pictures_page),
    Page("look-alikes", lookalikes_page),
    Page("rulings", others_page),
    Page("story", story_page),
)


LOOK_ALIKES = 1 + [page.title for page in PAGES].index("look-alikes")  # what this page shows is looked for when asked


def page_rows(walk: Walk, width: int, height: int) -> list[Row]:
    """The page on view under the line of all titles; `walk.page` counts from 1, 0 being the plot."""
    full = sum(len(page.title) + 5 for page in PAGES) + 3 <= width
    tabs = row(" ", ("v", "key", "views()"), " ")
    for number_, page in enumerate(PAGES, start=1):
        here = number_ == walk.page
        text = f"[{number_} {page.title}]" if here else f" {number_} {page.title} " if full else f" {number_} "
        tabs += row((text, "now" if here else "quiet", f"page({number_})"))
    inner = max(20, width - 2)
    body = PAGES[walk.page - 1].draw(walk, inner, height - 2) if walk.loaded else [_quiet("reading ...")]
    return [tabs, [], *([*row(" "), *line] for line in body)]


def _head(text: str) -> Row:
    return row((text, "head"))


def _quiet(text: str) -> Row:
    return row((f"  {text}", "quiet"))


def _pairs(facts: Mapping[str, Any], width: int) -> list[Row]:
    """Facts by name, in as many columns as fit."""
    lines = [
        (safe(key).replace("_", " "), _words(value)) for key, value in facts.items() if value not in (None, "", [], {})
    ]
    size = max((len(key) for key, _ in lines), default=0)
    rows: list[Row] = []
    for key, text in lines:
        block = paragraph(text, max(10, width - size - 4), indent=2)
        heads = [f"  {key:<{size}}  "] + [" " * (size + 4)] * (len(block) - 1)
        rows += [[*row((head, "quiet")), *line] for head, line in zip(heads, block, strict=True)]
    return rows


def _words(value: Any) -> str:
    """A fact's value as people read it."""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, float):
        return f"{value:.8g}"
    if isinstance(value, Mapping) and "meaning" in value:
        told = [_words(item) for key, item in value.items() if key != "meaning" and item not in (None, "")]
        return f"{safe(value['meaning'])} ({', '.join(told)})"
    if isinstance(value, Mapping):
        return ", ".join(f"{safe(key)} {_words(item)}" for key, item in value.items())
    if isinstance(value, (list, tuple)):
        return ("\n" if any(isinstance(item, Mapping) for item in value) else ", ").join(_words(item) for item in value)
    return safe(value)


def _pivot(band: str, bands: Mapping[str, Any]) -> float:
    return bands[band].pivot_um if band in bands else float("inf")


def _measurement_rows(one: Measurement, pivot: float, pull: float | None, left_out: bool, width: int) -> list[Row]:
    """One measurement; what does not fit its row goes on below it."""
    flux = f"{'<' if one.limit else ''}{number(one.flux_jy * 1e3)}"
    error = f"{one.nsigma:g} sigma" if one.limit else number(one.error_jy * 1e3, 2)
    why = "x excluded" if one.exclude else "x not fitted" if left_out else ""
    flags = [f"{safe(key)}={safe(text)}" for key, text in one.flags.items()]
    further = " ".join(part for part in (why, *flags, safe(one.note)) if part)
    micron = number(pivot) if pivot < float("inf") else "?"
    text = (f"  {fit(short_band(one.band), 8)}{micron:>8}{flux:>11}{error:>9}{signed(pull):>8}  "
            f"{fit(safe(one.source), 11)} {fit(safe(one.epoch), 11)} ")  # fmt: skip
    style = "dropped" if why else "limit" if one.limit else ""
    if len(text) + len(further) <= width:
        return [row((text + further, style))]
    return [row((text, style)), *paragraph(further, width, style, indent=10, lead=" " * 10)]


def _ruling_rows(check: str, who: str, ruling: str, utc: str, note: str, stale: str, width: int) -> list[Row]:
    when = f"{utc[:10]} {clock(utc)}".strip()
    word = RULING_WORDS.get(ruling, safe(ruling))
    rows = [row(f"  {fit(CHECK_TITLES[check], 12)} ", (fit(word, 12), ruling), (f" {safe(who)}  {when}", "quiet"),
                ("   stale: " + safe(stale) if stale else "", "caution"))]  # fmt: skip
    return rows + [[*row("      "), *line] for line in (paragraph(note, width - 6) if note else [])]
