"""The natural thermal sources of which the mixture bound makes its mixtures, seen through bands.

A family is a list of sources times a list of foreground screens (A_V, R_V); each pair is one column, the band
fluxes of that source behind that screen, at any scale. Every second node of the fine grid's axes makes the middle
grid, every fourth the coarse one, so what is solved on the coarse grid is certified on one four times as fine.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from tui.model import FloatArray
from tui.physics.constants import MAG
from tui.physics.extinction import R_V_RANGE, extinction_curve
from tui.physics.photometry import Quadrature
from tui.physics.planck import ln_planck_jy

COARSE_BLOCK, MIDDLE_BLOCK = 128, 512  # columns of those grids that send one best column a round
BLOCK = 2048  # columns a block: a block, its right side and its product stay in the processor's cache
NIL = 1e-25  # a column's flux in a band, over its largest, that counts as nothing (float32 holds 1e-38)
AV_MAX = 40.0  # mag; behind more, a star's light through any band to 5 micron is that of a hotter or redder source
HOT_K, COLD_K = (2000.0, 100000.0), (20.0, 2000.0)  # Planck sources, in two ranges of one family
MODIFIED_BETA, MODIFIED_UM = (0.5, 2.0), (1.0, 300.0)  # emissivity min(1, um/wave)^beta of dust grains
FEATURE_UM, FEATURE_WIDTH, FEATURE_K = (3.2, 40.0), (0.02, 0.3), (120.0, 900.0)  # minerals and PAH
TEMPLATES_MAX = 200  # a longer list of templates, in order of temperature, is thinned evenly to at most this many


@dataclass(frozen=True, slots=True, eq=False)
class Family:
    """Sources of one nature times their screens; columns in source-major order."""

    name: str  # "photosphere", "planck", "modified", "feature", or a user template's name
    keys: tuple[str, ...]  # names of the source's parameters
    sources: FloatArray  # shape (N, len(keys))
    screens: FloatArray  # shape (S, 2): A_V in mag, R_V
    first: int  # index of its first column


@dataclass(frozen=True, slots=True, eq=False)
class Grid:
    """Some of the columns, in blocks."""

    flux: NDArray[np.float32]  # shape (blocks, B, width)
    index: NDArray[np.int64]  # shape (blocks * width,): where they are in the fine grid

    def through(self, rows: NDArray[np.intp]) -> Grid:
        """The same columns seen in some of the bands only."""
        return Grid(np.take(self.flux, rows, axis=1), self.index)


@dataclass(frozen=True, slots=True, eq=False)
class Generators:
    """Columns of the natural cone on one set of bands."""

    flux: NDArray[np.float32]  # shape (blocks, B, BLOCK): each column's largest band is 1
    coarse: Grid
    middle: Grid
    families: tuple[Family, ...]
    covered: NDArray[np.bool_]  # shape (B,): bands for which the photosphere source has a flux
    star_k: NDArray[np.float32]  # shape (columns,): temperature of a photosphere or a Planck source as hot; else 0

    def column(self, index: NDArray[np.int64]) -> FloatArray:
        """Columns by index (any shape), bands on the last axis, float64."""
        return self.flux[index // BLOCK, :, index % BLOCK].astype(np.float64)

    def through(self, rows: Sequence[int] | NDArray[np.intp]) -> Generators:
        """The same columns seen in some of the bands only."""
        rows = np.asarray(rows, dtype=np.intp)
        return replace(
            self,
            flux=np.take(self.flux, rows, axis=1),
            coarse=self.coarse.through(rows),
            middle=self.middle.through(rows),
            covered=self.covered[rows],
        )

    def unscreened(self, index: NDArray[np.int64]) -> NDArray[np.bool_]:
        """Whether nothing stands before a column's source."""
        out = np.zeros(index.shape, bool)
        for family in self.families:
            size = len(family.sources) * len(family.screens)
            own = (index >= family.first) & (index < family.first + size)
            out |= own & ((index - family.first) % len(family.screens) == 0)
        return out

    def cooler(self, limit_k: float) -> Generators:
        """Coarse and middle grids without the screened stars and Planck sources hotter than `limit_k`.

        The coolest photosphere takes the places of those left out; the fine grid stays whole.
        """
        coolest = self.column(np.zeros(1, np.int64))[0].astype(np.float32)

        def without(grid: Grid) -> Grid:
            out = (self.star_k[grid.index] > limit_k) & ~self.unscreened(grid.index)
            flux = grid.flux.copy()
            place = np.flatnonzero(out)
            width = flux.shape[2]
            flux[place // width, :, place % width] = coolest
            return Grid(flux, np.where(out, 0, grid.index))

        return replace(self, coarse=without(self.coarse), middle=without(self.middle))

    def describe(self, index: int) -> dict[str, float | str]:
        """What a column is: its family, the parameters of its source, A_V and R_V."""
        family = max((one for one in self.families if one.first <= index), key=lambda one: one.first)
        source, screen = divmod(index - family.first, len(family.screens))
        facts: dict[str, float | str] = {"family": family.name}
        facts.update(zip(family.keys, family.sources[source].tolist(), strict=True))
        facts["av"], facts["r_v"] = family.screens[screen].tolist()
        return facts


def refined(low: float, high: float, coarse: int, *, log: bool = True) -> FloatArray:
    """An axis of 4 * coarse + 1 nodes, every fourth of which is the coarse axis.

    >>> refined(1.0, 2.0, 1, log=False).tolist()
    [1.0, 1.25, 1.5, 1.75, 2.0]
    """
    space = np.geomspace if log else np.linspace
    return np.clip(space(low, high, 4 * coarse + 1), low, high)


def stride(count: int, first: int = 0) -> NDArray[np.int64]:
    """How coarse the nodes of an axis are: 4 on the coarse axis, 2 on the middle one, else 1."""
    place = np.arange(first, first + count)
    return np.where(place % 4 == 0, 4, np.where(place % 2 == 0, 2, 1))


def screen_grid(law: str, coarse_av: int, coarse_rv: int) -> tuple[FloatArray, NDArray[np.int64]]:
    """Screens (S, 2) of A_V and R_V and how coarse they are; no screen first.

    A_V steps grow in proportion to 3 mag + A_V; R_V is even in 1/R_V, in which the laws are linear.
    """
    av = 3.0 * np.expm1(refined(0.0, np.log1p(AV_MAX / 3.0), coarse_av, log=False))
    inverse = refined(1 / R_V_RANGE[1], 1 / R_V_RANGE[0], coarse_rv, log=False) if coarse_rv else np.array([1 / 3.1])
    if law == "wc19":
        inverse = np.array([1 / 3.1])
    r_v = np.clip(1.0 / inverse, *R_V_RANGE)
    pair = np.stack(np.meshgrid(av[1:], r_v, indexing="ij"), axis=-1).reshape(-1, 2)
    level = np.minimum.outer(stride(av.size - 1, 1), stride(r_v.size))
    return np.vstack([[0.0, 3.1], pair]), np.concatenate([[4], level.ravel()])


def transmission(rules: Sequence[Quadrature], law: str, screens: FloatArray) -> list[FloatArray]:
    """Share of light that each screen lets through at the nodes of each band, shapes (nodes, S)."""
    wave = np.concatenate([rule.wave_um for rule in rules])
    values, which = np.unique(screens[:, 1], return_inverse=True)
    curves = np.stack([extinction_curve(wave, law, float(r_v)) for r_v in values], axis=1)
    ends = np.cumsum([rule.wave_um.size for rule in rules])[:-1]
    return [np.exp(-MAG * curve[:, which] * screens[:, 0]) for curve in np.split(curves, ends)]


def planck_sources(wave_um: FloatArray, temperature_k: FloatArray) -> FloatArray:
    """B_nu in Jy/sr, shape (N, nodes), for temperatures (N,); e^-600 in place of less."""
    return np.exp(np.maximum(ln_planck_jy(wave_um[None, :], temperature_k[:, None]), -600.0))


def emissivity(wave_um: FloatArray, beta: FloatArray, break_um: FloatArray) -> FloatArray:
    """min(1, break_um/wave)^beta of small grains, shape (N, nodes); `beta`, `break_um` (N,)."""
    return np.exp(beta[:, None] * np.log(np.minimum(1.0, break_um[:, None] / wave_um[None, :])))


def drude(wave_um: FloatArray, centre_um: FloatArray, width: FloatArray) -> FloatArray:
    """A band of minerals or PAH, 1 at its centre, `width` its full width at half maximum over the centre.

    Source: width^2 / ((w/w0 - w0/w)^2 + width^2), the classical damped oscillator (Draine & Li 2007, ApJ 657, 810,
    eq. 12). Shape (N, nodes); `centre_um`, `width` (N,).
    """
    ratio = wave_um[None, :] / centre_um[:, None]
    return width[:, None] ** 2 / ((ratio - 1.0 / ratio) ** 2 + width[:, None] ** 2)


def _grid(*axes: FloatArray) -> tuple[FloatArray, NDArray[np.int64]]:
    """All combinations of axes from `refined`, shape (N, axes), and how coarse they are in every axis."""
    values = np.stack(np.meshgrid(*axes, indexing="ij"), axis=-1).reshape(-1, len(axes))
    level = np.stack(np.meshgrid(*[stride(axis.size) for axis in axes], indexing="ij"), axis=-1)
    return values, level.reshape(-1, len(axes)).min(axis=1)


def build_generators(
    rules: Sequence[Quadrature],
    teff_k: FloatArray,
    ln_flux: FloatArray,
    law: str = "g23",
    user: Mapping[str, tuple[FloatArray, FloatArray]] | None = None,
) -> Generators:
    """All columns of the natural cone through bands.

    Args:
        rules: one quadrature per band, B of them.
        teff_k: shape (N,), effective temperatures of the photosphere templates.
        ln_flux: shape (N, B), ln of their band fluxes at any scale; NaN where the source says nothing.
        law: extinction law of every screen.
        user: name -> (wavelength in micron, flux density in Jy at any scale), natural sources the user adds.
    """
    star, cold, dusty = screen_grid(law, 16, 2), screen_grid(law, 8, 0), screen_grid(law, 2, 0)
    shades = {id(grid): transmission(rules, law, grid[0]) for grid in (star, cold, dusty)}
    hot_k, cold_k = refined(*HOT_K, 35), refined(*COLD_K, 24)
    grain_k, feature_k = refined(*COLD_K, 16), refined(*FEATURE_K, 2)
    grains = refined(*MODIFIED_BETA, 2, log=False), refined(*MODIFIED_UM, 6)
    bumps = refined(*FEATURE_UM, 24), refined(*FEATURE_WIDTH, 1)
    light = _Light(rules, shades)
    parts = [
        light.photospheres(teff_k, ln_flux, star),
        light.thermal("planck", ("temperature",), (hot_k,), star),
        light.thermal("planck", ("temperature",), (cold_k,), cold),
        light.thermal("modified", ("temperature", "beta", "break_um"), (grain_k, *grains), dusty, emissivity),
        light.thermal("feature", ("temperature", "centre_um", "width"), (feature_k, *bumps), dusty, drude),
        *(light.spectrum(name, *spectrum, star) for name, spectrum in (user or {}).items()),
    ]
    return _assemble(parts, np.isfinite(ln_flux).all(axis=0))


Screens = tuple[FloatArray, NDArray[np.int64]]
Shape = Callable[..., FloatArray]  # (wave_um, parameter, ...) -> (N, nodes)


@dataclass(frozen=True, slots=True, eq=False)
class _Part:
    name: str
    keys: tuple[str, ...]
    sources: FloatArray
    screens: FloatArray
    flux: NDArray[np.floating]  # shape (B, columns)
    level: NDArray[np.int64]  # shape (columns,): 4 coarse, 2 middle, 1 fine only


@dataclass(frozen=True, slots=True, eq=False)
class _Light:
    """Sources through screens into bands."""

    rules: Sequence[Quadrature]
    shades: Mapping[int, Sequence[FloatArray]]  # id of a screen grid -> per band (nodes, S)

    def thermal(
        self,
        name: str,
        keys: tuple[str, ...],
        axes: tuple[FloatArray, ...],
        screens: Screens,
        shape: Shape | None = None,
    ) -> _Part:
        """B_nu at each temperature of the first axis times each shape made of the others."""
        parameters, level = _grid(*axes)
        rest = _grid(*axes[1:])[0] if shape else np.zeros((1, 0))
        rows = []
        for rule, shade in zip(self.rules, self.shades[id(screens)], strict=True):
            source = planck_sources(rule.wave_um, axes[0])[:, None, :] * rule.weight
            if shape:
                source = source * shape(rule.wave_um, *rest.T)[None, :, :]
            rows.append((source.reshape(len(parameters), -1) @ shade).ravel().astype(np.float32))
        return _Part(name, keys, parameters, screens[0], np.stack(rows), np.minimum.outer(level, screens[1]).ravel())

    def photospheres(self, teff_k: FloatArray, ln_flux: FloatArray, screens: Screens) -> _Part:
        """Templates dimmed in each band as a Planck source of their temperature is."""
        step = -(-teff_k.size // TEMPLATES_MAX)
        teff = teff_k[::step]
        top = np.nanmax(ln_flux)
        rows = []
        for rule, shade, ln_band in zip(self.rules, self.shades[id(screens)], ln_flux[::step].T, strict=True):
            source = planck_sources(rule.wave_um, teff) * rule.weight
            dimmed = (source @ shade) / source.sum(axis=1, keepdims=True)
            rows.append((np.exp(ln_band - top)[:, None] * dimmed).ravel().astype(np.float32))
        level = np.minimum.outer(stride(teff.size), screens[1]).ravel()
        return _Part("photosphere", ("teff",), teff[:, None], screens[0], np.nan_to_num(np.stack(rows)), level)

    def spectrum(self, name: str, wave_um: FloatArray, flux_jy: FloatArray, screens: Screens) -> _Part:
        """One spectrum of the user's, zero outside its own range."""
        rows = []
        for rule, shade in zip(self.rules, self.shades[id(screens)], strict=True):
            seen = np.interp(rule.wave_um, wave_um, np.maximum(flux_jy, 0.0), left=0.0, right=0.0)
            rows.append((seen * rule.weight) @ shade)
        return _Part(name, (), np.zeros((1, 0)), screens[0], np.stack(rows), screens[1])


def _assemble(parts: Sequence[_Part], covered: NDArray[np.bool_]) -> Generators:
    """One table of float32 blocks, every column over its own largest band flux.

    Each column has a trace of the hottest Planck source in it, which is natural too, so that none is zero in any
    set of bands; the last block is filled up with that source.
    """
    first, families = 0, []
    total = sum(part.flux.shape[1] for part in parts)
    hottest = parts[1].flux[:, parts[1].flux.shape[1] - len(parts[1].screens)]  # unscreened, the last temperature
    ground = (hottest / hottest.max())[:, None]
    table = np.tile(ground, (1, -(-total // BLOCK) * BLOCK)).astype(np.float32)
    for part in parts:
        families.append(Family(part.name, part.keys, part.sources, part.screens, first))
        top = part.flux.max(axis=0)
        scaled = part.flux / np.where(top > 0, top, 1.0)
        table[:, first : first + scaled.shape[1]] = np.where(scaled < NIL, 0.0, scaled) + NIL * ground
        first += scaled.shape[1]
    level = np.concatenate([part.level for part in parts])
    hot = [np.repeat(_star_k(part), len(part.screens)) for part in parts]
    return Generators(
        flux=_blocks(table, BLOCK),
        coarse=_part_of(table, np.flatnonzero(level >= 4), COARSE_BLOCK),
        middle=_part_of(table, np.flatnonzero(level >= 2), MIDDLE_BLOCK),
        families=tuple(families),
        covered=covered,
        star_k=np.concatenate([*hot, np.zeros(table.shape[1] - total)]).astype(np.float32),
    )


def _blocks(table: NDArray[np.float32], width: int) -> NDArray[np.float32]:
    return np.ascontiguousarray(table.reshape(len(table), -1, width).transpose(1, 0, 2))


def _part_of(table: NDArray[np.float32], index: NDArray[np.int64], width: int) -> Grid:
    """Some columns as blocks of their own, the last filled up with the last column."""
    index = np.pad(index, (0, -len(index) % width), mode="edge")
    return Grid(_blocks(table[:, index], width), index)


def _star_k(part: _Part) -> FloatArray:
    """Temperatures of a part's sources where they are stars or as hot, else 0."""
    if part.name not in ("photosphere", "planck"):
        return np.zeros(len(part.sources))
    return np.where(part.sources[:, 0] >= HOT_K[0], part.sources[:, 0], 0.0)
