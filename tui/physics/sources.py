"""Tables of what a family of sources emits per band, quick to read off for many sources at once."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from tui.model import FloatArray


@dataclass(frozen=True, eq=False)
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

    @cached_property
    def pieces(self) -> FloatArray:
        """Cubic coefficients of every piece, shape (N - 1, 4 B): constant, linear, square, cube."""
        y0, y1, m0, m1 = self.ln_flux[:-1], self.ln_flux[1:], self.slope[:-1], self.slope[1:]
        rise = y1 - y0
        return np.concatenate([y0, m0, 3 * rise - 2 * m0 - m1, m0 + m1 - 2 * rise], axis=1)

    def at(self, x: FloatArray) -> tuple[FloatArray, FloatArray]:
        """ln flux and its derivative with x, each (M, B), at x (M,); x is held inside the table."""
        last = self.ln_flux.shape[0] - 1.000001
        place = np.minimum(np.maximum((x - self.low) / self.step, 0.0), last)
        left = place.astype(np.intp)
        t = (place - left)[:, None]
        c0, c1, c2, c3 = self.pieces[left].reshape(x.size, 4, -1).transpose(1, 0, 2)
        cube = t * c3
        value = c0 + t * (c1 + t * (c2 + cube))
        return value, (c1 + t * (2.0 * c2 + 3.0 * cube)) / self.step


def source_grid(name: str, x: FloatArray, ln_flux: FloatArray) -> SourceGrid:
    """A table over an even grid `x` (N,) with values (N, B)."""
    return SourceGrid(name, float(x[0]), float(x[1] - x[0]), ln_flux, np.gradient(ln_flux, axis=0))
