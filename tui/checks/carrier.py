"""Which band, or which instrument, carries the anomaly: the one whose removal helps the star-only fit most.

Any anomaly in one band has a carrier, a bad band and a real excess alike; only independent evidence tells them
apart.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tui.model import FloatArray
from tui.physics.spectral import is_point
from tui.physics.statistics import chi2_tail, ln_chi2_tail

BoolArray = NDArray[np.bool_]
STAR_PARAMETERS = 2  # temperature and scale


@dataclass(frozen=True, slots=True, eq=False)
class Trials:
    """Removals to try: M pairs of a candidate and a set of its bands."""

    row: NDArray[np.intp]  # shape (M,), candidate
    dropped: BoolArray  # shape (M, B)
    names: tuple[str, ...]  # length M, band or instrument

    @property
    def size(self) -> NDArray[np.intp]:
        """Bands removed in each trial, shape (M,)."""
        return self.dropped.sum(axis=1)


@dataclass(frozen=True, slots=True)
class Carrier:
    """The removal with the smallest p1 of one candidate."""

    name: str
    bands: tuple[str, ...]
    tried: int  # removals tried for this candidate
    delta_chi2: float
    p1: float  # of this removal alone
    p: float  # of the best of all tried, 1 - (1 - p1)^tried
    pull: float  # of the band against the star fitted without it; largest of an instrument's bands
    chi2_without: float
    p_without: float  # star-only p of what remains


def removal_trials(present: BoolArray, bands: Sequence[str], instruments: Sequence[str]) -> Trials:
    """Each band present, and each instrument with two or more of them, wherever more than two bands would remain.

    The points of a spectrum stand or fall together, as one instrument.

    Args:
        present: shape (N, B), band fitted for this candidate.
        bands: length B, names.
        instruments: length B, instrument of each band.
    """
    rows, masks, names = [], [], []
    sets = [(name, np.arange(len(bands)) == column) for column, name in enumerate(bands)]
    owner = np.asarray(instruments)
    sets = [pair for pair in sets if not is_point(pair[0])]
    singles = len(sets)
    sets += [(str(name), owner == name) for name in dict.fromkeys(instruments)]
    count = present.sum(axis=1)
    for number, (name, members) in enumerate(sets):
        dropped = present & members
        size = dropped.sum(axis=1)
        least = 1 if number < singles else 2
        tried = np.flatnonzero((size >= least) & (count - size > STAR_PARAMETERS))
        rows.append(tried)
        masks.append(dropped[tried])
        names += [name] * tried.size
    return Trials(np.concatenate(rows), np.concatenate(masks), tuple(names))


def sidak(p1: FloatArray, tried: FloatArray) -> FloatArray:
    """p of the smallest of `tried` independent p values: 1 - (1 - p1)^tried (Sidak 1967, JASA 62, 626).

    >>> float(sidak(0.01, 10).round(6))
    0.095618
    """
    p1 = np.asarray(p1, dtype=float)
    with np.errstate(divide="ignore"):
        return -np.expm1(np.asarray(tried, dtype=float) * np.log1p(-p1))


def find_carriers(
    trials: Trials,
    bands: Sequence[str],
    chi2_star: FloatArray,
    n_points: FloatArray,
    chi2_without: FloatArray,
    pulls: FloatArray,
) -> list[Carrier | None]:
    """The carrier of each candidate; None where no removal could be tried.

    Args:
        bands: length B.
        chi2_star: shape (N,), star-only chi-square with all bands.
        n_points: shape (N,), bands fitted.
        chi2_without: shape (M,), star-only chi-square of each trial.
        pulls: shape (N, B), star-only pulls: they give the sign; 0 where a band is absent.
    """
    delta = np.maximum(chi2_star[trials.row] - chi2_without, 0.0)
    ln_p1 = ln_chi2_tail(delta, trials.size)
    order = np.lexsort((trials.size, ln_p1, trials.row))  # on a tie the band before its instrument
    first = np.unique(trials.row[order], return_index=True)[1]
    tried = np.bincount(trials.row, minlength=len(chi2_star))
    found: list[Carrier | None] = [None] * len(chi2_star)
    for trial in order[first]:
        row, members = trials.row[trial], trials.dropped[trial]
        dof = float(n_points[row] - members.sum() - STAR_PARAMETERS)
        p1 = float(np.exp(ln_p1[trial]))
        found[row] = Carrier(
            name=trials.names[trial],
            bands=tuple(np.asarray(bands)[members].tolist()),
            tried=int(tried[row]),
            delta_chi2=float(delta[trial]),
            p1=p1,
            p=float(sidak(p1, tried[row])),
            pull=_pull(pulls[row], members, float(delta[trial])),
            chi2_without=float(chi2_without[trial]),
            p_without=float(chi2_tail(chi2_without[trial], dof)),
        )
    return found


def _pull(pulls: FloatArray, members: BoolArray, delta_chi2: float) -> float:
    """Of one band: sqrt(delta chi2), the pull against a fit that never saw it; of several: the largest pull."""
    largest = float(pulls[members][np.argmax(np.abs(pulls[members]))])
    return float(np.copysign(np.sqrt(delta_chi2), largest)) if members.sum() == 1 else largest
