"""The pages of a candidate that show what happened and what is like it: dips, pictures, look-alikes, rulings, story."""

from __future__ import annotations

import math
import os

from tui.desk.screens.page_data import head, pivot, quiet
from tui.desk.screens.walk import Walk
from tui.desk.text import RULING_WORDS, SIGNS, clock, fit, safe, short_band, signed
from tui.desk.widgets.aligned import pair_rows, table
from tui.desk.widgets.cutout import cutout_rows
from tui.desk.widgets.dip_plot import dip_plot
from tui.desk.widgets.fact_tables import fact_tables
from tui.desk.widgets.fact_words import evidence_pairs
from tui.desk.widgets.numbers import param_rows
from tui.desk.widgets.rows import Row, hanging, paragraph, row
from tui.desk.widgets.spectrum_plot import braille_works
from tui.desk.widgets.story_rows import NEW, story_rows
from tui.model import CHECK_TITLES, Dip, Evidence
from tui.workflow.lookalikes import LookAlikes
from tui.workflow.records import RulingLine

SEALED = "Sealed until you have been done with this candidate once: so that nobody steers you."
NAME_WIDE = 28  # cells of a look-alike's name


def pictures_page(walk: Walk, width: int, height: int) -> list[Row]:
    """Cutouts side by side in one of three stretches; a key swaps which come first."""
    if not walk.cutouts:
        return [head("pictures"), quiet("no cutouts were loaded: plainlight load QUEUE TABLE --cutouts DIR")]
    unicode = braille_works(os.environ)
    pictures = cutout_rows(width, height - 1, walk.cutouts, walk.loaded.bands, walk.stretch, walk.first_cutout, unicode)
    keys = row(("t ", "key", "stretch()"), ("stretch   ", "", "stretch()"))
    if len(walk.cutouts) > 1:
        keys += row(("n ", "key", "swap()"), ("other bands   ", "", "swap()"))
    return [keys + row(("north as in the file", "quiet")), *pictures]


def dips_page(walk: Walk, width: int, height: int) -> list[Row]:
    """Each dimming event: depth against wavelength with its models, then the depths and what the fits say."""
    dips = walk.loaded.candidate.dips
    if not dips:
        return [head("dips"), quiet("no dips were loaded: plainlight load QUEUE TABLE --dips TABLE")]
    found = walk.evidence.get("dips")
    rows = [line for event in _events(dips, found) for line in _event_rows(walk, event, width, height)]
    if found is not None:
        rows += [line for text in found.cautions for line in hanging(row(("caution  ", "caution")), text, width - 2)]
    rows += [[], *_depth_rows(dips, walk, width)]
    if found is not None:
        rows += [[], *pair_rows(evidence_pairs(found.facts), width), *fact_tables(found.facts, width)]
        for fitted in found.fits:
            rows += [
                row(f"  {safe(fitted.model)}"),
                *([*row("  "), *line] for line in param_rows(width - 2, fitted.params)),
            ]
    return rows


def _events(dips: tuple[Dip, ...], found: Evidence | None) -> list[str]:
    named = list(found.facts.get("events", [])) if found is not None else []
    return [*named, *dict.fromkeys(one.event for one in dips if one.event not in named)]


def _event_rows(walk: Walk, event: str, width: int, height: int) -> list[Row]:
    of_event = [one for one in walk.loaded.candidate.dips if one.event == event]
    curves = [one for one in walk.dip_curves if one.event == event]
    plotted = dip_plot(
        width, max(8, min(20, height - 6)), of_event, curves, walk.loaded.bands, braille_works(os.environ)
    )
    return [head(f"dip {safe(event)}: depth against wavelength"), *plotted, []]


def _depth_rows(dips: tuple[Dip, ...], walk: Walk, width: int) -> list[Row]:
    lines = [
        (
            safe(dip.event),
            short_band(dip.band),
            f"{100 * dip.depth:.2f}",
            f"{100 * dip.depth_error:.2f}",
            safe(dip.epoch),
        )
        for dip in sorted(dips, key=lambda one: (one.event, pivot(one.band, walk.loaded.bands)))
    ]
    return table(("event", "band", "depth, %", "error", "epoch"), lines, width, texts=(0, 1, 4))


def lookalikes_page(walk: Walk, width: int, height: int) -> list[Row]:
    """Candidates whose pulls share a pattern with this one's, and what that means."""
    rows = [head("look-alikes: candidates whose pulls share a pattern with this one's")]
    found = walk.look_alikes
    if found is None:
        waiting = "looking through the queue ..." if walk.looking else "the pulls of the star alone are not known here"
        return [*rows, quiet(walk.alike_trouble or waiting)]
    rows += [[], *paragraph(found.sentence, width - 2, "strong")]
    if found.shared:
        said = ", ".join(f"{name} {_decimal(p, 2)}" for name, p in found.shared.items())
        rows += paragraph(f"p that so many lie so close by chance: {said}; 0.01 or less counts as shared.",
                          width - 2, "quiet")  # fmt: skip
    rows += [[], *_alike_rows(found, width)]
    more = found.count - len(found.candidates)
    rows += [quiet(f"and {more} more")] if more > 0 else []
    return [*rows, [], *paragraph(f"Among {found.searched} candidates with evidence. It is a fact of this queue, "
                                  "and touches no check.", width - 2, "quiet")]  # fmt: skip


def _alike_rows(found: LookAlikes, width: int) -> list[Row]:
    if not found.candidates:
        return []
    heads = (
        "name",
        "cosine",
        f"{short_band(found.band)} pull",
        f"{short_band(found.mag_band)} mag",
        "apart, deg",
        "epoch",
    )
    size = min(NAME_WIDE, max(len(one.name) for one in found.candidates))
    lines = [
        (fit(safe(one.name), size, cut="middle"), f"{one.cosine:.3f}", signed(one.pull), _decimal(one.mag, 2),
         _decimal(one.apart_deg, 3), safe(one.epoch))
        for one in found.candidates
    ]  # fmt: skip
    return table(heads, lines, width, texts=(0, 5))


def _decimal(value: float, places: int) -> str:
    return f"{value:.{places}f}" if math.isfinite(value) else "--"


def others_page(walk: Walk, width: int, height: int) -> list[Row]:
    """What the others ruled, once the seal is open to the reader; the reader's own rulings in any case."""
    view = walk.loaded.view
    rows = [head("your rulings")]
    for line in view.own_history:
        rows += _ruling_rows(line, "you", width)
    rows += [] if view.own_history else [quiet("none yet")]
    rows += [[], head("rulings of others")]
    if not view.seal_open:
        return [*rows, *paragraph(f"  {SEALED}", width, "quiet", indent=2)]
    for line in view.others:
        rows += _ruling_rows(line, safe(line.handle), width)
    return rows if view.others else [*rows, quiet("none so far")]


def _ruling_rows(line: RulingLine, who: str, width: int) -> list[Row]:
    """One ruling: check, sign and word, who and when; beneath, whether it still counts, and its note."""
    word = SIGNS.get(line.ruling, "") + RULING_WORDS.get(line.ruling, safe(line.ruling))
    marks = ["with others in view"] if line.seen_others else []
    marks += [f"stale: {safe(line.stale)}"] if line.stale else []
    marks += [] if line.current or line.ruling == "withdrawn" else ["withdrawn or replaced since"]
    when = f"{line.utc[:10]} {clock(line.utc)}".strip()
    rows = [row(f"  {fit(CHECK_TITLES.get(line.check, safe(line.check)), 12)} ", (fit(word, 13), line.ruling),
                (f" {fit(who, 12)} {when}", "quiet"))]  # fmt: skip
    if marks:
        rows += hanging(row("      "), "; ".join(marks), width, "caution" if line.stale else "quiet")
    return rows + (hanging(row("      "), line.note, width) if line.note else [])


def story_page(walk: Walk, width: int, height: int) -> list[Row]:
    """What happened to the candidate, in time order, as far as the reader may know."""
    rows = [head("story, times in UTC"), *(spans for line in walk.story for spans in story_rows(line, width))]
    if any(line.since_mine for line in walk.story):
        rows += [[], quiet(f"{NEW} since you last ruled on it")]
    return rows if walk.story else [*rows, quiet("nothing yet")]
