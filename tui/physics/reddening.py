"""Band extinction as a polynomial in temperature, A_V and R_V, for many sources at once.

Extinction through a broad band depends on the source's colour and is not linear in A_V. A_band/A_V is expanded
in Chebyshev polynomials of ln T, ln(1 + A_V/3) and 1/R_V. Against direct integration the packaged bands from B to
160 micron are off by at most 0.0015 mag at A_V <= 8 and 0.005 mag at A_V <= 30, GALEX by 0.01 and 0.03; SDSS u, whose
curve leaks in the red, by up to 0.15 mag at A_V <= 8.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import cache

import numpy as np
from numpy.polynomial.chebyshev import chebder, chebvander

from tui.model import FloatArray
from tui.physics.constants import MAG
from tui.physics.photometry import Quadrature
from tui.physics.planck import ln_planck_jy

AV_MAX = 30.0
AV_SCALE = 3.0
DEGREES = (5, 6, 3)
Law = Callable[[FloatArray, float], FloatArray]  # (wave_um, r_v) -> A(wave)/A(V)


def _unit(value: FloatArray, low: float, high: float) -> FloatArray:
    return (2.0 * value - low - high) / (high - low)


def _chebyshev_points(low: float, high: float, count: int) -> tuple[FloatArray, FloatArray]:
    unit = np.cos(np.pi * (np.arange(count) + 0.5) / count)
    return low + (unit + 1) / 2 * (high - low), unit


@dataclass(frozen=True, slots=True, eq=False)
class Reddening:
    """Coefficients of A_band/A_V for one family of sources."""

    ln_t: tuple[float, float]  # range of ln T
    inverse_rv: tuple[float, float]  # range of 1/R_V; equal ends: one R_V only
    coefficients: FloatArray  # shape (T, A, R, B)

    def take(self, columns: Sequence[int]) -> Reddening:
        """The same for some bands only."""
        return replace(self, coefficients=np.ascontiguousarray(self.coefficients[..., list(columns)]))

    def fixed(self, r_v: float) -> Reddening:
        """The same at one R_V, cheaper to evaluate."""
        if self.inverse_rv[0] == self.inverse_rv[1]:
            return self
        basis = chebvander(np.array([_unit(1.0 / r_v, *self.inverse_rv)]), self.coefficients.shape[2] - 1)[0]
        merged = np.einsum("tarb,r->tab", self.coefficients, basis)[:, :, None, :]
        return replace(self, inverse_rv=(1 / r_v, 1 / r_v), coefficients=np.ascontiguousarray(merged))

    def at(
        self, ln_t: FloatArray, av: FloatArray, r_v: FloatArray | None = None
    ) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray | None]:
        """A_band (mag) and its derivatives with ln T, A_V and R_V (None at one R_V), each (M, B)."""
        t_unit = np.clip(_unit(ln_t, *self.ln_t), -1, 1)
        top = np.log1p(AV_MAX / AV_SCALE)
        a_unit = 2.0 * np.log1p(av / AV_SCALE) / top - 1.0
        bt, dbt = _basis(t_unit, self.coefficients.shape[0])
        ba, dba = _basis(a_unit, self.coefficients.shape[1])
        if self.coefficients.shape[2] == 1:
            shape, dt, da = _products((bt, dbt), (ba, dba), self.coefficients[:, :, 0])
            dr = None
        else:
            low, high = self.inverse_rv
            br, dbr = _basis(np.clip(_unit(1.0 / r_v, low, high), -1, 1), self.coefficients.shape[2])
            own, slid = (_fold(basis, self.coefficients) for basis in (br, dbr))
            shape, dt, da = _folded((bt, dbt), (ba, dba), own)
            dr = _folded((bt, dbt), (ba, dba), slid)[0]
            dr = av[:, None] * dr * (-2.0 / (high - low) / r_v**2)[:, None]
        width_t = 2.0 / (self.ln_t[1] - self.ln_t[0])
        width_a = (2.0 / top / (AV_SCALE + av))[:, None]
        return av[:, None] * shape, av[:, None] * dt * width_t, shape + av[:, None] * da * width_a, dr


def _basis(unit: FloatArray, count: int) -> tuple[FloatArray, FloatArray]:
    """Chebyshev polynomials of degree < count and their derivatives, each (M, count)."""
    basis = np.empty((unit.size, count))
    basis[:, 0] = 1.0
    if count > 1:
        basis[:, 1] = unit
        twice = 2.0 * unit
    for degree in range(2, count):
        basis[:, degree] = twice * basis[:, degree - 1] - basis[:, degree - 2]
    return basis, basis @ derivative_matrix(count)


@cache
def derivative_matrix(count: int) -> FloatArray:
    """Matrix D (count, count): polynomials times D are the polynomials' derivatives."""
    matrix = np.zeros((count, count))
    for degree in range(1, count):
        unit = np.zeros(count)
        unit[degree] = 1.0
        lower = chebder(unit)
        matrix[: lower.size, degree] = lower
    return matrix


Bases = tuple[FloatArray, FloatArray]  # polynomials and their derivatives, each (M, count)


def _products(t: Bases, a: Bases, coefficients: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Sum over both polynomials of coefficients (T, A, B), and its derivatives with either, each (M, B)."""
    count_t, count_a, bands = coefficients.shape
    table = np.ascontiguousarray(coefficients.transpose(1, 0, 2)).reshape(count_a, -1)
    both = np.concatenate(a) @ table
    plain, slid = both.reshape(2, -1, count_t, bands)
    pair = np.stack(t, axis=1) @ plain  # (M, 2, B)
    return pair[:, 0], pair[:, 1], (t[0][:, None, :] @ slid)[:, 0]


def _fold(r: FloatArray, coefficients: FloatArray) -> FloatArray:
    """Coefficients (T, A, R, B) with each source's R_V put in, (M, T, A, B)."""
    count_t, count_a, count_r, bands = coefficients.shape
    table = np.ascontiguousarray(coefficients.transpose(2, 0, 1, 3)).reshape(count_r, -1)
    return (r @ table).reshape(-1, count_t, count_a, bands)


def _folded(t: Bases, a: Bases, own: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """As _products, with coefficients (M, T, A, B) of each source's own."""
    plain, slid = (np.matmul(basis[:, None, None, :], own)[:, :, 0] for basis in a)
    pair = np.stack(t, axis=1) @ plain
    return pair[:, 0], pair[:, 1], (t[0][:, None, :] @ slid)[:, 0]


def expand_reddening(
    rules: Sequence[Quadrature], law: Law, temperature_k: tuple[float, float], r_v: tuple[float, float]
) -> Reddening:
    """Fit the polynomial for Planck sources between two temperatures (K), R_V between two values."""
    ln_t = (float(np.log(temperature_k[0])), float(np.log(temperature_k[1])))
    inverse = (1.0 / r_v[1], 1.0 / r_v[0])
    one_rv = r_v[0] == r_v[1]
    degrees = (DEGREES[0], DEGREES[1], 0 if one_rv else DEGREES[2])
    t, ut = _chebyshev_points(*ln_t, degrees[0] + 5)
    a, ua = _chebyshev_points(0.0, float(np.log1p(AV_MAX / AV_SCALE)), degrees[1] + 5)
    r, ur = (np.array(inverse[:1]), np.zeros(1)) if one_rv else _chebyshev_points(*inverse, degrees[2] + 2)
    av = AV_SCALE * np.expm1(a)
    fits = [np.linalg.pinv(chebvander(unit, degree)) for unit, degree in zip((ut, ua, ur), degrees, strict=True)]
    columns = []
    for rule in rules:
        ln_b = ln_planck_jy(rule.wave_um[None, :], np.exp(t)[:, None])
        weight = np.exp(ln_b - ln_b.max(axis=1, keepdims=True)) * rule.weight
        weight /= weight.sum(axis=1, keepdims=True)
        curves = np.stack([law(rule.wave_um, float(np.clip(1 / x, *r_v))) for x in r])  # (R, Q)
        passed = np.exp(-MAG * av[:, None, None] * curves)  # (A, R, Q)
        ratio = -np.log(np.einsum("tq,arq->tar", weight, passed, optimize=True)) / MAG / av[None, :, None]
        columns.append(np.einsum("it,ja,kr,tar->ijk", *fits, ratio, optimize=True))
    return Reddening(ln_t, inverse, np.stack(columns, axis=-1))
