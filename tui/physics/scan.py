"""Coarse scans over all temperatures and screens, amplitudes in closed form: where a descent should start."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tui.model import FloatArray
from tui.physics.composite import A2, AV, LN_S, LN_T, RV, WIDTH, X2, Kit, parallax_of
from tui.physics.constants import MAG
from tui.physics.likelihood import Errors, parallax_sigma
from tui.physics.problem import Problem

AV_NODES = np.array([0, 0.15, 0.4, 0.8, 1.4, 2.2, 3.2, 4.5, 6, 8, 10.5, 13.5, 17, 21, 25, 30.0])
RV_NODES = np.array([2.5, 3.1, 4.0, 5.2])
STAR_NODES = 44
FURTHER_NODES = {"dust": 24, "star": 24, "compact": 14, "power": 14}
STARTS = 3
SCAN_CELLS = 4_000_000  # cells of one scan kept in memory at a time


def nodes(low: float, high: float, count: int) -> FloatArray:
    """Evenly spaced values from low to high."""
    return np.linspace(low, high, count)


@dataclass(frozen=True, slots=True, eq=False)
class Weighted:
    """Data in the form that scans use: weights (B, M), weighted fluxes (B, M)."""

    weight: FloatArray
    weighted: FloatArray


def weigh(problem: Problem, errors: Errors) -> Weighted:
    """Detections' weights; limits enter a scan as penalties."""
    weight = np.where(problem.detected, errors.sigma**-2.0, 0.0)
    return Weighted(np.ascontiguousarray(weight.T), np.ascontiguousarray((weight * problem.flux_jy).T))


def screens(kit: Kit, problem: Problem) -> list[tuple[float, float]]:
    """(A_V, R_V) nodes worth a look for these candidates."""
    if AV not in kit.model.free:
        return [(0.0, 3.1)]
    top = float(problem.av_max.max())
    values = [*AV_NODES[AV_NODES < top], top]
    ratios = RV_NODES if RV in kit.model.free else [3.1]
    return [(float(av), float(rv)) for av in values for rv in (ratios if av > 0 else [3.1])]


def _through(grid, reddening, x: FloatArray, colour: FloatArray, av: float, rv: float) -> FloatArray:
    value, _ = grid.at(x)
    if av > 0:
        value = value - MAG * reddening.at(colour, np.full(x.shape, av), np.full(x.shape, rv))[0]
    return value


def scan(problem: Problem, kit: Kit, errors: Errors, starts: int = STARTS) -> FloatArray:
    """Up to `starts` starting rows per candidate, best first, shape (starts, M, 8); repeats where fewer."""
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
    gains, scales, places = [], [], screens(kit, problem)
    has_limits = bool(problem.limited.any())
    for av, rv in places:
        ln_flux = _through(kit.star, kit.star_reddening, t, t, av, rv)
        top = ln_flux.max(axis=1, keepdims=True)
        flux = np.exp(ln_flux - top)
        a, b = (flux**2) @ data.weight, flux @ data.weighted
        scale = np.maximum(b, 0) / np.maximum(a, 1e-300)
        gain = np.maximum(b, 0) * scale
        if has_limits:
            gain = gain - _penalty(problem, errors, scale[:, :, None] * flux[:, None, :])
        gains.append(np.where(av <= problem.av_max + 1e-9, gain, -np.inf))
        scales.append(np.log(np.maximum(scale, 1e-300)) - top)
    gain, scale = np.stack(gains, axis=1), np.stack(scales, axis=1)  # (T, screens, M)
    best_screen = gain.argmax(axis=1)
    profile = np.take_along_axis(gain, best_screen[:, None], axis=1)[:, 0]
    chosen = _peaks(profile, starts)  # (starts, M)
    m = np.arange(len(problem))
    rows = np.zeros((starts, len(problem), WIDTH))
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


def _scan_two(problem: Problem, kit: Kit, data: Weighted, errors: Errors, starts: int) -> FloatArray:
    source = kit.model.sources[0]
    t = nodes(kit.star.low, kit.star.high, STAR_NODES)
    u = nodes(kit.further[0].low, kit.further[0].high, FURTHER_NODES[source])
    places = screens(kit, problem)
    size = max(1, SCAN_CELLS // (t.size * u.size))
    out = []
    for first in range(0, len(problem), size):
        rows = np.arange(first, min(first + size, len(problem)))
        part = Weighted(data.weight[:, rows], data.weighted[:, rows])
        out.append(_scan_two_part(problem.take(rows), kit, part, errors.take(rows), starts, t, u, places))
    return np.concatenate(out, axis=1)


def _scan_two_part(
    problem: Problem,
    kit: Kit,
    data: Weighted,
    errors: Errors,
    starts: int,
    t: FloatArray,
    u: FloatArray,
    places: list[tuple[float, float]],
) -> FloatArray:
    count = len(problem)
    best = np.full((u.size, count), -np.inf)
    kept = np.zeros((4, u.size, count))  # ln T, ln scale of the star, scale of the second relative, screen
    source = kit.model.sources[0]
    colour = np.full(u.shape, np.log(1000.0)) if source == "power" else u
    for number, (av, rv) in enumerate(places):
        first = _through(kit.star, kit.star_reddening, t, t, av, rv)
        second = _through(kit.further[0], kit.further_reddening[0], u, colour, av, rv)
        gain, s1, s2 = _pair_gain(problem, kit, data, errors, t, u, first, second)
        gain = np.where(av <= problem.av_max + 1e-9, gain, -np.inf)
        top = gain.argmax(axis=0)  # over T: (U, M)
        value = np.take_along_axis(gain, top[None], axis=0)[0]
        better = value > best
        best = np.where(better, value, best)
        pick = [t[top], *(np.take_along_axis(s, top[None], axis=0)[0] for s in (s1, s2)), np.full(top.shape, number)]
        kept = np.where(better, np.stack(pick), kept)
    chosen = _peaks(best, starts)
    ln_t, ln_s1, ln_s2, screen = (np.take_along_axis(k, chosen, axis=0) for k in kept)
    rows = np.zeros((starts, count, WIDTH))
    rows[:, :, LN_T], rows[:, :, LN_S], rows[:, :, X2] = ln_t, ln_s1, u[chosen]
    rows[:, :, AV] = np.array([av for av, _ in places])[screen.astype(int)]
    rows[:, :, RV] = 3.1
    rows[:, :, A2] = _amplitude(kit, rows, ln_s2 - ln_s1)
    return rows


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
    problem: Problem,
    kit: Kit,
    data: Weighted,
    errors: Errors,
    t: FloatArray,
    u: FloatArray,
    first: FloatArray,
    second: FloatArray,
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Fall of chi-square (T, U, M) with the best non-negative scales, and ln of both scales."""
    top1, top2 = first.max(axis=1), second.max(axis=1)
    g1, g2 = np.exp(first - top1[:, None]), np.exp(second - top2[:, None])
    a11, b1 = ((g1**2) @ data.weight)[:, None, :], (g1 @ data.weighted)[:, None, :]
    a22, b2 = ((g2**2) @ data.weight)[None], (g2 @ data.weighted)[None]
    cross = (g1[:, None, :] * g2[None]).reshape(-1, g1.shape[1]) @ data.weight
    a12 = cross.reshape(t.size, u.size, -1)
    if kit.model.bound_pair:
        s1, s2, gain = _tied(problem, kit, t, u, (top1, top2), (a11, a12, a22, b1, b2))
    else:
        det = np.maximum(a11 * a22 - a12**2, 1e-12 * a11 * a22 + 1e-300)
        s1, s2 = (b1 * a22 - b2 * a12) / det, (b2 * a11 - b1 * a12) / det
        alone1, alone2 = np.maximum(b1, 0) / (a11 + 1e-300), np.maximum(b2, 0) / (a22 + 1e-300)
        both = (s1 > 0) & (s2 > 0)
        only1 = b1 * alone1 >= b2 * alone2
        s1 = np.where(both, s1, np.where(only1, alone1, 1e-9 * alone1))
        s2 = np.where(both, s2, np.where(only1, 0.0, alone2))
        gain = s1 * b1 + s2 * b2
    if problem.limited.any():
        gain = gain - _pair_penalty(problem, errors, s1, s2, g1, g2)
    with np.errstate(divide="ignore"):
        return gain, np.log(np.maximum(s1, 1e-300)) - top1[:, None, None], np.log(s2) - top2[None, :, None]


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


def _tied(problem: Problem, kit: Kit, t: FloatArray, u: FloatArray, tops, sums):
    """Both stars at one distance: one scale, drawn towards what the parallax asks for."""
    a11, a12, a22, b1, b2 = sums
    own, first = kit.ln_radius2.at(u)[0][:, 0], kit.ln_radius2.at(t)[0][:, 0]
    ratio = np.exp(own[None, :] - first[:, None] + tops[1][None, :] - tops[0][:, None])[:, :, None]
    a = a11 + 2 * ratio * a12 + ratio**2 * a22
    b = b1 + ratio * b2
    known = np.isfinite(problem.parallax_mas)
    row = np.zeros((t.size, WIDTH))
    row[:, LN_T] = t
    unit = parallax_of(kit, row)[0]  # mas at theta = 1
    wish = (np.where(known, problem.parallax_mas, 1.0)[None, :] / unit[:, None]) ** 2 * np.exp(tops[0])[:, None]
    relative = np.where(known, 2 * parallax_sigma(problem) / np.where(known, problem.parallax_mas, 1.0), np.inf)
    pull = (np.where(known, 1.0 / (np.maximum(wish, 1e-300) * relative), 0.0) ** 2)[:, None, :]
    s = np.maximum((b + pull * wish[:, None, :]) / (a + pull), 1e-300)
    gain = 2 * s * b - s**2 * a - pull * (s - wish[:, None, :]) ** 2
    return s, s * ratio, gain
