"""Remarks that every check makes of its fits, in plain sentences."""

from __future__ import annotations

from collections.abc import Sequence

from tui.model import Fit, Settings

TOO_GOOD = 0.99
CARRIES = 1.0  # a band carries an improvement where its squared pull falls by more than this


def source_named(photosphere: str) -> str:
    """A photosphere source as sentences call it: a grid without the digits of its digest.

    >>> source_named("dwarfs"), source_named("grid:0123456789abcdef mygrid (4000-7000 K)")
    ('dwarfs', 'grid mygrid (4000-7000 K)')
    """
    kind, colon, rest = photosphere.partition(":")
    return f"{kind} {rest.partition(' ')[2]}".strip() if colon else photosphere


def source_remark(photosphere: str) -> list[str]:
    """Which photosphere source the fits rest on, where it is not the usual one."""
    return [] if photosphere == "dwarfs" else [f"Photosphere source: {source_named(photosphere)}."]


def gain_over_star(fit: Fit, star: Fit) -> dict[str, object]:
    """How much better than the star alone a fit is, and which bands carry that."""
    falls = {
        band: star.pulls.get(band, 0.0) ** 2 - pull**2 for band, pull in fit.pulls.items() if band in star.pulls
    }
    ranked = sorted((band for band in falls if falls[band] > CARRIES), key=lambda band: -falls[band])
    return {"delta_chi2": star.chi2 - fit.chi2, "carried_by": ranked[:4]}


def common_remarks(best: Fit | None, star_adequate: bool | None, settings: Settings, *, is_star: bool = False) -> list[str]:
    """Remarks about a check's best fit: the star alone fits, errors look too large."""
    if best is None:
        return []
    remarks = []
    if star_adequate and not is_star:
        remarks.append("The star alone fits: nothing here needs explaining.")
    if best.dof <= 0:
        remarks.append("The best fit cannot be tested: it has as many free parameters as there are points.")
    if best.dof > 0 and best.p > TOO_GOOD:
        remarks.append(f"p = {best.p:.3f}: the errors look too large.")
    return remarks


def joined(words: Sequence[str]) -> str:
    """`a`, `a and b`, `a, b and c`."""
    if len(words) < 2:
        return "".join(words)
    return ", ".join(words[:-1]) + " and " + words[-1]
