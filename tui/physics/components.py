"""The light of a model's sources, each by itself and in units of its brightest band: bands first, many rows at once.

Arrays here are (B, R), bands by rows, since numpy is quickest along the last axis; a single-precision copy of the
tables serves wherever a rank among minima is all that is asked.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from tui.model import FloatArray
from tui.physics.composite import AV, LN_T, POWER_REDDENING_K, RV, X2, X3, Kit
from tui.physics.constants import MAG
from tui.physics.reddening import AV_MAX, AV_SCALE, Reddening, derivative_matrix
from tui.physics.sources import SourceGrid

KITS_KEPT = 24
MUCH = 60.0  # ln of how far an unmeasured band may outshine the measured ones


@dataclass(frozen=True, slots=True, eq=False)
class Pieces:
    """Cubic pieces of a source grid, transposed: (4 B, N - 1)."""

    low: float
    step: float
    table: FloatArray

    def at(self, x: FloatArray) -> tuple[FloatArray, FloatArray]:
        """ln flux and its derivative with x, each (B, R), at x (R,)."""
        place = (x - self.low) / self.step
        np.maximum(place, 0.0, out=place)
        np.minimum(place, self.table.shape[1], out=place)
        left = np.minimum(place.astype(np.intp), self.table.shape[1] - 1)
        t = place - left
        c0, c1, c2, c3 = self.table.take(left, axis=1).reshape(4, -1, x.size)
        c3 *= t
        slope = 2.0 * c2
        slope += 3.0 * c3
        slope *= t
        slope += c1
        slope /= self.step
        c3 += c2
        c3 *= t
        c3 += c1
        c3 *= t
        c3 += c0
        return c3, slope


@dataclass(frozen=True, slots=True, eq=False)
class Screen:
    """The reddening polynomial of one family of sources, as matrices over products of Chebyshev polynomials."""

    reddening: Reddening
    table: FloatArray  # (B, T A R)
    slopes: tuple[FloatArray, ...]  # (n, n): derivatives of the polynomials of each variable

    def at(self, ln_t: FloatArray, av: FloatArray, r_v: FloatArray | None) -> list[FloatArray]:
        """A_band (mag) and its derivatives with ln T, A_V and, where R_V is free, R_V: (B, R) each."""
        here, dtype = self.reddening, self.table.dtype
        top = np.log1p(AV_MAX / AV_SCALE)
        units = [_inside(ln_t, *here.ln_t), (2.0 / top) * np.log1p(av / AV_SCALE) - 1.0]
        if r_v is not None:
            units.append(_inside(1.0 / r_v, *here.inverse_rv))
        plain = [_polynomials(unit, slope.shape[0], dtype) for unit, slope in zip(units, self.slopes, strict=False)]
        slid = [slope @ basis for slope, basis in zip(self.slopes, plain, strict=False)]
        kinds = [plain, *[[*plain[:n], slid[n], *plain[n + 1 :]] for n in range(len(plain))]]
        stacked = np.concatenate([_outer(kind) for kind in kinds], axis=1)
        shape, by_t, by_a, *by_r = _halves(self.table @ stacked, len(kinds))
        by_t *= av * (2.0 / (here.ln_t[1] - here.ln_t[0]))
        by_a *= (2.0 / top) * av / (AV_SCALE + av)
        by_a += shape
        found = [av * shape, by_t, by_a]
        if by_r:
            found.append(by_r[0] * (av * (-2.0 / (here.inverse_rv[1] - here.inverse_rv[0])) / r_v**2))
        return found


def _inside(value: FloatArray, low: float, high: float) -> FloatArray:
    unit = (2.0 * value - (low + high)) / (high - low)
    return np.minimum(np.maximum(unit, -1.0), 1.0)


def _halves(array: FloatArray, count: int) -> list[FloatArray]:
    """An array (B, count R) as `count` arrays (B, R)."""
    width = array.shape[1] // count
    return [array[:, number * width : (number + 1) * width] for number in range(count)]


def _polynomials(unit: FloatArray, count: int, dtype: np.dtype) -> FloatArray:
    """Chebyshev polynomials of degree < count, (count, R)."""
    basis = np.empty((count, unit.size), dtype)
    basis[0] = 1.0
    if count > 1:
        basis[1] = unit
        twice = 2.0 * unit
    for degree in range(2, count):
        np.multiply(twice, basis[degree - 1], out=basis[degree])
        basis[degree] -= basis[degree - 2]
    return basis


def _outer(bases: list[FloatArray]) -> FloatArray:
    """Products of one polynomial of each variable, (T A R, R)."""
    product = bases[0]
    for basis in bases[1:]:
        product = (product[:, None] * basis[None]).reshape(-1, basis.shape[1])
    return product


@dataclass(frozen=True, slots=True, eq=False)
class Tables:
    """One model's tables, transposed, in one precision."""

    kit: Kit
    dtype: np.dtype
    columns: tuple[int, ...]  # of the parameter row: those that are not amplitudes, in the order of `Lights.slopes`
    sources: tuple[Pieces, ...]  # the star, then the further ones
    screens: tuple[Screen | None, ...]


@lru_cache(maxsize=KITS_KEPT)
def tables_of(kit: Kit, dtype: type) -> Tables:
    """Transposed tables of a kit; the last ones asked for are kept."""
    free = kit.model.free
    columns = tuple(column for column in free if column in (LN_T, AV, RV, X2, X3))
    grids, reddenings = (kit.star, *kit.further), (kit.star_reddening, *kit.further_reddening)
    screens = [_screen(each, RV in free, dtype) if AV in free else None for each in reddenings]
    return Tables(kit, np.dtype(dtype), columns, tuple(_pieces(grid, dtype) for grid in grids), tuple(screens))


def _pieces(grid: SourceGrid, dtype: type) -> Pieces:
    return Pieces(grid.low, grid.step, np.ascontiguousarray(grid.pieces.T, dtype=dtype))


def _screen(reddening: Reddening, with_rv: bool, dtype: type) -> Screen:
    counts = reddening.coefficients.shape[: 3 if with_rv else 2]
    table = reddening.coefficients if with_rv else reddening.coefficients[:, :, 0]
    table = np.ascontiguousarray(table.reshape(-1, table.shape[-1]).T, dtype=dtype)
    slopes = tuple(np.ascontiguousarray(derivative_matrix(count).T, dtype=dtype) for count in counts)
    return Screen(reddening, table, slopes)


@dataclass(frozen=True, slots=True, eq=False)
class Lights:
    """What each of K sources shows at R rows of parameters, its brightest measured band 1."""

    flux: list[FloatArray]  # K of (B, R)
    slopes: list[dict[int, FloatArray]]  # K of: parameter column -> d ln flux, (B, R)
    ln_top: list[FloatArray]  # K of (R,): ln of the flux of a source of scale 1 in that band


def lights(tables: Tables, theta: FloatArray, absent: FloatArray) -> Lights:
    """Evaluate the sources at parameters `theta` (P, R), in the order of `tables.columns`.

    Args:
        absent: (B, R), 0 where a band was measured, else very negative: such a band is not the brightest.
    """
    place = {column: index for index, column in enumerate(tables.columns)}
    own = [theta[place[column]] for column in (LN_T, X2, X3)[: len(tables.sources)]]
    screen = (theta[place[AV]] if AV in place else None, theta[place[RV]] if RV in place else None)
    if len(own) == 2 and tables.kit.model.sources == ("star",):  # both stars at once
        twice = [None if part is None else np.concatenate([part, part]) for part in screen]
        both = _seen(tables, 0, np.concatenate(own), *twice)
        seen = list(zip(*((None, None) if part is None else _halves(part, 2) for part in both), strict=True))
    else:
        seen = [_seen(tables, number, one, *screen) for number, one in enumerate(own)]
    found = Lights([], [], [])
    for column, (value, slope, by_av, by_rv) in zip((LN_T, X2, X3), seen, strict=False):
        top = (value + absent).max(axis=0)
        value -= top
        np.minimum(value, MUCH, out=value)
        found.flux.append(np.exp(value, out=value))
        slopes = {column: slope, AV: by_av, RV: by_rv}
        found.slopes.append({key: part for key, part in slopes.items() if part is not None})
        found.ln_top.append(top)
    return found


def _seen(
    tables: Tables, number: int, own: FloatArray, av: FloatArray | None, r_v: FloatArray | None
) -> tuple[FloatArray, FloatArray, FloatArray | None, FloatArray | None]:
    """ln flux of one source and its derivatives with its own parameter, A_V and R_V, (B, R) each."""
    value, slope = tables.sources[number].at(own)
    screen = tables.screens[number]
    if screen is None:
        return value, slope, None, None
    power = number > 0 and tables.kit.model.sources[number - 1] == "power"
    colour = np.full(own.shape, np.log(POWER_REDDENING_K), own.dtype) if power else own
    dimmed = screen.at(colour, av, r_v)
    for part in dimmed:
        part *= -MAG
    value += dimmed[0]
    if not power:
        slope += dimmed[1]
    return value, slope, dimmed[2], dimmed[3] if r_v is not None else None
