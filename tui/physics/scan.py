"""Coarse scans over all temperatures and screens, amplitudes in closed form: where a descent should start."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tui.model import FloatArray
from tui.physics.composite import A2, AV, LN_S, LN_T, POWER_REDDENING_K, RV, WIDTH, X2, Kit, parallax_of
from tui.physics.constants import MAG
from tui.physics.likelihood import Errors, parallax_sigma
from tui.physics.problem import Problem

AV_NODES = np.array([0, 0.15, 0.4, 0.8, 1.4, 2.2, 3.2, 4.5, 6, 8, 10.5, 13.5, 17, 21, 25, 30.0])
RV_NODES = np.array([2.5, 3.1, 4.0, 5.2])
STAR_NODES = 40
FURTHER_NODES = {"dust": 22, "star": 22, "compact": 18, "power": 12}
STARTS = 3
PARTS_ALONG_T = 10  # temperature and screen make a long valley with several minima: a start from each part of it
COARSE = np.float32  # a scan only ranks places to start from
TINY = 1e-30
SCAN_CELLS = 40_000  # cells of one scan worked on at a time: they stay in the processor's cache


def nodes(low: float, high: float, count: int) -> FloatArray:
    """Evenly spaced values from low to high."""
    return np.linspace(low, high, count)


@dataclass(frozen=True, slots=True, eq=False)
class Weighted:
    """Data in the form that scans use, fluxes in units of each candidate's brightest: weights, weighted fluxes."""

    weight: FloatArray  # (B, M)
    weighted: FloatArray  # (B, M)
    unit_jy: FloatArray  # (M,)

    def take(self, rows: np.ndarray) -> Weighted:
        """The same for some candidates."""
        return Weighted(self.weight[:, rows], self.weighted[:, rows], self.unit_jy[rows])


def weigh(problem: Problem, errors: Errors) -> Weighted:
    """Detections' weights; limits enter a scan as penalties."""
    flux = np.where(problem.detected, problem.flux_jy, 0.0)
    unit = np.maximum(np.abs(flux).max(axis=1, initial=0.0), 1e-300)
    weight = np.where(problem.detected, (unit[:, None] / errors.sigma) ** 2, 0.0)
    weighted = weight * flux / unit[:, None]
    return Weighted(np.ascontiguousarray(weight.T), np.ascontiguousarray(weighted.T), unit)


def screens(kit: Kit) -> list[tuple[float, float]]:
    """(A_V, R_V) nodes; the same for every candidate, so that none depends on its company."""
    if AV not in kit.model.free:
        return [(0.0, 3.1)]
    ratios = RV_NODES if RV in kit.model.free else [3.1]
    return [(float(av), float(rv)) for av in AV_NODES for rv in (ratios if av > 0 else [3.1])]


def reach(av_max: FloatArray) -> FloatArray:
    """The highest A_V node that a candidate looks at: the first at or above its largest A_V, (M,)."""
    return AV_NODES[np.minimum(np.searchsorted(AV_NODES, av_max - 1e-9), AV_NODES.size - 1)]


def _through(grid, reddening, x: FloatArray, colour: FloatArray, av: float, rv: float) -> FloatArray:
    value, _ = grid.at(x)
    if av > 0:
        value = value - MAG * reddening.at(colour, np.full(x.shape, av), np.full(x.shape, rv))[0]
    return value


def scan(problem: Problem, kit: Kit, errors: Errors, starts: int = STARTS) -> FloatArray:
    """Starting rows, shape (S, M, 8): up to `starts` peaks of the scan, and one from each part of the star's range."""
    data = weigh(problem, errors)
    if not kit.model.sources:
        return _scan_star(problem, kit, data, errors, starts)
    return _scan_two(problem, kit, data, errors, starts)


def _penalty(problem: Problem, errors: Errors, model: FloatArray) -> FloatArray:
    """Penalty (..., M) of limits that model fluxes (..., M, B) overshoot."""
    over = np.maximum(0.0, (model - problem.flux_jy) / errors.sigma)
    return np.sum(np.where(problem.limited, over, 0.0) ** 2, axis=-1)


def _scan_star(problem: Problem, kit: Kit, data: Weighted, errors: Errors, starts: int) -> FloatArray:
    t = nodes(kit.star.low, kit.star.high, 3 * STAR_NODES)
    gains, scales, places = [], [], screens(kit)
    has_limits, ceiling = bool(problem.limited.any()), reach(problem.av_max)
    places = [(av, rv) for av, rv in places if av <= ceiling.max()]
    for av, rv in places:
        ln_flux = _through(kit.star, kit.star_reddening, t, t, av, rv)
        top = ln_flux.max(axis=1, keepdims=True)
        flux = np.exp(ln_flux - top)
        a, b = (flux**2) @ data.weight, flux @ data.weighted
        scale = np.maximum(b, 0) / np.maximum(a, 1e-300)
        gain = np.maximum(b, 0) * scale
        scale = scale * data.unit_jy
        if has_limits:
            gain = gain - _penalty(problem, errors, scale[:, :, None] * flux[:, None, :])
        gains.append(np.where(av <= ceiling, gain, -np.inf))
        scales.append(np.log(np.maximum(scale, 1e-300)) - top)
    gain, scale = np.stack(gains, axis=1), np.stack(scales, axis=1)  # (T, screens, M)
    best_screen = gain.argmax(axis=1)
    profile = np.take_along_axis(gain, best_screen[:, None], axis=1)[:, 0]
    chosen = _peaks(profile, starts)  # (starts, M)
    if len(places) > 1:
        chosen = np.concatenate([chosen, _best_of_parts(profile, PARTS_ALONG_T)])
    m = np.arange(len(problem))
    rows = np.zeros((chosen.shape[0], len(problem), WIDTH))
    screen = best_screen[chosen, m]
    rows[:, :, LN_T] = t[chosen]
    rows[:, :, LN_S] = scale[chosen, screen, m]
    rows[:, :, AV] = np.array([av for av, _ in places])[screen]
    rows[:, :, RV] = np.array([rv for _, rv in places])[screen]
    return rows


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


@dataclass(frozen=True, slots=True, eq=False)
class _Screen:
    """Both sources' tables behind one screen, each row in units of its largest band."""

    av: float
    rv: float
    first: FloatArray  # (T, B)
    second: FloatArray  # (U, B)
    product: FloatArray  # (T U, B)
    ln_first: FloatArray  # (T,)
    ln_second: FloatArray  # (U,)


def _screen(kit: Kit, t: FloatArray, u: FloatArray, av: float, rv: float) -> _Screen:
    colour = np.full(u.shape, np.log(POWER_REDDENING_K)) if kit.model.sources[0] == "power" else u
    first = _through(kit.star, kit.star_reddening, t, t, av, rv)
    second = _through(kit.further[0], kit.further_reddening[0], u, colour, av, rv)
    top1, top2 = first.max(axis=1), second.max(axis=1)
    g1, g2 = np.exp(first - top1[:, None]).astype(COARSE), np.exp(second - top2[:, None]).astype(COARSE)
    product = (g1[:, None, :] * g2[None]).reshape(-1, g1.shape[1])
    return _Screen(av, rv, g1, g2, product, top1, top2)


def _best_of_parts(profile: FloatArray, parts: int) -> np.ndarray:
    """Index (parts, M) of the highest value in each of several stretches along the first axis."""
    edges = np.linspace(0, profile.shape[0], parts + 1).astype(int)
    return np.stack([low + profile[low:high].argmax(axis=0) for low, high in zip(edges[:-1], edges[1:], strict=True)])


def _scan_two(problem: Problem, kit: Kit, data: Weighted, errors: Errors, starts: int) -> FloatArray:
    source = kit.model.sources[0]
    t = nodes(kit.star.low, kit.star.high, STAR_NODES)
    u = nodes(kit.further[0].low, kit.further[0].high, FURTHER_NODES[source])
    top = reach(problem.av_max).max()
    tables = [_screen(kit, t, u, av, rv) for av, rv in screens(kit) if av <= top]
    size = max(1, SCAN_CELLS // (t.size * u.size))
    out = []
    for first in range(0, len(problem), size):
        rows = np.arange(first, min(first + size, len(problem)))
        out.append(_scan_part(problem.take(rows), kit, data.take(rows), errors.take(rows), starts, t, u, tables))
    return np.concatenate(out, axis=1)


def _scan_part(
    problem: Problem,
    kit: Kit,
    data: Weighted,
    errors: Errors,
    starts: int,
    t: FloatArray,
    u: FloatArray,
    tables: list[_Screen],
) -> FloatArray:
    """Starts of some candidates: the peaks along the second source's parameter, then those along the star's."""
    size = len(problem)
    along_u, along_t = _Kept(u.size, size), _Kept(t.size, size)
    ceiling = reach(problem.av_max)
    for number, table in enumerate(tables):
        if not (table.av <= ceiling).any():
            continue
        gain, s1, s2 = _pair_gain(problem, kit, data, errors, t, u, table)
        gain = np.where(table.av <= ceiling, gain, -np.inf)
        top = gain.argmax(axis=0)  # over T: (U, M)
        along_u.better(np.take_along_axis(gain, top[None], 0)[0], top, np.arange(u.size)[:, None], (s1, s2), number)
        top = gain.argmax(axis=1)  # over U: (T, M)
        along_t.better(
            np.take_along_axis(gain, top[:, None], 1)[:, 0], np.arange(t.size)[:, None], top, (s1, s2), number
        )
    picked = [along_u.picked(_peaks(along_u.gain, starts)), along_t.picked(_best_of_parts(along_t.gain, PARTS_ALONG_T))]
    i, j, scale1, scale2, screen = (np.concatenate(pair) for pair in zip(*picked, strict=True))
    rows = np.zeros((i.shape[0], size, WIDTH))
    rows[:, :, LN_T], rows[:, :, X2] = t[i], u[j]
    ln_first, ln_second = (np.stack([getattr(s, name) for s in tables]) for name in ("ln_first", "ln_second"))
    with np.errstate(divide="ignore"):
        rows[:, :, LN_S] = np.log(np.maximum(scale1 * data.unit_jy, 1e-300)) - ln_first[screen, i]
        ln_s2 = np.log(scale2 * data.unit_jy) - ln_second[screen, j]
    rows[:, :, AV] = np.array([table.av for table in tables])[screen]
    rows[:, :, RV] = 3.1
    rows[:, :, A2] = _amplitude(kit, rows, ln_s2 - rows[:, :, LN_S])
    return rows


class _Kept:
    """The best cell along one axis of a scan, so far: its gain, indices, scales and screen."""

    def __init__(self, length: int, count: int) -> None:
        shape = (length, count)
        self.gain = np.full(shape, -np.inf)
        self.i, self.j, self.screen = (np.zeros(shape, np.intp) for _ in range(3))
        self.s1, self.s2 = np.zeros(shape), np.zeros(shape)

    def better(
        self, gain: FloatArray, i: np.ndarray, j: np.ndarray, scales: tuple[FloatArray, FloatArray], screen: int
    ) -> None:
        """Take over the cells (i, j) where their gain is larger."""
        row, column = np.nonzero(gain > self.gain)
        i, j = np.broadcast_to(i, gain.shape)[row, column], np.broadcast_to(j, gain.shape)[row, column]
        self.gain[row, column] = gain[row, column]
        self.i[row, column], self.j[row, column], self.screen[row, column] = i, j, screen
        self.s1[row, column], self.s2[row, column] = scales[0][i, j, column], scales[1][i, j, column]

    def picked(self, chosen: np.ndarray) -> tuple[np.ndarray, ...]:
        """Indices, scales and screens of chosen places along the axis, (starts, M) each."""
        return tuple(np.take_along_axis(part, chosen, 0) for part in (self.i, self.j, self.s1, self.s2, self.screen))


def _amplitude(kit: Kit, rows: FloatArray, ln_ratio: FloatArray) -> FloatArray:
    """Amplitude of the second source from the ratio of the two surfaces' scales."""
    ln_t, own = rows[:, :, LN_T], rows[:, :, X2]
    source = kit.model.sources[0]
    flat = (ln_t.ravel(), own.ravel())
    if source == "dust":
        ln_h = 4 * (ln_t - own)
    elif source == "star":
        ln_h = (kit.ratio.at(flat[0])[0] - kit.ratio.at(flat[1])[0])[:, 0].reshape(ln_t.shape)
    elif source == "power":
        ln_h = kit.infrared.at(flat[0])[0][:, 0].reshape(ln_t.shape)
    else:
        ln_h = np.zeros(ln_t.shape)
    return np.exp(np.clip(ln_ratio - ln_h, -60.0, 13.0))


def _pair_gain(
    problem: Problem, kit: Kit, data: Weighted, errors: Errors, t: FloatArray, u: FloatArray, table: _Screen
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Fall of chi-square (T, U, M) with the best non-negative scales, and both scales in the data's units."""
    g1, g2 = table.first, table.second
    weight, weighted = data.weight.astype(COARSE), data.weighted.astype(COARSE)
    a11, b1 = ((g1**2) @ weight)[:, None, :], (g1 @ weighted)[:, None, :]
    a22, b2 = ((g2**2) @ weight)[None], (g2 @ weighted)[None]
    a12 = (table.product @ weight).reshape(t.size, u.size, -1)
    if kit.model.bound_pair:
        s1, s2, gain = _tied(problem, kit, t, u, table, (a11, a12, a22, b1, b2), data.unit_jy)
    else:
        s1, s2, gain = _two_scales(a11, a12, a22, b1, b2)
    if problem.limited.any():
        gain = gain - _pair_penalty(problem, errors, s1 * data.unit_jy, s2 * data.unit_jy, g1, g2)
    return gain, s1, s2


def _two_scales(
    a11: FloatArray, a12: FloatArray, a22: FloatArray, b1: FloatArray, b2: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Best scales of two sources, neither negative, and the fall of chi-square; inputs broadcast to (T, U, M)."""
    alone1, alone2 = np.maximum(b1, 0) / (a11 + TINY), np.maximum(b2, 0) / (a22 + TINY)
    gain1, gain2 = b1 * alone1, b2 * alone2
    det = np.maximum(a11 * a22 - a12 * a12, 1e-5 * a11 * a22 + TINY)
    s1, s2 = (b1 * a22 - b2 * a12) / det, (b2 * a11 - b1 * a12) / det
    inside = (s1 > 0) & (s2 > 0)
    only1 = gain1 >= gain2
    s1 = np.where(inside, s1, np.where(only1, alone1, 1e-6 * alone1))
    s2 = np.where(inside, s2, np.where(only1, 0.0, alone2))
    return s1, s2, np.where(inside, s1 * b1 + s2 * b2, np.maximum(gain1, gain2))


def _pair_penalty(
    problem: Problem, errors: Errors, s1: FloatArray, s2: FloatArray, g1: FloatArray, g2: FloatArray
) -> FloatArray:
    """Penalty of overshot limits; only candidates with limits, only their bands."""
    penalty = np.zeros_like(s1)
    for column in np.flatnonzero(problem.limited.any(axis=0)):
        rows = np.flatnonzero(problem.limited[:, column])
        model = s1[:, :, rows] * g1[:, column, None, None] + s2[:, :, rows] * g2[None, :, column, None]
        over = (model - problem.flux_jy[rows, column]) / errors.sigma[rows, column]
        penalty[:, :, rows] += np.maximum(over, 0.0) ** 2
    return penalty


def _tied(
    problem: Problem,
    kit: Kit,
    t: FloatArray,
    u: FloatArray,
    table: _Screen,
    sums: tuple[FloatArray, FloatArray, FloatArray, FloatArray, FloatArray],
    unit_jy: FloatArray,
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Both stars at one distance: one scale, drawn towards what the parallax asks for."""
    a11, a12, a22, b1, b2 = sums
    own, first = kit.ln_radius2.at(u)[0][:, 0], kit.ln_radius2.at(t)[0][:, 0]
    ln_ratio = own[None, :] - first[:, None] + table.ln_second[None, :] - table.ln_first[:, None]
    ratio = np.exp(np.clip(ln_ratio, -40.0, 40.0)).astype(COARSE)[:, :, None]
    a = a11 + 2 * ratio * a12 + ratio**2 * a22
    b = b1 + ratio * b2
    known = np.isfinite(problem.parallax_mas)
    if not known.any():
        s = np.maximum(b, 0) / (a + TINY)
        return s, s * ratio, s * b
    row = np.zeros((t.size, WIDTH))
    row[:, LN_T] = t
    unit = parallax_of(kit, row)[0]  # mas at theta = 1
    parallax = np.where(known, problem.parallax_mas, 1.0)
    wish = (parallax[None, :] / unit[:, None]) ** 2 * np.exp(table.ln_first)[:, None] / unit_jy
    relative = np.where(known, 2 * parallax_sigma(problem) / parallax, np.inf)
    pull = (np.where(known, 1.0 / (np.maximum(wish, 1e-12) * relative), 0.0) ** 2)[:, None, :].astype(COARSE)
    wish = np.minimum(wish, 1e15)[:, None, :].astype(COARSE)  # nothing detected: no scale to draw towards
    s = np.maximum((b + pull * wish) / (a + pull + TINY), TINY)
    return s, s * ratio, 2 * s * b - s**2 * a - pull * (s - wish) ** 2
