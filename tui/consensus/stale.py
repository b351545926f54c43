"""Does a ruling still count, now that the evidence may have been computed again?"""

from __future__ import annotations

import math

from tui.model import Evidence

PULL_MOVE = 1.0  # sigma; a pull that moved by more makes the ruling stale (design: "within 1 sigma in every pull")
_ADEQUATE = {True: "adequate", False: "not adequate", None: "untestable"}


def counts(cited: Evidence | None, current: Evidence | None) -> str:
    """Why a ruling is stale, in a few words; empty while it counts.

    Args:
        cited: the evidence that was on screen when it was made; None where the queue does not hold it.
        current: today's evidence of the same check; None while none is computed, and then nothing speaks against
            the ruling.
    Returns:
        "" where both agree in `adequate`, in the bands fitted and, within 1 sigma, in every pull of the best fit.

    >>> counts(Evidence("dust", 1, True), Evidence("dust", 1, False))
    'was adequate, now not adequate'
    """
    if current is None or cited is current:
        return ""
    if cited is None:
        return "the evidence it cites is not in this queue"
    if cited.adequate is not current.adequate:
        return f"was {_ADEQUATE[cited.adequate]}, now {_ADEQUATE[current.adequate]}"
    return _bands_moved(cited, current) or _pulls_moved(cited, current)


def _bands_moved(cited: Evidence, current: Evidence) -> str:
    if set(cited.bands) == set(current.bands):
        return ""
    added = [f"{band} added" for band in current.bands if band not in cited.bands]
    dropped = [f"{band} dropped" for band in cited.bands if band not in current.bands]
    return "bands fitted: " + ", ".join(added + dropped)


def _pulls_moved(cited: Evidence, current: Evidence) -> str:
    then = cited.best.pulls if cited.best else {}
    now = current.best.pulls if current.best else {}
    if then.keys() != now.keys():
        return "bands with a pull: " + ", ".join(sorted(then.keys() ^ now.keys()))
    moves = {band: _move(then[band], now[band]) for band in then}
    band = max(moves, key=moves.__getitem__, default="")
    if not band or moves[band] <= PULL_MOVE:
        return ""
    if math.isinf(moves[band]):
        return f"the pull in {band} is no longer the number it was"
    return f"the pull in {band} moved by {moves[band]:.1f} sigma"


def _move(then: float, now: float) -> float:
    """How far a pull moved, sigma; infinite where only one of the two is a finite number."""
    if then == now or (math.isnan(then) and math.isnan(now)):
        return 0.0
    move = abs(then - now)
    return math.inf if math.isnan(move) else move
