"""-2 ln L as a function of temperatures and screen alone: at each of them the amplitudes are the best there are.

The amplitudes enter linearly, so they are solved for and taken out of the normal equations (Golub & Pereyra 1973,
SIAM J. Numer. Anal. 10, 413; Ruhe & Wedin 1980, SIAM Rev. 22, 318). What is left has two to four parameters and
straighter valleys. Limits and a pair's parallax are not linear: there the amplitudes take a few Newton steps.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from scipy.special import log_ndtr

from tui.model import FloatArray
from tui.physics.amplitudes import non_negative
from tui.physics.binding import Bind, Fixed, Held, binds_of, caps_of, fixed_of
from tui.physics.components import Lights, Tables, lights
from tui.physics.composite import A2, A3, LN_S, LN_S_RANGE, LN_T, RV, WIDTH, X2, X3, ln_unit, parallax_of
from tui.physics.likelihood import LN_2PI
from tui.physics.rows import Rows

NEWTON = 2  # steps of the amplitudes where something is not linear in them
FAINTEST = 1e-15  # amplitude, in units of the brightest flux
FAINT = 1e-5  # a star may be this faint beside its companion, each in its brightest band
ROOT_STEPS = 10  # quadratic in the end, but from far off it takes some to get there
FEW = 100  # rows below which one call for all products is quicker than one for each
FAR_BELOW = -15.0  # sigma, where Mills' ratio is its own first terms


@dataclass(frozen=True, slots=True, eq=False)
class Reduced:
    """Cost (R,) with the best amplitudes, and its normal equations in the P other parameters."""

    cost: FloatArray
    normal: FloatArray  # (P, P, R)
    right: FloatArray  # (P, R): the step without damping solves normal step = right
    amplitude: FloatArray  # (K, R), of each source in its brightest band, in units of the row's brightest flux
    ln_top: FloatArray  # (K, R)


def reduced(rows: Rows, tables: Tables, theta: FloatArray, held: Held | None = None) -> Reduced:
    """Evaluate at parameters `theta` (P, R)."""
    seen = lights(tables, theta, rows.absent)
    shown = [flux * rows.scale for flux in seen.flux]
    binds = binds_of(tables, theta, seen, held)
    fixed = None if held is None else fixed_of(rows, seen, held)
    parallax = _parallax_at_one(rows, tables, theta, seen)
    solved = _solve(rows, shown, binds, fixed, parallax)
    for _ in tables.kit.model.sources:  # once one is capped the next may grow
        caps = caps_of(tables, theta, seen, solved.both, binds)
        if not caps:
            break
        binds = binds | caps
        solved = _solve(rows, shown, binds, fixed, parallax)
    moves = _moves(tables, seen, shown, solved.both, binds)
    normal, right = _equations(rows, solved, moves, binds, fixed, tables.columns)
    both = solved.both
    if both.shape[0] > 1 and not tables.kit.model.bound_pair:
        both[0] = np.maximum(both[0], FAINT * both[1:].max(axis=0))
    return Reduced(solved.state.cost, normal, right, both, np.array(seen.ln_top))


def _parallax_at_one(rows: Rows, tables: Tables, theta: FloatArray, seen: Lights) -> FloatArray | None:
    """Parallax over its error that a pair of the star's amplitude 1 would have, (R,)."""
    if rows.parallax is None:
        return None
    x = np.zeros((theta.shape[1], WIDTH))
    x[:, LN_T] = theta[tables.columns.index(LN_T)]
    x[:, LN_S] = np.clip(np.log(rows.unit_jy) - seen.ln_top[0], *LN_S_RANGE)
    return (parallax_of(tables.kit, x)[0] * rows.parallax[1]).astype(tables.dtype)


@dataclass(frozen=True, slots=True, eq=False)
class _Solved:
    """The best amplitudes where sources are bound and fixed as they are."""

    state: _State
    columns: list[FloatArray]  # what the free amplitudes multiply, (B, R) each
    both: FloatArray  # (K, R): every source's amplitude


def _solve(
    rows: Rows, shown: list[FloatArray], binds: dict[int, Bind], fixed: Fixed | None, parallax: FloatArray | None
) -> _Solved:
    columns = [shown[0]]
    for number, flux in enumerate(shown[1:], start=1):
        if number in binds:
            columns[0] = columns[0] + binds[number].ratio * flux
            if binds[number].where is None:
                continue
            flux = flux * ~binds[number].where
        columns.append(flux)
    if fixed is not None:
        rows = replace(rows, target=rows.target - fixed.amplitude * columns[0])
        columns[0] = columns[0] * ~fixed.where
    state = _best(rows, columns, parallax, fixed)
    star = state.amplitude[0] if fixed is None else np.where(fixed.where, fixed.amplitude, state.amplitude[0])
    both, free = [star], 1
    for number in range(1, len(shown)):
        bound = binds.get(number)
        own = 0.0
        if bound is None or bound.where is not None:
            own, free = state.amplitude[free], free + 1
        both.append(own if bound is None else own + bound.ratio * star)
    return _Solved(state, columns, np.array(both))


@dataclass(frozen=True, slots=True, eq=False)
class _State:
    """The data against columns times amplitudes."""

    amplitude: FloatArray  # (K, R)
    cost: FloatArray  # (R,)
    left: FloatArray  # (B, R): half the cost's fall per unit of model over sigma
    weight: FloatArray | None  # (B, R): half its second derivative; None: 1 where detected
    parallax: tuple[FloatArray, FloatArray] | None  # (R,): model and what is left of the parallax, over its error


def _best(rows: Rows, columns: list[FloatArray], parallax: FloatArray | None, fixed: Fixed | None) -> _State:
    """The best non-negative amplitudes of columns (B, R)."""
    limits = bool(rows.limited[0].size)
    detected = [column * rows.detected for column in columns] if limits else columns
    normal, right = _gram(rows, detected, detected), _against(rows, detected, rows.target)
    amplitude = _amplitudes(rows, normal, right, parallax)
    for _ in range(NEWTON if limits else 0):
        state = _state(rows, columns, amplitude, None, None)
        normal = _gram(rows, [column * state.weight for column in columns], columns)
        right = _against(rows, columns, state.left) + np.einsum("klr,lr->kr", normal, amplitude)
        amplitude = _amplitudes(rows, normal, right, parallax)
    return _state(rows, columns, amplitude, parallax, fixed)


def _amplitudes(rows: Rows, normal: FloatArray, right: FloatArray, parallax: FloatArray | None) -> FloatArray:
    """Amplitudes that minimise s.N s - 2 s.b, and with a parallax (target - parallax sqrt(s))^2 as well."""
    amplitude = non_negative(normal, right)
    if parallax is None:
        return amplitude
    a, b, own, target = normal[0, 0], right[0], parallax, rows.parallax[0]
    root = np.sqrt(np.maximum(amplitude[0], FAINT * (target / np.maximum(own, FAINT)) ** 2))
    for _ in range(ROOT_STEPS):  # Newton's steps to where the derivative with the root of the amplitude is zero
        slope = 2 * a * root**3 - 2 * b * root + own * (own * root - target)
        bend = 6 * a * root**2 - 2 * b + own**2
        bend = np.maximum(bend, 2 * a * root**2 + 1e-12)
        root = np.maximum(root - slope / bend, 0.1 * root)
    return (root**2)[None]


def _gram(rows: Rows, weighted: list[FloatArray], columns: list[FloatArray]) -> FloatArray:
    """Products (K, K, R) of columns, the errors that bands share taken into account."""
    count, size = len(columns), columns[0].shape[1]
    if size < FEW:
        out = np.einsum("ibr,jbr->ijr", np.array(weighted), np.array(columns))
    else:
        out = np.empty((count, count, size), columns[0].dtype)
        for i in range(count):
            for j in range(i, count):
                out[i, j] = out[j, i] = np.add.reduce(weighted[i] * columns[j], axis=0)
    if rows.shared is not None:
        common, share = rows.shared
        for one, part in zip(common, share, strict=True):
            along = np.stack([np.add.reduce(one * column, axis=0) for column in columns])
            out -= part * along[:, None] * along[None]
    return out


def _against(rows: Rows, columns: list[FloatArray], left: FloatArray) -> FloatArray:
    """Products (K, R) of columns with what is left."""
    if left.shape[1] < FEW:
        out = np.einsum("ibr,br->ir", np.array(columns), left)
    else:
        out = np.stack([np.add.reduce(column * left, axis=0) for column in columns])
    if rows.shared is not None:
        common, share = rows.shared
        for one, part in zip(common, share, strict=True):
            off = part * np.add.reduce(one * left, axis=0)
            out -= off * np.stack([np.add.reduce(one * column, axis=0) for column in columns])
    return out


def _state(
    rows: Rows, columns: list[FloatArray], amplitude: FloatArray, at_one: FloatArray | None, fixed: Fixed | None
) -> _State:
    """Cost and its derivatives with the model's fluxes."""
    left = rows.target.copy()
    for column, size in zip(columns, amplitude, strict=True):
        left -= column * size
    weight, limit_cost = None, 0.0
    if rows.limited[0].size:
        z = left[rows.limited].astype(float)
        value, mills = limit_terms(z)
        left[rows.limited] = 0.0
        limit_cost = np.bincount(rows.limited[1], value, left.shape[1])
    cost = np.add.reduce(left * left, axis=0) + limit_cost
    if rows.shared is not None:
        for one, part in zip(*rows.shared, strict=True):
            cost -= part * np.add.reduce(one * left, axis=0) ** 2
    if rows.limited[0].size:
        weight = rows.detected.copy()
        weight[rows.limited] = mills * (z + mills)
        left[rows.limited] = -mills
    parallax = None
    if at_one is not None:
        star = amplitude[0] if fixed is None else np.where(fixed.where, fixed.amplitude, amplitude[0])
        model = at_one * np.sqrt(np.maximum(star, 0.0))
        parallax = model, rows.parallax[0] - model
        cost = cost + parallax[1] ** 2
    return _State(amplitude, cost.astype(left.dtype), left, weight, parallax)


def limit_terms(z: FloatArray) -> tuple[FloatArray, FloatArray]:
    """-2 ln Phi(z) and phi(z)/Phi(z), z = (limit - model)/sigma (Sawicki 2012)."""
    held = np.maximum(z, -1e15)
    near = np.maximum(held, FAR_BELOW)
    ln_phi = log_ndtr(near)
    mills = np.exp(-0.5 * near**2 - 0.5 * LN_2PI - ln_phi)
    far = -np.minimum(held, FAR_BELOW)
    mills = np.where(held < FAR_BELOW, far + 1.0 / far - 2.0 / far**3, mills)
    beyond = far**2 + LN_2PI + 2.0 * np.log(far) + 2.0 / far**2
    return np.where(held < FAR_BELOW, beyond, -2.0 * ln_phi), mills


def _moves(
    tables: Tables, seen: Lights, shown: list[FloatArray], both: FloatArray, binds: dict[int, Bind]
) -> list[FloatArray]:
    """d(model over sigma) with each parameter, amplitudes as they are, P of (B, R)."""
    bright = [flux * size for flux, size in zip(shown, both, strict=True)]
    out = []
    for column in tables.columns:
        total = None
        for flux, slopes in zip(bright, seen.slopes, strict=True):
            if column in slopes:
                total = flux * slopes[column] if total is None else total + flux * slopes[column]
        for number, bound in binds.items():
            if column in bound.slopes:
                total = total + bright[number] * bound.slopes[column]
        out.append(total)
    return out


def _equations(
    rows: Rows,
    solved: _Solved,
    moves: list[FloatArray],
    binds: dict[int, Bind],
    fixed: Fixed | None,
    names: tuple[int, ...],
) -> tuple[FloatArray, FloatArray]:
    """Normal equations of the parameters, the amplitudes taken out: (P, P, R) and (P, R)."""
    state, count = solved.state, len(solved.columns)
    every = [*solved.columns, *moves]
    weighted = every if state.weight is None else [column * state.weight for column in every]
    normal, right = _gram(rows, weighted, every), _against(rows, every, state.left)
    if state.parallax is not None:
        model, left = state.parallax
        pull = np.zeros_like(right)
        pull[0] = 0.5 * model / np.maximum(state.amplitude[0], FAINTEST)
        if fixed is not None:
            pull[0] *= ~fixed.where
        pull[count + names.index(LN_T)] = 0.5 * model * binds[1].slopes[LN_T]
        normal += pull[:, None] * pull[None]
        right += pull * left
    for k in range(count):
        used = state.amplitude[k] > 0
        pivot = np.where(used & (normal[k, k] > 0), normal[k, k], 1.0)
        share = normal[k] * (used / pivot)
        normal[k + 1 :, k + 1 :] -= share[k + 1 :, None] * normal[k, None, k + 1 :]
        right[k + 1 :] -= share[k + 1 :] * right[k]
    return normal[count:, count:], right[count:]


def parameters(
    unit_jy: FloatArray, tables: Tables, theta: FloatArray, amplitude: FloatArray, ln_top: FloatArray
) -> FloatArray:
    """Parameter rows (R, 8) that `theta` (P, R) and amplitudes (K, R) in units of `unit_jy` (R,) stand for."""
    x = np.zeros((theta.shape[1], WIDTH))
    x[:, RV] = 3.1
    x[:, list(tables.columns)] = theta.T
    ln_scale = np.log(np.maximum(amplitude.astype(float), 1e-300)) - ln_top
    x[:, LN_S] = np.clip(ln_scale[0] + np.log(unit_jy), *LN_S_RANGE)
    if tables.kit.model.bound_pair:
        return x
    for number, (own, share) in enumerate(((X2, A2), (X3, A3))[: amplitude.shape[0] - 1]):
        norm = ln_unit(tables.kit, tables.kit.model.sources[number], x[:, LN_T], x[:, own])[0]
        x[:, share] = np.exp(np.clip(ln_scale[number + 1] - ln_scale[0] - norm, -60.0, 13.0))
        x[amplitude[number + 1] <= 0, share] = 0.0
    return x
