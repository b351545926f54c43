"""What a check found beside its fits, and what catalogues say of a star: each fact by a plain name, with its unit."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from tui.desk.text import OFTEN, number, once_in, p_text, safe, short_band, signed
from tui.desk.widgets.numbers import value_and_error
from tui.model import Param
from tui.workflow.vocabulary import facts as known_facts

Pair = tuple[str, str]  # name and value, both safe


@dataclass(frozen=True, slots=True)
class FactName:
    """How a fact is called on the page, how its number is written, and by what it is multiplied."""

    label: str
    form: str = ""  # a format of Python's; "p" for a chance probability; "" for whatever it is
    unit: str = ""
    factor: float = 1.0


FACTS: Mapping[str, FactName] = {
    "oddness": FactName("oddness", ".1f", "sigma"),
    "spectrum_teff": FactName("star nearest to the spectrum", ".0f", "K"),
    "spectrum_misfits": FactName("spectrum is no plain star's"),
    "dip_stands": FactName("a dip stands"),
    "delta_chi2": FactName("chi2 below the star alone by", ".1f"),
    "carried_by": FactName("carried by"),
    "neighbours": FactName("other sources loaded"),
    "neighbours_in_beam": FactName("most of them in one beam"),
    "ruwe": FactName("RUWE", ".2f"),
    "ipd_frac_multi_peak": FactName("Gaia windows with two peaks", ".0f", "%"),
    "ipd_gof_harmonic_amplitude": FactName("Gaia image asymmetry", ".3f"),
    "bp_blended_share": FactName("BP transits blended", ".1f", "%", 100.0),
    "rp_blended_share": FactName("RP transits blended", ".1f", "%", 100.0),
    "non_single_star": FactName("Gaia non-single solution"),
    "nearest_source": FactName("nearest other source", ".1f", "arcsec"),
    "chance_alignment": FactName("chance alignment", "p"),
    "chance_star": FactName("  of it with a star", "p"),
    "chance_galaxy": FactName("  of it with a galaxy", "p"),
    "chance_radius": FactName("  within", ".1f", "arcsec"),
    "chance_star_source": FactName("  stars counted by"),
    "chance_galaxy_source": FactName("  galaxies counted by"),
    "law": FactName("extinction law"),
    "av_line_of_sight": FactName("most A_V on the way to it", ".2f", "mag"),
    "other_law": FactName("other law tried"),
    "other_law_p": FactName("p of the best fit with it", "p"),
    "excess_survives_other_law": FactName("excess survives that law"),
    "gaia_scatter": FactName("Gaia G scatter", ".2f", "%", 100.0),
    "gaia_quiet_scatter": FactName("of a quiet star like it", ".2f", "%", 100.0),
    "gaia_scatter_ratio": FactName("their ratio", ".2f"),
    "gaia_own_scatter": FactName("scatter of its own", ".2f", "%", 100.0),
    "flags_fine": FactName("flags that raise nothing"),
    "doubts_fine": FactName("other tests passed"),
    "suspect_bands": FactName("suspect bands"),
    "p_without_suspects": FactName("p of the star without them", "p"),
    "carrier_p": FactName("  chance of such a carrier", "p"),
    "carrier_p1": FactName("  for this one alone", "p"),
    "carrier_tried": FactName("  carriers tried"),
    "carrier_p_without": FactName("  p of the star without it", "p"),
    "carrier_suspect": FactName("  and it is suspect"),
    "w4_reads_high": FactName("W4 reads high, red source", ".1f", "%", 100.0),
    "points": FactName("bands"),
    "p": FactName("p, at most", "p"),
    "at_most": FactName("chi2 is an upper bound"),
    "chi2": FactName("chi2", ".1f"),
    "family": FactName("made of"),
    "stands": FactName("a dip stands"),
    "standing_events": FactName("dips that stand"),
    "delta_chi2_grey": FactName("chi2 of grey above the best", ".1f"),
    "refused": FactName("models refused"),
    "grey_adequate": FactName("grey is adequate"),
    "law_adequate": FactName("extinction is adequate"),
    "coloured_adequate": FactName("some colour is adequate"),
}
# Told together with another fact, in a table, or as a sentence above the list.
TOLD_ELSEWHERE = frozenset(
    "odd_pull over_luminosity_error c_star_sigma c_star_significance spectrum_dof spectrum_p slope_low slope_high "
    "slope_is_limit chi2_found chance_mag carrier_bands carrier_pull match_catalogue match_separation match_p sentence "
    "limit_temperature_k limit_fractional_luminosity neighbour_leaks matches centroid_shifts flags doubts epochs "
    "apertures witness parts events".split()
)


def evidence_pairs(facts: Mapping[str, Any]) -> list[Pair]:
    """The facts of a piece of evidence that are a value each; those that are tables are left to `fact_tables`."""
    said = []
    for key, value in facts.items():
        if key in TOLD_ELSEWHERE or is_empty(value):
            continue
        together = TOGETHER.get(key)
        said.append(together(facts) if together else _pair(key, value))
    return said


def catalogue_pairs(facts: Mapping[str, Any]) -> list[Pair]:
    """What the catalogues say, an error beside its value where both have one unit."""
    known = known_facts()
    unit_of = {key: known[key].unit.replace(" ", "") if key in known else "" for key in facts}
    said = []
    for key, value in facts.items():
        if is_empty(value) or _belongs_to_another(key, facts, unit_of):
            continue
        error = facts.get(f"{key}_error") if unit_of.get(f"{key}_error") == unit_of[key] else None
        text = _measured(value, error, unit_of[key])
        said.append((safe(key).replace("_", " "), " ".join(part for part in (text, unit_of[key]) if part)))
    return said


def is_empty(value: Any) -> bool:
    """Whether there is nothing to tell."""
    return value is None or isinstance(value, float) and math.isnan(value) or value in ("", [], {}, ())


def words(value: Any) -> str:
    """A value of any kind as people read it, its numbers to four digits."""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, float):
        text = number(value, 4)
        return text.rstrip("0").rstrip(".") if "." in text and "e" not in text else text
    if isinstance(value, Mapping):
        return ", ".join(f"{safe(key)} {words(item)}" for key, item in value.items())
    if isinstance(value, (list, tuple)):
        return ("\n" if any(isinstance(item, Mapping) for item in value) else ", ").join(words(item) for item in value)
    return short_band(value) if isinstance(value, str) else safe(value)


def chance_words(p: float) -> str:
    """A chance probability and, where it is small, how often that is."""
    return p_text(p, 2) if p >= OFTEN else f"{p_text(p, 2)}, {once_in(p)}"


def _pair(key: str, value: Any) -> Pair:
    name = FACTS.get(key, FactName(safe(key).replace("_", " ")))
    is_number = isinstance(value, (int, float)) and not isinstance(value, bool)
    if not is_number or not name.form:
        return name.label, words(value)
    text = chance_words(value) if name.form == "p" else f"{value * name.factor:{name.form}}"
    return name.label, f"{text} {name.unit}".rstrip()


def _belongs_to_another(key: str, facts: Mapping[str, Any], unit_of: Mapping[str, str]) -> bool:
    value = key.removesuffix("_error")
    return value != key and not is_empty(facts.get(value)) and unit_of.get(value) == unit_of[key]


def _measured(value: Any, error: Any, unit: str) -> str:
    if not isinstance(value, float):
        return words(value)
    if isinstance(error, float) and error > 0:
        return "".join(value_and_error(Param(value, value - error, value + error)))
    decimals = {"deg": 5, "mag": 3, "yr": 2}.get(unit)
    return words(value) if decimals is None else f"{value:.{decimals}f}"


def _with_error(value: float, error: float | None, unit: str) -> str:
    error = math.nan if error is None else error
    return "".join((*value_and_error(Param(value, value - error, value + error)), f" {unit}" if unit else ""))


def _chi2(facts: Mapping[str, Any]) -> Pair:
    """A bound and what the search found, which are two things; where only one is known, that."""
    least, found = f"{facts['chi2']:.1f}", facts.get("chi2_found")
    if is_empty(found):
        return "chi2", least
    return "chi2", f"no mixture can undercut {least}; the nearest found has {found:.1f}"


def _odd_band(facts: Mapping[str, Any]) -> Pair:
    return "band farthest from the star", f"{short_band(facts['odd_band'])} {signed(facts.get('odd_pull'))} sigma"


def _over_luminosity(facts: Mapping[str, Any]) -> Pair:
    return "over-luminosity", _with_error(facts["over_luminosity"], facts.get("over_luminosity_error"), "mag")


def _c_star(facts: Mapping[str, Any]) -> Pair:
    text = _with_error(facts["c_star"], facts.get("c_star_sigma"), "")
    return "BP/RP excess C*", f"{text} ({signed(facts.get('c_star_significance'))} sigma)"


def _spectrum(facts: Mapping[str, Any]) -> Pair:
    text = f"chi2 {facts['spectrum_chi2']:.1f}, dof {facts.get('spectrum_dof', '--')}"
    return "own spectrum, plain star", f"{text}, p {p_text(facts.get('spectrum_p'), 2)}"


def _slope(facts: Mapping[str, Any]) -> Pair:
    ends = facts.get("slope_low"), facts.get("slope_high")
    low, high = (math.nan if end is None else end for end in ends)
    param = Param(facts["slope"], low, high, limit=bool(facts.get("slope_is_limit")))
    return "slope alpha of the depths", "".join(value_and_error(param, least=-math.inf))


def _chance_band(facts: Mapping[str, Any]) -> Pair:
    return "  source needed", f"{short_band(facts['chance_band'])} {number(facts.get('chance_mag'), 3)} mag"


def _carrier(facts: Mapping[str, Any]) -> Pair:
    bands = words(facts.get("carrier_bands") or [])
    name = short_band(facts["carrier_band"])
    text = name if bands in ("", name) else f"{name} ({bands})"
    return "carrier", f"{text}, {signed(facts.get('carrier_pull'))} sigma"


TOGETHER: Mapping[str, Callable[[Mapping[str, Any]], Pair]] = {
    "chi2": _chi2,
    "odd_band": _odd_band,
    "over_luminosity": _over_luminosity,
    "c_star": _c_star,
    "spectrum_chi2": _spectrum,
    "slope": _slope,
    "chance_band": _chance_band,
    "carrier_band": _carrier,
}
