"""The pages of a candidate that show numbers: facts, measurements, all fits, the mixture bound."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from typing import Any

from rich.cells import cell_len

from tui.desk.screens.questions import by_weight
from tui.desk.screens.walk import Walk
from tui.desk.text import RULING_WORDS, number, once_in, p_text, safe, short_band, signed
from tui.desk.widgets.aligned import pair_rows, table
from tui.desk.widgets.fact_tables import fact_tables
from tui.desk.widgets.fact_words import catalogue_pairs, evidence_pairs
from tui.desk.widgets.numbers import adequate_word, param_rows, tenth
from tui.desk.widgets.rows import Row, beside, fit_row, hanging, paragraph, row, row_width
from tui.model import CHECK_TITLES, CHECKS, Evidence, Measurement

COLUMNS_FROM = 150  # columns from which the fits of two checks stand side by side
FLAGS_BESIDE = 96  # columns from which flags stand in a measurement's own row
OUTSIDE = "Outside this family: sources that shine in lines, and stars unlike the templates."


def facts_page(walk: Walk, width: int, height: int) -> list[Row]:
    """What this check found beside its fits, other sources near the star, and what the catalogues say of it."""
    rows: list[Row] = []
    own = walk.own_evidence
    if own is not None:
        rows += [head(f"what the check {CHECK_TITLES[walk.check]} found"), *_found_rows(own, width, walk.p_min), []]
    rows += [head("other sources near it"), *_neighbour_rows(walk, width), [], head("facts of the catalogues")]
    pairs = catalogue_pairs(walk.loaded.candidate.facts)
    return rows + (pair_rows(pairs, width) if pairs else [quiet("none beside the measurements")])


def _found_rows(own: Evidence, width: int, p_min: float) -> list[Row]:
    rows = [row(("  adequate  ", "quiet"), adequate_word(own, 0, p_min))]
    for caution in by_weight(grouped(own.cautions)):
        rows += hanging(row(("  caution   ", "caution")), caution, width)
    return [*rows, *pair_rows(evidence_pairs(own.facts), width), *fact_tables(own.facts, width)]


def grouped(cautions: Sequence[str]) -> list[str]:
    """Cautions that say the same of several bands, as one.

    >>> grouped(["W1: it leaks.", "One source.", "W2, W3: it leaks."])
    ['W1, W2, W3: it leaks.', 'One source.']
    """
    said: dict[str, list[str]] = {}
    for caution in cautions:
        found = re.fullmatch(r"(\w+(?:, \w+)*): (.+)", caution)
        said.setdefault(found.group(2) if found else caution, []).extend([found.group(1)] if found else [])
    return [f"{', '.join(bands)}: {text}" if bands else text for text, bands in said.items()]


def _neighbour_rows(walk: Walk, width: int) -> list[Row]:
    lines = [
        (number(one.separation_arcsec, 3), f"{one.position_angle_deg:.0f}", safe(one.source),
         ", ".join(f"{short_band(band)} {number(flux * 1e3)}" for band, flux in one.fluxes_jy.items()))
        for one in sorted(walk.loaded.candidate.neighbours, key=lambda one: one.separation_arcsec)
    ]  # fmt: skip
    if not lines:
        return [quiet("none loaded")]
    return table(("arcsec", "deg", "source", "flux, mJy"), lines, width, texts=(2, 3))


def measurements_page(walk: Walk, width: int, height: int) -> list[Row]:
    """Every measurement as fitted, by wavelength; beneath or beside it its flags and why it is not fitted."""
    bands, fitted = walk.loaded.bands, walk.own_evidence.bands if walk.own_evidence else ()
    pulls = walk.fit.pulls if walk.fit else {}
    measured = sorted(walk.loaded.candidate.measurements, key=lambda one: pivot(one.band, bands))
    if not measured:
        return [quiet("nothing was measured")]
    left_out = [_left_out(one, fitted) for one in measured]
    heads = ("", "band", "micron", "mJy", "error", "pull", "source", "epoch")
    lines = [
        (
            "x" if why else "",
            *_measured_cells(one, bands),
            signed(pulls.get(one.band)),
            safe(one.source),
            safe(one.epoch),
        )
        for one, why in zip(measured, left_out, strict=True)
    ]
    styles = ["dropped" if why else "limit" if one.limit else "" for one, why in zip(measured, left_out, strict=True)]
    first, *rest = table(heads, lines, width, texts=(0, 1, 6, 7), styles=styles)
    return [first, *_with_flags(rest, measured, left_out, styles, width)]


def _left_out(one: Measurement, fitted: tuple[str, ...]) -> str:
    return "excluded" if one.exclude else "not fitted" if fitted and one.band not in fitted else ""


def _measured_cells(one: Measurement, bands: Mapping[str, Any]) -> tuple[str, str, str, str]:
    wave = pivot(one.band, bands)
    flux = f"{'<' if one.limit else ''}{number(one.flux_jy * 1e3)}"
    error = f"{one.nsigma:g} sigma" if one.limit else number(one.error_jy * 1e3, 2)
    return short_band(one.band), number(wave) if wave < float("inf") else "?", flux, error


def _with_flags(
    rows: list[Row], measured: list[Measurement], left_out: list[str], styles: list[str], width: int
) -> list[Row]:
    """The rows with what else is known of each measurement: beside it where there is room, else beneath."""
    size = max(row_width(line) for line in rows) + 2
    whole: list[Row] = []
    for spans, one, why, style in zip(rows, measured, left_out, styles, strict=True):
        flags = [f"{safe(key)}={safe(text)}" for key, text in one.flags.items()]
        further = " ".join(part for part in (why, *flags, safe(one.note)) if part)
        if width >= FLAGS_BESIDE or size + cell_len(further) <= width:
            whole += hanging([*fit_row(spans, size)], further, width, style)
        else:
            whole += [spans, *paragraph(further, width, style, indent=10, lead=" " * 10)]
    return whole


def fits_page(walk: Walk, width: int, height: int) -> list[Row]:
    """All checks: their fits in one table each, the best one's parameters, and what the reader ruled."""
    columns = 2 if width >= COLUMNS_FROM else 1
    blocks = [_check_block(walk, check, width // columns - 2) for check in CHECKS]
    if columns == 1:
        return [line for block in blocks for line in block]
    pairs = [blocks[start : start + 2] for start in range(0, len(blocks), 2)]
    return [line for pair in pairs for line in beside(pair[0], pair[1] if len(pair) > 1 else [], width // 2 - 2, 2)]


def _check_block(walk: Walk, check: str, width: int) -> list[Row]:
    found, own = walk.evidence.get(check), walk.loaded.view.own.get(check)
    ruled = f"you ruled {RULING_WORDS[own.ruling]}" if own else "not ruled by you"
    said = f"   {ruled}" + (f"   adequate: {adequate_word(found, 0, walk.p_min)}" if found else "")
    rows = [row((CHECK_TITLES[check], "head"), (said, "quiet"))]
    if found is None or found.best is None:
        return [*rows, quiet("no fit"), []]
    lines = [
        (safe(one.model), tenth(one.chi2), str(one.dof), p_text(one.p), once_in(one.p), tenth(one.bic))
        for one in found.fits
    ]
    styles = ["strong", *[""] * (len(lines) - 1)]
    rows += table(("fit, best first", "chi2", "dof", "p", "chi2 so large", "BIC"), lines, width, (0, 4), styles)
    return [*rows, *([*row("   "), *line] for line in param_rows(width - 4, found.best.params)), []]


def mixture_page(walk: Walk, width: int, height: int) -> list[Row]:
    """Could any mixture of natural thermal sources make these fluxes, and which bands say no?"""
    found = walk.evidence.get("mixture")
    rows = [head("mixture bound: could any mixture of natural thermal sources make these fluxes?"), []]
    if found is None:
        return [*rows, quiet("not computed for this candidate")]
    if found.facts.get("sentence"):
        rows += paragraph(str(found.facts["sentence"]), width - 2, "strong")
    rows += [
        line
        for caution in grouped(found.cautions)
        for line in hanging(row(("caution  ", "caution")), caution, width - 2)
    ]
    rows += [[], *pair_rows(evidence_pairs(found.facts), width)]
    rows += fact_tables(found.facts, width)
    return [*rows, [], *paragraph(f"p is an upper bound: a refusal holds for every such mixture. {OUTSIDE}",
                                  width - 2, "quiet")]  # fmt: skip


def head(text: str) -> Row:
    """The head of a part of a page."""
    return row((text, "head"))


def quiet(text: str) -> Row:
    """A remark that there is nothing."""
    return row((f"  {text}", "quiet"))


def pivot(band: str, bands: Mapping[str, Any]) -> float:
    """A band's wavelength in micron, beyond all others where it is not known."""
    return bands[band].pivot_um if band in bands else float("inf")
