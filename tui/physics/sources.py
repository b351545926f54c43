"""Tables of what a family of sources emits per band, quick to read off for many sources at once."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from tui.model import FloatArray


@dataclass(frozen=True, slots=True, eq=False)
class SourceGrid:
    """ln of band flux density per squared angular radius over an even grid of ln T (or of a slope).

    Read off by cubic Hermite pieces, so values and first derivatives are continuous.
    """

    name: str
    low: float  # the parameter's smallest value (ln T for thermal sources)
    step: float
    ln_flux: FloatArray  # shape (N, B)
    slope: FloatArray  # shape (N, B), d ln_flux per step

    @property
    def high(self) -> float:
        """The parameter's largest value."""
        return self.low + self.step * (self.ln_flux.shape[0] - 1)

    def take(self, columns: Sequence[int]) -> SourceGrid:
        """The same table for some bands only."""
        index = list(columns)
        return replace(
            self, ln_flux=np.ascontiguousarray(self.ln_flux[:, index]), slope=np.ascontiguousarray(self.slope[:, index])
        )

    def at(self, x: FloatArray) -> tuple[FloatArray, FloatArray]:
        """ln flux and its derivative with x, each (M, B), at x (M,); x is held inside the table."""
        place = np.clip((x - self.low) / self.step, 0.0, self.ln_flux.shape[0] - 1.000001)
        left = place.astype(np.intp)
        t = (place - left)[:, None]
        y0, y1 = self.ln_flux[left], self.ln_flux[left + 1]
        m0, m1 = self.slope[left], self.slope[left + 1]
        rise = y1 - y0
        a, b = 3 * rise - 2 * m0 - m1, m0 + m1 - 2 * rise
        value = y0 + t * (m0 + t * (a + t * b))
        return value, (m0 + t * (2 * a + 3 * t * b)) / self.step


def source_grid(name: str, x: FloatArray, ln_flux: FloatArray) -> SourceGrid:
    """A table over an even grid `x` (N,) with values (N, B)."""
    return SourceGrid(name, float(x[0]), float(x[1] - x[0]), ln_flux, np.gradient(ln_flux, axis=0))
