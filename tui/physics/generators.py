"""Columns of the mixture bound's cone: the natural thermal sources behind their screens, seen through bands.

A family is a list of sources times a list of foreground screens (A_V, R_V); each pair is one column, the band
fluxes of that source behind that screen, at any scale. Every second node of the fine grid's axes makes the middle
grid, every fourth the coarse one, so what is solved on the coarse grid is certified on one four times as fine.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING, Protocol

import numpy as np
from numpy.typing import NDArray

from tui.model import FloatArray

if TYPE_CHECKING:
    from tui.physics.templates import Templates

COARSE_BLOCK, MIDDLE_BLOCK = 128, 512  # columns of those grids that send one best column a round
BLOCK = 2048  # columns a block: a block, its right side and its product stay in the processor's cache
STARLIKE = ("photosphere", "planck")  # families whose hot sources may be stars
STAR_K = 2000.0  # the coolest source that may be one
DARK = 1e-20  # of a column's largest flux: only the trace that every column has
TEMPLATE = "template "  # before a user template's name in its family's


@dataclass(frozen=True, slots=True, eq=False)
class Family:
    """Sources of one nature times their screens; columns in source-major order."""

    name: str  # "photosphere", "planck", "modified", "feature", or "template NAME" of the user's
    keys: tuple[str, ...]  # names of the source's parameters
    sources: FloatArray  # shape (N, len(keys))
    screens: FloatArray  # shape (S, 2): A_V in mag, R_V; no screen first
    first: int  # index of its first column

    @property
    def size(self) -> int:
        """Columns it has."""
        return len(self.sources) * len(self.screens)

    def star_k(self) -> FloatArray:
        """Temperature of each column's source where it may be a star, else 0; shape (size,)."""
        if self.name not in STARLIKE:
            return np.zeros(self.size)
        hot = np.where(self.sources[:, 0] >= STAR_K, self.sources[:, 0], 0.0)
        return np.repeat(hot, len(self.screens))


@dataclass(frozen=True, slots=True, eq=False)
class Layout:
    """What the columns are, whatever the bands."""

    families: tuple[Family, ...]
    coarse: NDArray[np.int64]  # columns of the coarse grid
    middle: NDArray[np.int64]  # columns of the middle grid


@dataclass(frozen=True, slots=True, eq=False)
class Grid:
    """Some of the columns, in blocks."""

    flux: NDArray[np.float32]  # shape (blocks, B, width)
    index: NDArray[np.int64]  # shape (blocks * width,): where they are in the fine grid


@dataclass(frozen=True, eq=False)
class Generators:
    """Columns of the natural cone on one set of bands; grids are cut into blocks when first asked for."""

    rows: tuple[NDArray[np.float32], ...]  # B of shape (columns,): each band's flux of every column
    layout: Layout

    @cached_property
    def flux(self) -> NDArray[np.float32]:
        """The fine grid, shape (blocks, B, BLOCK), filled up with the last column."""
        width = -self.rows[0].size % BLOCK
        return _blocks([np.pad(row, (0, width), mode="edge") for row in self.rows], BLOCK)

    @cached_property
    def coarse(self) -> Grid:
        """Every fourth node."""
        return self._grid(self.layout.coarse, COARSE_BLOCK)

    @cached_property
    def middle(self) -> Grid:
        """Every second node."""
        return self._grid(self.layout.middle, MIDDLE_BLOCK)

    @cached_property
    def star_k(self) -> NDArray[np.float32]:
        """Temperature of a photosphere or a Planck source as hot, else 0; shape (columns,)."""
        return np.concatenate([family.star_k() for family in self.layout.families]).astype(np.float32)

    @property
    def added(self) -> tuple[str, ...]:
        """Names of the user's templates among the sources."""
        names = [family.name for family in self.layout.families]
        return tuple(name.removeprefix(TEMPLATE) for name in names if name.startswith(TEMPLATE))

    def dark(self, names: Sequence[str]) -> dict[str, list[str]]:
        """User's template -> the bands, named as the rows are, in which it has no light at all."""
        found = {}
        for family in self.layout.families:
            if family.name.startswith(TEMPLATE):
                seen = self.column(np.array(family.first))
                bands = [name for name, flux in zip(names, seen, strict=True) if flux < DARK]
                found[family.name.removeprefix(TEMPLATE)] = bands
        return found

    def column(self, index: NDArray[np.int64]) -> FloatArray:
        """Columns by index (any shape), bands on the last axis, float64."""
        index = np.minimum(index, self.rows[0].size - 1)  # what fills the last block up
        out = np.empty((*np.shape(index), len(self.rows)))
        for place, row in enumerate(self.rows):
            out[..., place] = row[index]
        return out

    def through(self, rows: Sequence[int] | NDArray[np.intp]) -> Generators:
        """The same columns seen in some of the bands only."""
        return Generators(tuple(self.rows[place] for place in rows), self.layout)

    def unscreened(self, index: NDArray[np.int64]) -> NDArray[np.bool_]:
        """Whether nothing stands before a column's source."""
        out = np.zeros(index.shape, bool)
        for family in self.layout.families:
            own = (index >= family.first) & (index < family.first + family.size)
            out |= own & ((index - family.first) % len(family.screens) == 0)
        return out

    def cooler(self, limit_k: float) -> Generators:
        """Coarse and middle grids without the screened stars and Planck sources hotter than `limit_k`.

        The coolest photosphere takes the places of those left out; the fine grid stays whole.
        """

        def without(index: NDArray[np.int64]) -> NDArray[np.int64]:
            out = (self.star_k[index] > limit_k) & ~self.unscreened(index)
            return np.where(out, 0, index)

        less = replace(self.layout, coarse=without(self.layout.coarse), middle=without(self.layout.middle))
        return Generators(self.rows, less)

    def describe(self, index: int) -> dict[str, float | str]:
        """What a column is: its family, the parameters of its source, A_V and R_V."""
        family = max((one for one in self.layout.families if one.first <= index), key=lambda one: one.first)
        source, screen = divmod(min(index - family.first, family.size - 1), len(family.screens))
        facts: dict[str, float | str] = {"family": family.name}
        facts.update(zip(family.keys, family.sources[source].tolist(), strict=True))
        facts["av"], facts["r_v"] = family.screens[screen].tolist()
        return facts

    def _grid(self, index: NDArray[np.int64], width: int) -> Grid:
        """Some columns as blocks of their own, the last filled up with the last column."""
        index = np.pad(index, (0, -len(index) % width), mode="edge")
        return Grid(_blocks([row[index] for row in self.rows], width), index)


class Source(Protocol):
    """Where generators come from: they are made once and kept, which is not the business of physics."""

    @property
    def added(self) -> tuple[str, ...]:
        """Names of the user's templates."""
        ...

    def __call__(self, templates: Templates, names: tuple[str, ...]) -> Generators:
        """The columns in some bands of `templates`."""
        ...


def _blocks(rows: Sequence[NDArray[np.float32]], width: int) -> NDArray[np.float32]:
    return np.stack([row.reshape(-1, width) for row in rows], axis=1)
