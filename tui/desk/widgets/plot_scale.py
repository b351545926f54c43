"""Axes: where things fall, and which values are written beside them."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from tui.model import FloatArray

UNITS_JY = ((0, "Jy"), (-3, "mJy"), (-6, "uJy"), (-9, "nJy"))
STEPS = ((1.0, 2.0, 5.0), (1.0, 3.0))  # within a decade, the finer set where it fits


@dataclass(frozen=True, slots=True)
class Scale:
    """A linear map from `low..high` (here: logarithms) to dots 0..`dots`-1, downwards where `flip`."""

    low: float
    high: float
    dots: int
    flip: bool = False

    def dot(self, value: ArrayLike) -> FloatArray:
        """Place in dots, not rounded; outside the range it lies outside 0..dots-1."""
        share = (np.asarray(value, dtype=float) - self.low) / (self.high - self.low)
        return (1.0 - share if self.flip else share) * (self.dots - 1)

    def cell(self, value: float, per_cell: int) -> int:
        """The character cell that holds a value."""
        return int(math.floor((float(self.dot(value)) + 0.5) / per_cell))


def ticks(low: float, high: float, room: int) -> list[float]:
    """At most `room` round values (not logarithms) in 10**low..10**high: decades, or 1 2 5, or a linear step.

    >>> ticks(-0.4, 1.4, 8)
    [0.5, 1.0, 2.0, 5.0, 10.0, 20.0]
    >>> ticks(-6.0, 0.0, 4)
    [1e-06, 0.0001, 0.01, 1.0]
    """
    finest = _stepped(low, high, STEPS[0])
    if len(finest) < 2:
        return _even_ticks(low, high, room)
    for steps in STEPS:
        values = _stepped(low, high, steps)
        if len(values) <= room:
            return values
    decades = _stepped(low, high, (1.0,))
    if not decades:
        return finest[:: max(1, math.ceil(len(finest) / max(room, 1)))]
    return decades[:: max(1, math.ceil(len(decades) / max(room, 1)))]


def _stepped(low: float, high: float, steps: Sequence[float]) -> list[float]:
    values = [step * 10.0**power for power in range(math.floor(low), math.ceil(high) + 1) for step in steps]
    return [_round(value) for value in values if low <= math.log10(value) <= high]


def _even_ticks(low: float, high: float, room: int) -> list[float]:
    bottom, top = 10.0**low, 10.0**high
    raw = (top - bottom) / max(1, min(room, 4))
    power = 10.0 ** math.floor(math.log10(raw))
    step = next(step * power for step in (1, 2, 5, 10) if step * power >= raw)
    count = int((top - math.ceil(bottom / step) * step) / step) + 1
    return [_round((math.ceil(bottom / step) + index) * step) for index in range(max(count, 0))]


def _round(value: float) -> float:
    return float(f"{value:.6g}")


def tick_text(value: float) -> str:
    """A tick as short as it can be read: 0.05, 1, 20, 1000, 1e-15.

    >>> [tick_text(value) for value in (0.05, 20.0, 1000.0, 1e-15, 2e5)]
    ['0.05', '20', '1000', '1e-15', '2e5']
    """
    if value == 0:
        return "0"
    if 1e-3 <= abs(value) < 1e5:
        return f"{value:.6f}".rstrip("0").rstrip(".") if abs(value) < 1 else f"{value:.6g}"
    mantissa, power = f"{value:.2e}".split("e")
    mantissa = mantissa.rstrip("0").rstrip(".")
    return f"{mantissa}e{int(power)}"


def flux_unit(high: float) -> tuple[int, str]:
    """Power of ten and name of the Jy unit in which an axis up to 10**`high` Jy reads best.

    >>> flux_unit(-1.3), flux_unit(2.0)
    ((-3, 'mJy'), (0, 'Jy'))
    """
    for power, name in UNITS_JY:
        if high >= power:
            return power, name
    return UNITS_JY[-1]
