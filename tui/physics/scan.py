"""Coarse scans over all temperatures and screens, amplitudes in closed form: where a descent should start.

A scan only ranks places, so it works in single precision, and in pieces that stay in the processor's cache. Of the
amplitudes only the fall of chi-square that they bring is computed; branches and index searches, which cost more than
all arithmetic, are left to the few places that are chosen in the end.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from tui.model import FloatArray
from tui.physics.composite import AV, LN_T, POWER_REDDENING_K, RV, WIDTH, X2, Kit, parallax_of
from tui.physics.constants import MAG
from tui.physics.likelihood import Errors, parallax_sigma
from tui.physics.problem import Problem

AV_NODES = np.array([0, 0.15, 0.4, 0.8, 1.4, 2.2, 3.2, 4.5, 6, 8, 10.5, 13.5, 17, 21, 25, 30.0])
RV_NODES = np.array([2.5, 3.1, 4.0, 5.2])
STAR_NODES = 60
FURTHER_NODES = {"dust": 32, "star": 30, "compact": 24, "power": 16}
STARTS = 4
PARTS_ALONG_T = 15  # temperature and screen make a long valley with several minima: a start from each part of it
COARSE = np.float32
TINY = 1e-30
ALIKE = 1e-5  # two sources as alike as that are one
SCAN_CELLS = 400_000  # cells of one scan worked on at a time; more would only cost memory
KITS_KEPT = 24
BEHIND, ROUGH = 100.0, 50.0  # of chi-square; the farther, the worse the best is


@dataclass(frozen=True, slots=True, eq=False)
class Starts:
    """Places to descend from, the best of the scan's first."""

    x: FloatArray  # (S, M, 8): temperatures and screen; amplitudes are not set
    gain: FloatArray  # (S, M): fall of chi-square there, by the scan

    def hopeful(self, problem: Problem, errors: Errors) -> np.ndarray:
        """Which places (S, M) are not so far behind the best that none was ever seen to lead to the lowest minimum."""
        all_of_it = np.sum(np.where(problem.detected, problem.flux_jy / errors.sigma, 0.0) ** 2, axis=1)
        top = self.gain.max(axis=0)
        return top - self.gain <= BEHIND * (1.0 + np.maximum(all_of_it - top, 0.0) / ROUGH)


@dataclass(frozen=True, slots=True, eq=False)
class _Weighted:
    """Data as scans use them, fluxes in units of each candidate's brightest."""

    weight: FloatArray  # (B, M)
    weighted: FloatArray  # (B, M)
    level: FloatArray  # (B, M) limits over sigma, 0 where none
    inverse: FloatArray  # (B, M) the unit over sigma of limits, 0 where none
    limited_bands: tuple[int, ...]
    reach: FloatArray  # (M,) highest A_V node to look at
    ln_parallax: FloatArray  # (M,) ln of parallax squared over the unit
    firmness: FloatArray  # (M,) inverse square of the scale's relative error by the parallax; 0 where not known

    def take(self, rows: np.ndarray) -> _Weighted:
        """The same for some candidates."""
        whole = (self.weight, self.weighted, self.level, self.inverse)
        single = (self.reach, self.ln_parallax, self.firmness)
        cut = [part[:, rows] for part in whole]
        return _Weighted(*cut, self.limited_bands, *(part[rows] for part in single))

    def overshoot(self, band: int, model: FloatArray) -> FloatArray:
        """How far model fluxes (..., M) of a band lie above its limit, in sigma; the model is used up."""
        model *= self.inverse[band]
        model -= self.level[band]
        return np.maximum(model, 0.0, out=model)

    def drawn(self, ln_wish: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Weight and value of the scale that the parallax asks for, shaped as `ln_wish` broadcast with (M,)."""
        wish = np.exp(np.clip(ln_wish + self.ln_parallax, -25.0, 35.0)).astype(COARSE)
        return (self.firmness / (wish * wish)).astype(COARSE), wish

    def shut(self, screen: _Screen) -> FloatArray:
        """Infinite for candidates that do not look behind this screen, else 0."""
        return np.where(screen.av <= self.reach, 0.0, np.inf).astype(COARSE)


def _weigh(problem: Problem, errors: Errors) -> _Weighted:
    flux = np.where(problem.detected, problem.flux_jy, 0.0)
    unit = np.maximum(np.abs(flux).max(axis=1, initial=0.0), 1e-300)
    weight = np.where(problem.detected, (unit[:, None] / errors.sigma) ** 2, 0.0)
    inverse = np.where(problem.limited, unit[:, None] / errors.sigma, 0.0)
    level = np.where(problem.limited, problem.flux_jy / errors.sigma, 0.0)
    known = np.isfinite(problem.parallax_mas)
    parallax = np.where(known, problem.parallax_mas, 1.0)
    parts = (weight, weight * flux / unit[:, None], level, inverse)
    return _Weighted(
        *(np.ascontiguousarray(part.T, COARSE) for part in parts),
        limited_bands=tuple(np.flatnonzero(problem.limited.any(axis=0))),
        reach=AV_NODES[np.minimum(np.searchsorted(AV_NODES, problem.av_max - 1e-9), AV_NODES.size - 1)],
        ln_parallax=2 * np.log(parallax) - np.log(unit),
        firmness=np.where(known, (parallax / (2 * parallax_sigma(problem))) ** 2, 0.0),
    )


@dataclass(frozen=True, slots=True, eq=False)
class _Screen:
    """The sources' tables behind one screen, each row in units of its largest band."""

    av: float
    rv: float
    first: FloatArray  # (T, B)
    second: FloatArray | None = None  # (U, B)
    product: FloatArray | None = None  # (T U, B)
    ratio: FloatArray | None = None  # (T, U) the second scale over the first, of a pair at one distance
    ln_wish: FloatArray | None = None  # (T,) ln of such a pair's first scale at a parallax of 1 mas


@dataclass(frozen=True, slots=True, eq=False)
class _Tables:
    """What a scan of one model looks through."""

    t: FloatArray  # (T,) ln T of the star
    u: FloatArray | None  # (U,) the second source's parameter
    screens: tuple[_Screen, ...]


@lru_cache(maxsize=KITS_KEPT)
def _tables(kit: Kit) -> _Tables:
    """Tables behind every screen, the same for all candidates, so that none depends on its company."""
    two = bool(kit.model.sources)
    t = np.linspace(kit.star.low, kit.star.high, STAR_NODES if two else 3 * STAR_NODES)
    u = None
    if two:
        u = np.linspace(kit.further[0].low, kit.further[0].high, FURTHER_NODES[kit.model.sources[0]])
    return _Tables(t, u, tuple(_screen(kit, t, u, av, rv) for av, rv in _screens(kit)))


def _screens(kit: Kit) -> list[tuple[float, float]]:
    """(A_V, R_V) nodes, A_V rising."""
    if AV not in kit.model.free:
        return [(0.0, 3.1)]
    ratios = RV_NODES if RV in kit.model.free else [3.1]
    return [(float(av), float(rv)) for av in AV_NODES for rv in (ratios if av > 0 else [3.1])]


def _screen(kit: Kit, t: FloatArray, u: FloatArray | None, av: float, rv: float) -> _Screen:
    first, ln_first = _through(kit.star, kit.star_reddening, t, t, av, rv)
    if u is None:
        return _Screen(av, rv, first)
    colour = np.full(u.shape, np.log(POWER_REDDENING_K)) if kit.model.sources[0] == "power" else u
    second, ln_second = _through(kit.further[0], kit.further_reddening[0], u, colour, av, rv)
    product = (first[:, None, :] * second[None]).reshape(-1, first.shape[1])
    if not kit.model.bound_pair:
        return _Screen(av, rv, first, second, product)
    own, one = kit.ln_radius2.at(u)[0][:, 0], kit.ln_radius2.at(t)[0][:, 0]
    ln_ratio = (own + ln_second)[None, :] - (one + ln_first)[:, None]
    at_one = np.zeros((t.size, WIDTH))
    at_one[:, LN_T] = t
    ln_wish = ln_first - 2 * np.log(parallax_of(kit, at_one)[0])
    return _Screen(av, rv, first, second, product, np.exp(np.clip(ln_ratio, -40.0, 40.0)).astype(COARSE), ln_wish)


def _through(grid, reddening, x: FloatArray, colour: FloatArray, av: float, rv: float) -> tuple[FloatArray, FloatArray]:
    """Fluxes (N, B) of a source behind a screen, the brightest band 1, and ln of that band's."""
    value, _ = grid.at(x)
    if av > 0:
        value = value - MAG * reddening.at(colour, np.full(x.shape, av), np.full(x.shape, rv))[0]
    top = value.max(axis=1)
    return np.exp(value - top[:, None]).astype(COARSE), top


def scan(problem: Problem, kit: Kit, errors: Errors, starts: int = STARTS) -> Starts:
    """Up to `starts` peaks along the parameter of the last source, and one place from each part of the star's range."""
    tables, with_limits = _tables(kit), problem.limited.any(axis=1)
    size = max(1, SCAN_CELLS // (tables.t.size * (1 if tables.u is None else tables.u.size)))
    parts, order = [], []
    for group in (np.flatnonzero(~with_limits), np.flatnonzero(with_limits)):
        for first in range(0, group.size, size):
            order.append(group[first : first + size])
            data = _weigh(problem.take(order[-1]), errors.take(order[-1]))
            parts.append(_scan_star(data, tables, starts) if tables.u is None else _scan_two(data, tables, starts))
    back = np.argsort(np.concatenate(order))
    x = np.concatenate([part.x for part in parts], axis=1)[:, back]
    return Starts(x, np.concatenate([part.gain for part in parts], axis=1)[:, back])


def _scan_star(data: _Weighted, tables: _Tables, starts: int) -> Starts:
    """Starts of a star alone."""
    screens = [one for one in tables.screens if one.av <= data.reach.max()]
    gains = np.stack([_star_gain(data, screen) for screen in screens])  # (S, T, M)
    profile = gains.max(axis=0)
    chosen = _peaks(profile, starts)
    if len(screens) > 1:
        chosen = np.concatenate([chosen, _best_of_parts(profile, PARTS_ALONG_T)])
    screen = _best_screen(gains, chosen)
    return _placed(tables, screens, screen, chosen, None, np.take_along_axis(profile, chosen, 0))


def _star_gain(data: _Weighted, screen: _Screen) -> FloatArray:
    """Fall of chi-square (T, M) with the best scale."""
    a, b = (screen.first**2) @ data.weight, np.maximum(screen.first @ data.weighted, 0.0)
    scale = b / (a + TINY)
    gain = b * scale
    for band in data.limited_bands:
        gain -= data.overshoot(band, scale * screen.first[:, band, None]) ** 2
    return gain - data.shut(screen)


def _scan_two(data: _Weighted, tables: _Tables, starts: int) -> Starts:
    """Starts of two sources: peaks along the second's parameter, then the best of each part of the star's range."""
    screens = [one for one in tables.screens if one.av <= data.reach.max()]
    along_t = np.empty((len(screens), tables.t.size, data.reach.size), COARSE)
    along_u = np.empty((len(screens), tables.u.size, data.reach.size), COARSE)
    for number, screen in enumerate(screens):
        gain = _pair_gain(data, screen, _sums(data, screen))
        gain.max(axis=1, out=along_t[number])
        gain.max(axis=0, out=along_u[number])
        along_t[number] -= data.shut(screen)
        along_u[number] -= data.shut(screen)
    found = []
    for gains, is_t in ((along_u, False), (along_t, True)):
        profile = gains.max(axis=0)
        chosen = _best_of_parts(profile, PARTS_ALONG_T) if is_t else _peaks(profile, starts)
        screen = _best_screen(gains, chosen)
        other = _partner(data, screens, screen, chosen, is_t)
        i, j = (chosen, other) if is_t else (other, chosen)
        found.append(_placed(tables, screens, screen, i, j, np.take_along_axis(profile, chosen, 0)))
    return Starts(*(np.concatenate([getattr(one, name) for one in found]) for name in ("x", "gain")))


def _best_screen(gains: FloatArray, chosen: np.ndarray) -> np.ndarray:
    """The best screen (K, M) at each chosen place along the second axis of gains (S, N, M)."""
    return np.stack([np.take_along_axis(one, chosen, 0) for one in gains]).argmax(axis=0)


def _placed(
    tables: _Tables, screens: list[_Screen], screen: np.ndarray, i: np.ndarray, j: np.ndarray | None, gain: FloatArray
) -> Starts:
    """Parameter rows of places in the tables."""
    x = np.zeros((*i.shape, WIDTH))
    x[:, :, LN_T] = tables.t[i]
    x[:, :, AV] = np.array([one.av for one in screens])[screen]
    x[:, :, RV] = np.array([one.rv for one in screens])[screen]
    if j is not None:
        x[:, :, X2] = tables.u[j]
    return Starts(x, gain)


def _peaks(profile: FloatArray, starts: int) -> np.ndarray:
    """Indices (starts, M) of the highest local maxima along the first axis; the highest again where fewer."""
    edge = np.full((1, profile.shape[1]), -np.inf)
    padded = np.concatenate([edge, profile, edge])
    peak = (padded[1:-1] >= padded[:-2]) & (padded[1:-1] > padded[2:])
    ranked = np.where(peak, profile, -np.inf)
    order = np.argsort(-ranked, axis=0, kind="stable")[:starts]
    found = np.take_along_axis(ranked, order, axis=0) > -np.inf
    best = profile.argmax(axis=0)[None, :]
    return np.where(found, order, best)


def _best_of_parts(profile: FloatArray, parts: int) -> np.ndarray:
    """Index (parts + 2, M) of the highest value in each of several stretches along the first axis, and both ends."""
    edges = np.linspace(0, profile.shape[0], parts + 1).astype(int)
    best = [low + profile[low:high].argmax(axis=0) for low, high in zip(edges[:-1], edges[1:], strict=True)]
    ends = np.tile([[0], [profile.shape[0] - 1]], profile.shape[1])
    return np.concatenate([np.stack(best), ends])


@dataclass(frozen=True, slots=True, eq=False)
class _Sums:
    """Products of both sources' tables with the data; they broadcast to (T, U, M)."""

    a11: FloatArray
    a12: FloatArray
    a22: FloatArray
    b1: FloatArray
    b2: FloatArray


def _sums(data: _Weighted, screen: _Screen) -> _Sums:
    first, second = screen.first, screen.second
    a12 = (screen.product @ data.weight).reshape(first.shape[0], second.shape[0], -1)
    return _Sums(
        a11=((first**2) @ data.weight)[:, None],
        a12=a12,
        a22=((second**2) @ data.weight)[None],
        b1=(first @ data.weighted)[:, None],
        b2=(second @ data.weighted)[None],
    )


def _pair_gain(data: _Weighted, screen: _Screen, sums: _Sums) -> FloatArray:
    """Fall of chi-square (T, U, M) with the best scales that are not negative."""
    if screen.ratio is not None:
        gain, s1, s2 = _tied_gain(sums, screen.ratio[:, :, None], *data.drawn(screen.ln_wish[:, None, None]))
    elif not data.limited_bands:
        return _free_gain(sums)
    else:
        gain, s1, s2 = _free_scales(sums)
    for band in data.limited_bands:
        model = s1 * screen.first[:, band, None, None]
        model += s2 * screen.second[None, :, band, None]
        over = data.overshoot(band, model)
        over *= over
        gain -= over
    return gain


def _free_gain(sums: _Sums) -> FloatArray:
    """With two scales of their own.

    In units where each source alone has length 1: c the data's share in each, r how alike they are. Where the second
    source alone leaves nothing to the first, or the first to the second, the better one stands alone.
    """
    n1, n2 = 1.0 / np.sqrt(sums.a11 + TINY), 1.0 / np.sqrt(sums.a22 + TINY)
    c1, c2 = np.maximum(sums.b1 * n1, 0.0), np.maximum(sums.b2 * n2, 0.0)
    r = sums.a12 * n1
    r *= n2
    own = c1 - r * c2
    np.maximum(own, 0.0, out=own)
    own *= own
    rest = 1.0 - r * r
    np.maximum(rest, ALIKE, out=rest)
    own /= rest  # what the first adds to the second
    r *= c1
    r -= c2
    alone = r > 0  # the first alone leaves nothing to the second
    own += c2 * c2
    np.copyto(own, np.broadcast_to(c1 * c1, own.shape), where=alone)
    return own


def _free_scales(sums: _Sums) -> tuple[FloatArray, FloatArray, FloatArray]:
    """As _free_gain, with both scales."""
    n1, n2 = 1.0 / np.sqrt(sums.a11 + TINY), 1.0 / np.sqrt(sums.a22 + TINY)
    c1, c2 = np.maximum(sums.b1 * n1, 0.0), np.maximum(sums.b2 * n2, 0.0)
    r = sums.a12 * n1 * n2
    rest = np.maximum(1.0 - r * r, ALIKE)
    s1, s2 = np.maximum(c1 - r * c2, 0.0), np.maximum(c2 - r * c1, 0.0)
    gain = s1 * s1 / rest + c2 * c2
    only1, only2 = s2 <= 0, s1 <= 0
    s1 /= rest
    s2 /= rest
    for target, value, where in ((gain, c1 * c1, only1), (s1, c1, only1), (s2, c2, only2)):
        np.copyto(target, np.broadcast_to(value, target.shape), where=where)
    return gain, s1 * n1, s2 * n2


def _tied_gain(
    sums: _Sums, ratio: FloatArray, pull: FloatArray, wish: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Both stars at one distance: one scale, drawn towards what the parallax asks for; also both scales."""
    a = sums.a12 * (2.0 * ratio)
    a += ratio * ratio * sums.a22
    a += sums.a11 + pull + TINY
    b = ratio * sums.b2 + (sums.b1 + pull * wish)
    np.maximum(b, 0.0, out=b)
    s = b / a
    b *= s
    b -= pull * wish * wish
    return b, s, s * ratio


def _partner(
    data: _Weighted, screens: list[_Screen], screen: np.ndarray, chosen: np.ndarray, is_t: bool
) -> np.ndarray:
    """The other source's best node (K, M) beside a chosen node of one, behind a given screen."""
    row = np.broadcast_to(np.arange(chosen.shape[1]), chosen.shape)
    out = np.zeros(chosen.shape, np.intp)
    for number, one in enumerate(screens):
        here = np.nonzero(screen == number)
        if not here[0].size:
            continue
        some, node = data.take(row[here]), chosen[here]
        fixed, free = (one.first, one.second) if is_t else (one.second, one.first)
        held = fixed[node]  # (K, B)
        a_held, b_held = np.einsum("kb,bk->k", held**2, some.weight), np.einsum("kb,bk->k", held, some.weighted)
        a_free, b_free = (free**2) @ some.weight, free @ some.weighted  # (N, K)
        cross = free @ (held.T * some.weight)
        if is_t:
            sums = _Sums(a_held[None], cross, a_free, b_held[None], b_free)
        else:
            sums = _Sums(a_free, cross, a_held[None], b_free, b_held[None])
        if one.ratio is None:
            gain = _free_gain(sums)
        else:
            ratio = one.ratio[node].T if is_t else one.ratio[:, node]
            gain = _tied_gain(sums, ratio, *some.drawn(one.ln_wish[node][None] if is_t else one.ln_wish[:, None]))[0]
        out[here] = gain.argmax(axis=0)
    return out
