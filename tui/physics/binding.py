"""Amplitudes that are not free: pairs at one distance, what is held by hand or in a profile, and the largest allowed."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tui.model import FloatArray
from tui.physics.components import Lights, Tables
from tui.physics.composite import A_GALAXY, LN_T, X2, X3, ln_unit
from tui.physics.rows import Rows

LARGE, A_LARGEST = 1e3, 4e5  # a second source so much brighter is looked at; the most a parameter row may say


@dataclass(frozen=True, slots=True, eq=False)
class Held:
    """What stays as it is in each of R rows, for profiles and fits by hand."""

    still: np.ndarray  # (P, R) bool: parameters
    ln_scale: FloatArray  # (R,) ln of theta^2; NaN where free
    share: FloatArray  # (K - 1, R) amplitudes of the further sources as parameter rows have them; NaN where free

    def take(self, keep: np.ndarray) -> Held:
        """The same for some rows."""
        return Held(self.still[:, keep], self.ln_scale[keep], self.share[:, keep])


@dataclass(frozen=True, slots=True, eq=False)
class Bind:
    """A further source whose amplitude follows the star's: by how much, where, and d ln of it by parameter column."""

    ratio: FloatArray  # (R,): amplitude over the star's, each in its brightest band; 0 where free
    where: np.ndarray | None  # (R,) bool; None: everywhere
    slopes: dict[int, FloatArray]  # 0 where free


@dataclass(frozen=True, slots=True, eq=False)
class Fixed:
    """A star's amplitude that is given in some rows."""

    where: np.ndarray  # (R,) bool
    amplitude: FloatArray  # (R,): 0 where free


def binds_of(tables: Tables, theta: FloatArray, seen: Lights, held: Held | None) -> dict[int, Bind]:
    """A pair of one distance, and amplitudes that are held."""
    kit = tables.kit
    if kit.model.bound_pair:
        return {1: bound_by(tables, theta, seen, 1, np.ones(theta.shape[1]), None)}
    if held is None:
        return {}
    known = {number + 1: np.isfinite(share) for number, share in enumerate(held.share)}
    return {
        number: bound_by(tables, theta, seen, number, np.where(where, held.share[number - 1], 0.0), where)
        for number, where in known.items()
        if where.any()
    }


def bound_by(
    tables: Tables, theta: FloatArray, seen: Lights, number: int, share: FloatArray, where: np.ndarray | None
) -> Bind:
    """A source bound by its amplitude `share` (R,) as parameter rows have it."""
    kit, own = tables.kit, (X2, X3)[number - 1]
    star, second = (theta[tables.columns.index(column)].astype(float) for column in (LN_T, own))
    ln_ratio, by_star, by_own = ln_unit(kit, kit.model.sources[number - 1], star, second)
    ln_ratio = np.clip(ln_ratio + seen.ln_top[number] - seen.ln_top[0], -80.0, 80.0)
    ratio = (share * np.exp(ln_ratio)).astype(tables.dtype)
    slopes = {LN_T: by_star, own: by_own}
    kept = {column: slope for column, slope in slopes.items() if slope is not None}
    if where is not None:
        kept = {column: slope * where for column, slope in kept.items()}
    return Bind(ratio, where, {column: slope.astype(tables.dtype) for column, slope in kept.items()})


def caps_of(
    tables: Tables, theta: FloatArray, seen: Lights, both: FloatArray, binds: dict[int, Bind]
) -> dict[int, Bind]:
    """Further sources bound where they would be larger than a parameter row may say."""
    found = {}
    for number, source in enumerate(() if tables.kit.model.bound_pair else tables.kit.model.sources, start=1):
        least = LARGE if source in ("star", "compact") else 0.0  # the cheap question first
        if not (both[number] > least * both[0]).any():
            continue
        share = np.full(theta.shape[1], A_GALAXY if source == "power" else A_LARGEST)
        most, already = bound_by(tables, theta, seen, number, share, None), binds.get(number)
        over = both[number] > most.ratio * both[0]
        if already is not None:
            over &= ~already.where
        if over.any():
            where = over if already is None else over | already.where
            ratio = np.where(over, most.ratio, 0.0 if already is None else already.ratio).astype(tables.dtype)
            slopes = {column: (slope * where).astype(tables.dtype) for column, slope in most.slopes.items()}
            found[number] = Bind(ratio, where, slopes)
    return found


def fixed_of(rows: Rows, seen: Lights, held: Held) -> Fixed | None:
    where = np.isfinite(held.ln_scale)
    if not where.any():
        return None
    ln_amplitude = np.where(where, held.ln_scale + seen.ln_top[0] - np.log(rows.unit_jy), -np.inf)
    return Fixed(where, np.exp(np.minimum(ln_amplitude, 80.0)).astype(rows.target.dtype))
