"""Facts that are tables: limits by temperature, neighbours' light, matches, flags, repeats, a mixture's parts."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from typing import Any

from tui.desk.text import fit, number, once_in, p_text, safe, short_band
from tui.desk.widgets.aligned import table
from tui.desk.widgets.fact_words import is_empty, words
from tui.desk.widgets.rows import Row, Span, hanging, row

BAND_WIDE = 8
LEAST_WEIGHT = 0.05  # of a witness: bands with less have no say in it
PARTS = {"planck": "black body", "modified": "modified black body", "feature": "mineral feature"}


def fact_tables(facts: Mapping[str, Any], width: int) -> list[Row]:
    """Every table that these facts hold, each under its head, with an empty row before it."""
    rows: list[Row] = []
    for key, (head, draw) in TABLES.items():
        if not is_empty(facts.get(key)):
            rows += [[], row((head, "head")), *draw(facts, width)]
    return rows


def _limits(facts: Mapping[str, Any], width: int) -> list[Row]:
    """The largest share of the star's light that dust of each temperature may give."""
    pairs = zip(facts["limit_temperature_k"], facts.get("limit_fractional_luminosity") or [], strict=False)
    return table(("dust, K", "share, %"), [(f"{kelvin:.0f}", _limit(100 * share)) for kelvin, share in pairs], width)


def _limit(percent: float) -> str:
    return "no limit" if percent >= 100 else "<" + number(percent, 2)


def _leaks(facts: Mapping[str, Any], width: int) -> list[Row]:
    lines = [
        (short_band(one.get("band", "?")), _percent(one.get("share")), _percent(one.get("anomaly_share")),
         number(one.get("nearest_arcsec"), 3), str(one.get("in_beam", "--")))
        for one in facts["neighbour_leaks"]
    ]  # fmt: skip
    heads = ("band", "of its flux, %", "of the anomaly, %", "nearest, arcsec", "in the beam")
    return table(heads, lines, width, texts=(0,))


def _matches(facts: Mapping[str, Any], width: int) -> list[Row]:
    lines = [
        (safe(one.get("catalogue", "?")), number(one.get("separation"), 2), number(one.get("sigma"), 2),
         p_text(one.get("p"), 2), number(one.get("moved"), 2), number(one.get("nearest_other"), 2))
        for one in facts["matches"]
    ]  # fmt: skip
    return table(("catalogue", "apart, arcsec", "error", "p", "moved", "next source"), lines, width, texts=(0,))


def _shifts(facts: Mapping[str, Any], width: int) -> list[Row]:
    lines = [
        (safe(one.get("catalogue", "?")), number(one.get("shift"), 2), number(one.get("sigma"), 2),
         p_text(one.get("p"), 2), _percent(one.get("share")), number(one.get("within"), 2))
        for one in facts["centroid_shifts"]
    ]  # fmt: skip
    return table(("catalogue", "shift, arcsec", "error", "p", "excess, %", "source within"), lines, width, texts=(0,))


def _flags(facts: Mapping[str, Any], width: int) -> list[Row]:
    """What each raised flag means, and how much it weighs."""
    rows: list[Row] = []
    for one in facts["flags"]:
        source = " ".join(safe(one[key]) for key in ("catalogue", "column") if one.get(key))
        value, weight = safe(one.get("value", "")), safe(one.get("severity", ""))
        text = f"{safe(one.get('meaning', ''))}  ({source} = {value}; {weight})"
        rows += hanging(_band_head(one), text, width)
    return rows


def _doubts(facts: Mapping[str, Any], width: int) -> list[Row]:
    rows: list[Row] = []
    for one in facts["doubts"]:
        rows += hanging(_band_head(one), f"{safe(one.get('text', ''))}  ({safe(one.get('severity', ''))})", width)
    return rows


def _band_head(one: Mapping[str, Any]) -> Row:
    return [Span("  " + fit(short_band(str(one.get("band", ""))), BAND_WIDE), "strong")]


def _epochs(facts: Mapping[str, Any], width: int) -> list[Row]:
    lines = [
        (short_band(band), str(one.get("n", "--")), _percent(one.get("scatter")), p_text(one.get("p"), 2),
         once_in(one.get("p")))
        for band, one in facts["epochs"].items()
    ]  # fmt: skip
    return table(("band", "epochs", "scatter, %", "p constant", "so much if constant"), lines, width, texts=(0, 4))


def _apertures(facts: Mapping[str, Any], width: int) -> list[Row]:
    lines = [
        (short_band(band), f"{one.get('difference', math.nan):+.3f}", f"{one.get('error', math.nan):.3f}")
        for band, one in facts["apertures"].items()
    ]
    return table(("band", "aperture - profile, mag", "error"), lines, width, texts=(0,))


def _witness(facts: Mapping[str, Any], width: int) -> list[Row]:
    """The bands whose balance no mixture can have, the heaviest first."""
    weights = {band: weight for band, weight in facts["witness"].items() if abs(weight) >= LEAST_WEIGHT}
    lines = [
        (short_band(band), f"{weight:+.2f}", "too bright" if weight > 0 else "too faint")
        for band, weight in sorted(weights.items(), key=lambda item: -abs(item[1]))
    ]
    return table(("band", "weight", "in the balance"), lines, width, texts=(0, 2)) if lines else []


def _parts(facts: Mapping[str, Any], width: int) -> list[Row]:
    return table(
        ("share, %", "source", "T, K", "A_V, mag", "R_V", "further"),
        [_part(one) for one in facts["parts"]], width, texts=(1, 5),
    )  # fmt: skip


def _part(one: Mapping[str, Any]) -> Sequence[str]:
    named = {"share", "family", "temperature", "teff", "av", "r_v"}
    further = [
        f"{safe(key).removesuffix('_um').replace('_', ' ')} {words(value)}{' micron' if key.endswith('_um') else ''}"
        for key, value in one.items()
        if key not in named and not is_empty(value)
    ]
    family = str(one.get("family", "?"))
    kelvin = one.get("temperature", one.get("teff"))
    return (_percent(one.get("share")), PARTS.get(family, safe(family)), "--" if kelvin is None else f"{kelvin:.0f}",
            number(one.get("av"), 3), number(one.get("r_v"), 2), ", ".join(further))  # fmt: skip


def _percent(share: float | None) -> str:
    """A share in percent, to a tenth; what is less than that but not nothing says so."""
    if share is None or math.isnan(share):
        return "--"
    percent = 100 * share
    return "<0.1" if 0 < percent < 0.05 else f"{percent:.1f}"


TABLES: Mapping[str, tuple[str, Callable[[Mapping[str, Any], int], list[Row]]]] = {
    "flags": ("flags that say something", _flags),
    "doubts": ("doubts about single bands", _doubts),
    "epochs": ("measured more than once", _epochs),
    "apertures": ("small apertures against profiles", _apertures),
    "neighbour_leaks": ("light of other sources in its bands", _leaks),
    "matches": ("is it the same source in other catalogues?", _matches),
    "centroid_shifts": ("does the centre move where the excess is?", _shifts),
    "limit_temperature_k": ("most dust that these data allow, 95 %", _limits),
    "witness": ("what no mixture can balance", _witness),
    "parts": ("the nearest mixture", _parts),
}
