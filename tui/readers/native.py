"""Columns in the program's own form: `name`, facts, and for each band B `B_mag` or `B_flux`, `B_err`, `B_limit` ..."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

from tui.model import Band
from tui.readers.records import FactRow

FIELDS = ("mag", "flux", "err", "limit", "nsigma", "flag", "epoch", "exclude", "note", "source")
NATIVE = re.compile(rf"^(?P<band>.+)_(?P<field>{'|'.join(FIELDS)})(?:_(?P<digit>[1-9]))?$")
SAYS_PS1 = re.compile(r"\bps1\b|pan-?starrs", re.IGNORECASE)
PS1_BANDS = {letter: f"PS1_{letter}" for letter in "grizy"}

# Common spellings of facts that no catalogue of ours claims.
FACT_SPELLINGS: Mapping[str, str] = {
    "_raj2000": "ra", "raj2000": "ra", "ra_icrs": "ra", "_ra": "ra", "ra_deg": "ra",
    "_dej2000": "dec", "dej2000": "dec", "de_icrs": "dec", "_de": "dec", "dec_deg": "dec", "de": "dec",
    "plx": "parallax", "e_plx": "parallax_error", "pmde": "pmdec", "e_pmra": "pmra_error", "e_pmde": "pmdec_error",
    "sptype": "sp_type", "spectral_type": "sp_type", "main_type": "otype", "age": "age_myr",
}  # fmt: skip


@dataclass(frozen=True, slots=True)
class NativeColumn:
    """One column of a band in the native form."""

    column: str
    band: str
    field: str
    digit: str = ""  # suffix of a cross-match


def band_name(text: str, bands: Mapping[str, Band], aliases: Mapping[str, str], label: str = "") -> str:
    """The band that a text names, "" where it names none; g r i z are SDSS unless the label says Pan-STARRS."""
    if text in bands:
        return text
    if text in PS1_BANDS and SAYS_PS1.search(label) and PS1_BANDS[text] in bands:
        return PS1_BANDS[text]
    named = aliases.get(text, "")
    return named if named in bands else ""


def folded_band_name(text: str, bands: Mapping[str, Band], aliases: Mapping[str, str]) -> str:
    """As `band_name` whatever the case, for names of two letters and more that mean one band only."""
    if len(text) < 2:
        return ""
    lowered = text.lower()
    meant = {name for name in bands if name.lower() == lowered}
    meant |= {name for alias, name in aliases.items() if alias.lower() == lowered and name in bands}
    return meant.pop() if len(meant) == 1 else ""


def native_columns(
    names: Iterable[str], bands: Mapping[str, Band], aliases: Mapping[str, str], label: str, *, folded: bool = False
) -> list[NativeColumn]:
    """The columns that are a band's in the native form; `folded`: whatever their case."""
    found = []
    for name in names:
        match = NATIVE.match(name.lower() if folded else name)
        if match is None:
            continue
        text = name[: match.end("band")]
        band = folded_band_name(text, bands, aliases) if folded else band_name(text, bands, aliases, label)
        if band:
            found.append(NativeColumn(name, band, match["field"], match["digit"] or ""))
    return found


def fact_column(name: str, facts: Mapping[str, FactRow], stem: str) -> tuple[FactRow | None, bool]:
    """The fact that a column gives, and whether only a suffix or another spelling hides it."""
    if name in facts:
        return facts[name], False
    for spelled in (stem, stem.lower(), FACT_SPELLINGS.get(stem.lower(), "")):
        if spelled in facts:
            return facts[spelled], True
    return None, False


def hint(name: str, known: Sequence[str]) -> str:
    """A likely known name for an unknown one, "" where none is near."""
    from difflib import get_close_matches

    for other in known:
        if other.lower() == name.lower():
            return other
    near = get_close_matches(name, known, n=1, cutoff=0.85)
    return near[0] if near else ""
