"""The plain question of a check, made from where the data leave the star alone, and what to look at before ruling."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping, Sequence

from tui.desk.text import SPECTRUM_POINT, listed, short_band, signed
from tui.model import Evidence, Fit

STRONG = 3.0  # sigma: from here on a band is named as leaving the model
NAMED = 4  # bands named one by one; more are counted

ASKS = {
    "instrument": "Could {bands} be badly measured rather than truly {way}?",
    "extinction": "Can extinction on the way to us leave {bands} this {way}?",
    "blend": "Can a second source in the beam make {bands} this {way}?",
    "dust": "Can warm dust near the star make {bands} this {way}?",
}
ASKS_PLAIN = {
    "instrument": "No band leaves the star alone by 3 sigma. Is any of them badly measured?",
    "extinction": "No band leaves the star alone by 3 sigma. Does extinction matter at all?",
    "blend": "No band leaves the star alone by 3 sigma. Is there a second source?",
    "dust": "No band leaves the star alone by 3 sigma. Is there warm dust at all?",
}
ASKS_FURTHER = {  # where the bands are a plain star's, but something else is not
    "star": "Its bands agree with a plain star, but {what}.",
    "instrument": "Its bands agree with a plain star, but {what}. Could that be bad data?",
    "extinction": "Its bands agree with a plain star, but {what}. Can extinction do that?",
    "blend": "Its bands agree with a plain star, but {what}. A second source?",
    "dust": "Its bands agree with a plain star, but {what}. Can dust do that?",
}
NOT_PLAIN = {  # fact of the star's evidence: how the question says it, and why it is odd
    "dip_stands": ("it dips (page 5)", "a dip"),
    "spectrum_misfits": ("its own spectrum does not", "its spectrum"),
}
WEIGHTY = re.compile(
    "A dip stands|own spectrum|A dip or the spectrum|has to be explained|[Rr]efused|outside|leaking|more than|"
    "survives the law|silicates are gone|no pair|cannot be tested|without the suspect"
)
LIGHT = re.compile(
    "As bright as one dwarf|Photosphere source|^Not fitted|effective wavelength|No error was given|"
    "errors look too large|The spectrum is not in"
)


def question(check: str, evidence: Mapping[str, Evidence], room: int = 200) -> str:
    """What the reviewer is asked on this check, of this candidate.

    Args:
        room: columns of one line; bands are counted instead of named until the question fits.
    """
    star = evidence.get("star")
    fit = star.best if star else None
    if fit is None:
        return f"Nothing could be fitted to the star alone. Does {ARTICLES[check]} explain it?"
    strong = strong_pulls(fit)
    further = not_plain(star)
    if not strong and further:
        return ASKS_FURTHER[check].format(what=" and ".join(words[0] for words in further))
    if not strong:
        return ASKS_PLAIN[check] if check != "star" else _plain_star(fit)
    asked = [_asked(check, strong, bands) for bands in _band_words(list(strong))]
    return next((text for text in asked if len(text) <= room), asked[-1])


ARTICLES = {
    "star": "a plain star",
    "instrument": "a bad measurement",
    "extinction": "extinction",
    "blend": "a second source",
    "dust": "warm dust",
}


def strong_pulls(fit: Fit) -> dict[str, float]:
    """Bands that leave the fit by three sigma or more, the farthest first."""
    strong = {band: pull for band, pull in fit.pulls.items() if math.isfinite(pull) and abs(pull) >= STRONG}
    return dict(sorted(strong.items(), key=lambda item: -abs(item[1])))


def look_at(check: str, fit: Fit | None) -> tuple[str, ...]:
    """Where the drawn fit is weakest, or where it would show first: a place to look, never a verdict.

    Returns:
        The same said at less and less length, for whoever has less room.
    """
    if fit is None:
        return ("the measurements themselves: nothing could be fitted here.",)
    hint = HINTS[check]
    strong = strong_pulls(fit)
    if strong:
        named = [f"{short_band(band)} {signed(pull)}" for band, pull in strong.items()]
        return (f"{', '.join(named[:3])} sigma left over. {hint}", f"{', '.join(named[:2])} left over. {hint}",
                f"{named[0]} left over. {hint}", f"{named[0]} sigma left over.")  # fmt: skip
    worst = max(fit.pulls.items(), key=lambda item: abs(item[1]), default=None)
    if worst is None:
        return (hint,)
    near = f"{short_band(worst[0])} {signed(worst[1])} sigma"
    return (
        f"No band is off by 3 sigma; the farthest is {near}. {hint}",
        f"Farthest: {near}. {hint}",
        f"Farthest: {near}.",
    )


HINTS = {
    "star": "Scatter, or all to one side?",
    "instrument": "v shows flags and epochs.",
    "extinction": "Does the blue side bend with it?",
    "blend": "A second source shows first in the bands beside it.",
    "dust": "A smooth rise, or one band alone?",
}


def caution_line(check: str, evidence: Mapping[str, Evidence]) -> str:
    """The weightiest caution, and how many more there are."""
    own = evidence.get(check)
    if own is None or not own.cautions:
        return ""
    more = len(own.cautions) - 1
    return by_weight(own.cautions)[0] + (f" (+{more} more: v)" if more else "")


def by_weight(cautions: Sequence[str]) -> list[str]:
    """What may overturn a ruling first, mere remarks last; in their own order otherwise.

    >>> by_weight(["As bright as one dwarf: +0.0", "Beam 12 arcsec.", "A dip stands: it has to be explained too."])
    ['A dip stands: it has to be explained too.', 'Beam 12 arcsec.', 'As bright as one dwarf: +0.0']
    """
    return sorted(cautions, key=lambda text: 0 if WEIGHTY.search(text) else 2 if LIGHT.search(text) else 1)


def not_plain(star: Evidence | None) -> list[tuple[str, str]]:
    """What beside its bands speaks against a plain star, each in the words of `NOT_PLAIN`."""
    return [words for fact, words in NOT_PLAIN.items() if star is not None and star.facts.get(fact)]


def oddness_words(star: Evidence | None) -> str:
    """Why it is odd: the band that leaves the star alone farthest, a dip, its spectrum; or that nothing is."""
    fit = star.best if star else None
    pulls = {band: pull for band, pull in fit.pulls.items() if math.isfinite(pull)} if fit else {}
    band = max(pulls, key=lambda name: abs(pulls[name]), default=None)
    farthest = f"{short_band(band)} {signed(pulls[band])}" if band is not None else ""
    odd = [farthest] if band is not None and abs(pulls[band]) >= STRONG else []
    odd += [words[1] for words in not_plain(star)]
    if odd:
        return f"odd by {listed(odd)}"
    return f"farthest {farthest} sigma" if farthest else ""


def _plain_star(fit: Fit) -> str:
    worst = max((abs(pull) for pull in fit.pulls.values() if math.isfinite(pull)), default=0.0)
    return f"Is it a plain star? The best one meets every band within {worst:.1f} sigma."


def _asked(check: str, strong: Mapping[str, float], bands: str) -> str:
    if check != "star":
        return ASKS[check].format(bands=bands, way=_way(strong))
    verb = "is" if len(strong) == 1 else "are"
    start = bands[0].upper() + bands[1:] if bands.startswith("its") else bands
    return f"Is it a plain star after all? {start} {verb} {_way(strong, more=True)}."


def _band_words(bands: Sequence[str]) -> list[str]:
    """The bands in words, at less and less length; the points of a spectrum, of which there are tens, as one."""
    names = [short_band(band) for band in bands if not band.startswith(SPECTRUM_POINT)]
    own = ["its spectrum"] if len(names) < len(bands) else []
    words = [listed([*names, *own])] if len(names) <= NAMED else []
    words += [
        listed([*names[:count], f"{len(names) - count} more bands", *own])
        for count in (3, 2, 1)
        if len(names) > count + 1
    ]
    return [*words, listed([f"{len(names)} bands" if len(names) > 1 else names[0], *own] if names else own)]


def _way(pulls: Mapping[str, float], more: bool = False) -> str:
    up, down = any(pull > 0 for pull in pulls.values()), any(pull < 0 for pull in pulls.values())
    if up and down:
        return "brighter or fainter" if more else "bright or faint"
    return ("brighter" if more else "bright") if up else ("fainter" if more else "faint")
