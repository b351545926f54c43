"""The data of many rows as descents use them: bands first, fluxes in units of each row's brightest over sigma."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from tui.model import FloatArray
from tui.physics.likelihood import Errors, parallax_sigma
from tui.physics.problem import Problem

ABSENT = -1e30


@dataclass(frozen=True, slots=True, eq=False)
class Rows:
    """Data of R rows, bands first, fluxes in units of each row's brightest over sigma."""

    target: FloatArray  # (B, R): flux or limit over sigma; 0 where nothing
    scale: FloatArray  # (B, R): the unit over sigma; 0 where nothing
    absent: FloatArray  # (B, R): 0 where measured, else very negative
    unit_jy: FloatArray  # (R,)
    detected: FloatArray  # (B, R): 1 or 0
    limited: tuple[np.ndarray, np.ndarray]  # bands and rows of limits
    shared: tuple[FloatArray, FloatArray] | None  # (K, B, R) common errors over sigma, (K, R) 1/(1 + their square)
    parallax: tuple[FloatArray, FloatArray] | None  # (R,): parallax over its error, 1/error; 0 where not known


def rows_of(problem: Problem, errors: Errors, with_parallax: bool, dtype: type) -> Rows:
    """The data of a problem with its errors, transposed.

    Args:
        with_parallax: the parallax is a datum (a pair on the dwarf sequence).
    """
    used = problem.detected | problem.limited
    flux = np.where(used, problem.flux_jy, 0.0)
    unit = np.maximum(np.abs(np.where(problem.detected, flux, 0.0)).max(axis=1, initial=0.0), 1e-300)
    unit = np.where(unit > 1e-300, unit, np.maximum(np.abs(flux).max(axis=1, initial=0.0), 1e-300))
    inverse = np.where(used, 1.0 / errors.sigma, 0.0)
    shared = None
    if errors.shared is not None:
        size = np.einsum("mkb,mkb->mk", errors.shared, errors.shared)
        shared = _cast(errors.shared.transpose(1, 2, 0), dtype), _cast((1.0 / (1.0 + size)).T, dtype)
    parallax = None
    if with_parallax:
        known = np.isfinite(problem.parallax_mas)
        weight = np.where(known, 1.0 / np.where(known, parallax_sigma(problem), 1.0), 0.0)
        parallax = _cast(np.where(known, problem.parallax_mas, 0.0) * weight, dtype), _cast(weight, dtype)
    return Rows(
        target=_cast((flux * inverse).T, dtype),
        scale=_cast((unit[:, None] * inverse).T, dtype),
        absent=_cast(np.where(used, 0.0, ABSENT).T, dtype),
        unit_jy=unit,
        detected=_cast(problem.detected.T, dtype),
        limited=np.nonzero(problem.limited.T),
        shared=shared,
        parallax=parallax,
    )


def _cast(array: FloatArray, dtype: type) -> FloatArray:
    return np.ascontiguousarray(array, dtype=dtype)


def take(rows: Rows, keep: np.ndarray) -> Rows:
    """The data of some rows, in the order given; a row may be asked for more than once."""
    limited = rows.limited
    if limited[0].size:
        mask = np.zeros(rows.target.shape, bool)
        mask[limited] = True
        limited = np.nonzero(mask[:, keep])
    return replace(
        rows,
        target=rows.target[:, keep],
        scale=rows.scale[:, keep],
        absent=rows.absent[:, keep],
        unit_jy=rows.unit_jy[keep],
        detected=rows.detected[:, keep],
        limited=limited,
        shared=None if rows.shared is None else tuple(part[..., keep] for part in rows.shared),
        parallax=None if rows.parallax is None else tuple(part[keep] for part in rows.parallax),
    )
