"""What the three reviewers wrote beside their rulings."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from tui.model import Candidate, Evidence

# check, ruling -> notes; a name in braces is a number of the evidence; "" is no note at all
NOTES: Mapping[tuple[str, str], tuple[str, ...]] = {
    ("star", "explains"): (
        "Plain {teff} K dwarf, nothing above {pull} sigma.",
        "The star alone fits, p = {p}. Not odd.",
        "",
        "",
        "Nothing here: the largest pull is {pull} in {band}.",
        "I see no excess at all.",
    ),
    ("star", "short"): (
        "{band} is {pull} sigma off, no plain star does that.",
        "Clear misfit in {band}.",
        "",
        "",
        "",
        "{band} sticks out by {pull} sigma.",
    ),
    ("star", "unclear"): ("The excess in {band} could still be the photosphere.", "Borderline, p = {p}."),
    ("instrument", "explains"): (
        "{suspects} flagged; without it the star fits.",
        "I would not trust {suspects} here.",
        "The flag tells it all, drop {suspects}.",
        "Bad {suspects}, fine star.",
    ),
    ("instrument", "short"): (
        "No flag on {band}, it looks clean to me.",
        "Flags are fine.",
        "",
        "",
        "",
        "Data look good, and more than one band shows it.",
    ),
    ("instrument", "unclear"): (
        "Flags are silent, but I have seen {band} go wrong like this.",
        "Would like to see the image first.",
    ),
    ("extinction", "explains"): (
        "A_V {av} does it, and the line of sight allows that.",
        "Reddened by {av} mag, nothing else.",
        "Just reddening.",
        "A_V {av} brings every band in line.",
    ),
    ("extinction", "short"): (
        "Reddening cannot make {band} bright.",
        "A_V does not help.",
        "",
        "",
        "",
        "High latitude, hardly any dust in front.",
    ),
    ("extinction", "unclear"): ("A_V {av} is more than I would expect there.", "The laws differ too much at this A_V."),
    ("blend", "explains"): (
        "A second source makes it: {model}.",
        "Two objects in the beam.",
        "{model} fits, p = {p}.",
        "Confusion, I am sure.",
    ),
    ("blend", "short"): (
        "Nothing in the beam, and a pair fits no better.",
        "A companion would need a size that stars do not have.",
        "",
        "",
        "",
        "Single by RUWE and by brightness.",
    ),
    ("blend", "unclear"): (
        "The power law fits, but so would others. Needs an image.",
        "Cannot tell without better resolution.",
    ),
    ("dust", "explains"): (
        "{kelvin} K, f = {fraction}: a disc like many.",
        "Warm dust, {kelvin} K.",
        "Dust, and the errors are honest.",
        "Textbook excess, {kelvin} K.",
    ),
    ("dust", "short"): (
        "No dust gives that slope.",
        "One band only, I would not call that dust.",
        "",
        "",
        "",
        "Needs f beyond what a disc can take.",
    ),
    ("dust", "unclear"): ("One band fixes no temperature.", "Dust fits, but so does a galaxy behind it."),
}
# recipe, check, ruling -> notes that only fit there
SPECIAL: Mapping[tuple[str, str, str], tuple[str, ...]] = {
    ("fast star matched to a galaxy", "blend", "explains"): (
        "AllWISE lies 3 arcsec from where the star was in 2010. Wrong source.",
        "Fast star, and WISE measured something else.",
    ),
    ("neighbour in the WISE beam", "blend", "explains"): (
        "The neighbour at 4 arcsec leaks enough into W1 and W2.",
        "Same beam, two stars: see the neighbour table.",
    ),
    ("neighbour in the WISE beam", "instrument", "explains"): ("The beam is too wide for this field.",),
    ("M dwarf with white dwarf", "blend", "explains"): (
        "White dwarf beside an M dwarf; u gives it away.",
        "M dwarf with a hot companion, nothing exotic.",
    ),
    ("equal pair", "blend", "explains"): (
        "Too bright for its colour: two of them.",
        "0.7 mag above the sequence. A twin.",
    ),
    ("equal pair", "star", "short"): ("Fits as one star, but it is far too bright for one.",),
    ("galaxy in the beam", "blend", "explains"): (
        "Rises as a power law, no hump: a galaxy behind it.",
        "Faint star, big beam, many galaxies at this depth.",
    ),
    ("grey dip", "star", "short"): (
        "The spectrum is plain, the dimming is not.",
        "It dimmed in June 2014. Plain stars do not.",
    ),
    ("coloured dip", "star", "short"): ("A dip, deeper in the blue.", "It dimmed in June 2014. Plain stars do not."),
    ("grey dip", "blend", "explains"): (
        "Same depth in every band: an eclipse.",
        "Grey to within the errors. Eclipsing pair.",
    ),
    ("coloured dip", "dust", "explains"): ("Deeper in the blue, as fine dust is.", "The dip reddens: dust passing by."),
    ("on one strip of warm detector", "instrument", "explains"): (
        "Third one with the very same pattern in this corner of the field.",
    ),
    ("on one strip of warm detector", "dust", "explains"): ("Looks like warm dust to me, {kelvin} K.",),
}
SCREEN = (
    "Ran every check, nothing comes close in the optical.",
    "Look at g and r: no reddening bends that way.",
    "",
    "The bound refuses any mixture. Ask for a spectrum.",
    "No idea. Not this, anyway.",
    "",
)


def choices(recipe: str, check: str, ruling: str) -> tuple[str, ...]:
    """The notes one may choose from."""
    if recipe.startswith("screen") and ruling == "short":
        return SCREEN
    return SPECIAL.get((recipe, check, ruling)) or NOTES[check, ruling]


def numbers(candidate: Candidate, evidence: Mapping[str, Evidence], check: str) -> dict[str, Any]:
    """What a note may quote."""
    star, own = evidence["star"], evidence[check]
    params = dict(own.best.params) if own.best else {}
    suspects = evidence["instrument"].facts.get("suspect_bands") or ["?"]

    def value(name: str, form: str) -> str:
        return format(params[name].value, form) if name in params else "?"

    return {
        "teff": f"{star.best.params['teff'].value:.0f}" if star.best else "?",
        "pull": f"{star.facts.get('odd_pull', 0.0):+.1f}",
        "band": star.facts.get("odd_band", "it"),
        "p": f"{own.best.p:.2g}" if own.best else "?",
        "suspects": " and ".join(suspects[:2]),
        "av": value("av", ".1f"),
        "model": own.best.model if own.best else "?",
        "kelvin": value("dust_temperature", ".0f"),
        "fraction": value("dust_fractional_luminosity", ".1e"),
    }


def note(
    recipe: str, candidate: Candidate, evidence: Mapping[str, Evidence], check: str, ruling: str, turn: float
) -> str:
    """The note of one ruling; `turn` from 0 to 1 chooses it. One whose number is not known is left away."""
    found = choices(recipe, check, ruling)
    text = found[int(turn * len(found))].format(**numbers(candidate, evidence, check))
    return "" if "?" in text else text
