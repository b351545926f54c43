"""Damped Gauss-Newton down the reduced cost within bounds, for many rows at once."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tui.model import FloatArray
from tui.physics.amplitudes import solved
from tui.physics.binding import Held
from tui.physics.components import Tables
from tui.physics.composite import LN_T, X2, X3
from tui.physics.rows import Rows, take
from tui.physics.separable import Reduced, reduced

FIRST_DAMPING, EASE, STIFFEN = 0.1, 0.2, 4.0
FREE_DAMPING = 1e-3  # all but free: what is promised, not what is dared
HOPELESS = 1e6  # damping at which no step is worth trying
SHORT_STEP = 0.3  # damping above which steps are short and a small gain says little
LEAST = 0.1  # curvature that damping adds to: a parameter that does next to nothing must not leap and spoil the step
FLAT = 1e-12  # curvature of the cost below which a parameter does nothing
LONGEST = 0.8  # of a temperature, as a fraction of 1/T
PRECISION = 3e-6  # of the cost: what single precision can tell


@dataclass(frozen=True, slots=True, eq=False)
class Walked:
    """Where a walk ended."""

    theta: FloatArray  # (P, R)
    cost: FloatArray  # (R,)
    promise: FloatArray  # (R,): how much lower the cost would end, were it as curved all the way
    amplitude: FloatArray  # (K, R), of each source in its brightest band, in units of the row's brightest flux
    ln_top: FloatArray  # (K, R): ln of the flux of a source of scale 1 in that band

    def take(self, keep: np.ndarray) -> Walked:
        """The same for some rows."""
        return Walked(*(part[..., keep] for part in self._parts))

    @staticmethod
    def joined(walks: list[Walked]) -> Walked:
        """Several walks, one after the other."""
        return Walked(*(np.concatenate(parts, axis=-1) for parts in zip(*(one._parts for one in walks), strict=True)))

    @property
    def _parts(self) -> tuple[FloatArray, ...]:
        return self.theta, self.cost, self.promise, self.amplitude, self.ln_top


def walk(
    rows: Rows,
    tables: Tables,
    theta: FloatArray,
    bounds: tuple[FloatArray, FloatArray],
    steps: int,
    tolerance: float,
    held: Held | None = None,
) -> Walked:
    """At most `steps` steps down from `theta` (P, R).

    Temperatures move along 1/T, in which a colour is nearly straight (Wien), so that the valley between temperature
    and extinction is too.

    Args:
        bounds: lowest and highest parameters, (P, R) each.
        tolerance: of the cost; a row rests once a step gains less.
        held: what stays as it is.
    """
    with np.errstate(over="ignore", invalid="ignore", under="ignore"):  # a trial that is no number is not taken
        return _walk(rows, tables, theta, bounds, steps, tolerance, held)


def _walk(
    rows: Rows,
    tables: Tables,
    theta: FloatArray,
    bounds: tuple[FloatArray, FloatArray],
    steps: int,
    tolerance: float,
    held: Held | None,
) -> Walked:
    low, high = bounds
    theta = np.clip(theta, low, high)
    here = reduced(rows, tables, theta, held)
    end = Walked(theta.copy(), here.cost.copy(), np.zeros_like(here.cost), here.amplitude.copy(), here.ln_top.copy())
    damping = np.full(here.cost.shape, FIRST_DAMPING, theta.dtype)
    live = np.arange(here.cost.size)
    thermal = _thermal(tables)
    for _ in range(steps):
        step, promised = _step(here, damping, theta, low, high, held)
        trial = _moved(theta, step, thermal, low, high)
        there = reduced(rows, tables, trial, held)
        gain = here.cost - there.cost
        better = gain > 0
        least = tolerance + PRECISION * here.cost * (theta.dtype == np.float32)
        going = np.where(better, (gain > least) | (damping > SHORT_STEP), (promised > least) & (damping < HOPELESS))
        damping = np.where(better, damping * EASE, damping * STIFFEN)
        theta, here = np.where(better, trial, theta), _better(here, there, better)
        end.theta[:, live], end.cost[live] = theta, here.cost
        end.amplitude[:, live], end.ln_top[:, live] = here.amplitude, here.ln_top
        if not going.all():
            keep = np.flatnonzero(going)
            live, theta, damping, low, high = live[keep], theta[:, keep], damping[keep], low[:, keep], high[:, keep]
            here, rows = _taken(here, keep), take(rows, keep)
            held = None if held is None else held.take(keep)
        if not live.size:
            break
    if live.size:
        end.promise[live] = _step(here, np.full(live.size, FREE_DAMPING, theta.dtype), theta, low, high, held)[1]
    return end


def _thermal(tables: Tables) -> list[int]:
    """Which parameters are ln T."""
    power = "power" in tables.kit.model.sources
    names = (LN_T,) if power else (LN_T, X2, X3)
    return [place for place, column in enumerate(tables.columns) if column in names]


def _moved(theta: FloatArray, step: FloatArray, thermal: list[int], low: FloatArray, high: FloatArray) -> FloatArray:
    step = np.where(np.isfinite(step), step, 0.0)
    step[thermal] = -np.log1p(-np.minimum(np.maximum(step[thermal], -5.0), LONGEST))
    step += theta
    np.maximum(step, low, out=step)
    return np.minimum(step, high, out=step)


def _step(
    here: Reduced, damping: FloatArray, theta: FloatArray, low: FloatArray, high: FloatArray, held: Held | None
) -> tuple[FloatArray, FloatArray]:
    """One damped step (P, R) and the fall of cost it promises (R,); a parameter held by its bound rests."""
    diagonal = np.einsum("ppr->pr", here.normal)
    right = here.right
    rests = ((theta <= low) & (right < 0)) | ((theta >= high) & (right > 0)) | ~(diagonal > FLAT)
    if held is not None:
        rests |= held.still
    moves = ~rests
    normal = here.normal * moves[:, None] * moves[None]
    for place in range(theta.shape[0]):
        normal[place, place] = np.where(rests[place], 1.0, diagonal[place] * (1.0 + damping) + LEAST * damping)
    step = solved(normal, right * moves, PRECISION)
    return step, np.add.reduce(step * right, axis=0)


def _better(here: Reduced, there: Reduced, better: np.ndarray) -> Reduced:
    """`there` where it is better, `here` elsewhere."""
    for name in ("cost", "normal", "right", "amplitude", "ln_top"):
        np.copyto(getattr(here, name), getattr(there, name), where=better)
    return here


def _taken(here: Reduced, keep: np.ndarray) -> Reduced:
    parts = (here.cost, here.normal, here.right, here.amplitude, here.ln_top)
    return Reduced(*(part[..., keep] for part in parts))
