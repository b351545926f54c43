"""The natural thermal sources of which the mixture bound makes its mixtures, seen through bands."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from tui.model import FloatArray
from tui.physics.constants import MAG
from tui.physics.extinction import R_V_RANGE, extinction_curve
from tui.physics.generators import STAR_K, TEMPLATE, Family, Generators, Layout
from tui.physics.photometry import Quadrature, is_narrow, quadrature
from tui.physics.planck import ln_planck_jy

if TYPE_CHECKING:
    from tui.physics.templates import Templates

NIL = 1e-25  # a column's flux in a band, over its largest, that counts as nothing (float32 holds 1e-38)
AV_MAX = 40.0  # mag; behind more, a star's light through any band to 5 micron is that of a hotter or redder source
HOT_K, COLD_K = (STAR_K, 100000.0), (20.0, STAR_K)  # Planck sources, in two ranges of one family
MODIFIED_BETA, MODIFIED_UM = (0.5, 2.0), (1.0, 300.0)  # emissivity min(1, um/wave)^beta of dust grains
FEATURE_UM, FEATURE_WIDTH, FEATURE_K = (3.2, 40.0), (0.02, 0.3), (120.0, 900.0)  # minerals and PAH
NODES = 120  # quadrature nodes a band; 240 give the same to 2e-5
TEMPLATES_MAX = 200  # a longer list of templates, in order of temperature, is thinned evenly to at most this many

GivenSpectrum = tuple[FloatArray, FloatArray]  # wavelength in micron, flux density in Jy at any scale


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


def transmission(rules: Sequence[Quadrature], law: str, screens: FloatArray) -> list[NDArray[np.float32]]:
    """Share of light that each screen lets through at the nodes of each band, shapes (nodes, S)."""
    wave = np.concatenate([rule.wave_um for rule in rules])
    values, which = np.unique(screens[:, 1], return_inverse=True)
    curves = np.stack([extinction_curve(wave, law, float(r_v)) for r_v in values], axis=1)
    ends = np.cumsum([rule.wave_um.size for rule in rules])[:-1]
    depth = (-MAG * curves).astype(np.float32)[:, which] * screens[:, 0].astype(np.float32)
    return np.split(np.exp(depth), ends)


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


def generators_of(templates: Templates, user: Mapping[str, GivenSpectrum] | None = None) -> Generators:
    """All columns through all bands of `templates`; a quarter of a second or more.

    Args:
        user: the user's own natural sources, by name.
    """
    rules = [quadrature(band, None if is_narrow(band) else NODES) for band in templates.bands]
    star = templates.star
    teff_k = np.exp(star.low + star.step * np.arange(star.ln_flux.shape[0]))
    return build_generators(rules, teff_k, star.ln_flux, templates.law, user)


def build_generators(
    rules: Sequence[Quadrature],
    teff_k: FloatArray,
    ln_flux: FloatArray,
    law: str = "g23",
    user: Mapping[str, GivenSpectrum] | None = None,
) -> Generators:
    """All columns of the natural cone through bands.

    Args:
        rules: one quadrature per band, B of them.
        teff_k: shape (N,), effective temperatures of the photosphere templates.
        ln_flux: shape (N, B), ln of their band fluxes at any scale; NaN where the source says nothing.
        law: extinction law of every screen.
        user: name -> (wavelength in micron, flux density in Jy at any scale), natural sources the user adds; dark
            outside their own range.
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
        *(light.spectrum(name, spectrum, star) for name, spectrum in (user or {}).items()),
    ]
    return _assemble(parts)


Screens = tuple[FloatArray, NDArray[np.int64]]
Shape = Callable[..., FloatArray]  # (wave_um, parameter, ...) -> (N, nodes)


@dataclass(frozen=True, slots=True, eq=False)
class _Part:
    name: str
    keys: tuple[str, ...]
    sources: FloatArray
    screens: FloatArray
    flux: NDArray[np.float32]  # shape (B, columns)
    level: NDArray[np.int64]  # shape (columns,): 4 coarse, 2 middle, 1 fine only


@dataclass(frozen=True, slots=True, eq=False)
class _Light:
    """Sources through screens into bands."""

    rules: Sequence[Quadrature]
    shades: Mapping[int, Sequence[NDArray[np.float32]]]  # id of a screen grid -> per band (nodes, S)

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
            source = (planck_sources(rule.wave_um, axes[0]) * rule.weight).astype(np.float32)
            if shape:
                form = shape(rule.wave_um, *rest.T).astype(np.float32)
                source = (source[:, None, :] * form).reshape(len(parameters), -1)
            rows.append((source @ shade).ravel())
        return _Part(name, keys, parameters, screens[0], np.stack(rows), np.minimum.outer(level, screens[1]).ravel())

    def photospheres(self, teff_k: FloatArray, ln_flux: FloatArray, screens: Screens) -> _Part:
        """Templates dimmed in each band as a Planck source of their temperature is."""
        step = -(-teff_k.size // TEMPLATES_MAX)
        teff = teff_k[::step]
        top = np.nanmax(ln_flux)
        rows = []
        for rule, shade, ln_band in zip(self.rules, self.shades[id(screens)], ln_flux[::step].T, strict=True):
            source = planck_sources(rule.wave_um, teff) * rule.weight
            share = (source / source.sum(axis=1, keepdims=True)).astype(np.float32) @ shade
            rows.append((np.exp(ln_band - top).astype(np.float32)[:, None] * share).ravel())
        level = np.minimum.outer(stride(teff.size), screens[1]).ravel()
        return _Part("photosphere", ("teff",), teff[:, None], screens[0], np.nan_to_num(np.stack(rows)), level)

    def spectrum(self, name: str, given: GivenSpectrum, screens: Screens) -> _Part:
        """One spectrum of the user's."""
        wave_um, flux_jy = given[0], np.maximum(given[1], 0.0)
        flux_jy = flux_jy / max(flux_jy.max(), 1e-300)
        rows = [
            light_at_nodes(rule, wave_um, flux_jy).astype(np.float32) @ shade
            for rule, shade in zip(self.rules, self.shades[id(screens)], strict=True)
        ]
        return _Part(TEMPLATE + name, (), np.zeros((1, 0)), screens[0], np.stack(rows), screens[1])


def light_at_nodes(rule: Quadrature, wave_um: FloatArray, flux_jy: FloatArray) -> FloatArray:
    """Weight times flux of a spectrum at a band's nodes, shape (nodes,): lines between nodes go to their neighbours.

    The spectrum is linear between its samples and zero outside; so is the band's weight per micron between nodes.
    """
    nodes = rule.wave_um
    if nodes.size == 1:
        return rule.weight * np.interp(nodes, wave_um, flux_jy, left=0.0, right=0.0)
    per_um = rule.weight / simpson_weights(nodes[::2])
    knots = np.union1d(nodes, wave_um[(wave_um > nodes[0]) & (wave_um < nodes[-1])])
    fine = np.sort(np.concatenate([knots, (knots[:-1] + knots[1:]) / 2]))
    weight = simpson_weights(knots) * np.interp(fine, nodes, per_um)
    weight *= rule.weight.sum() / weight.sum()
    light = weight * np.interp(fine, wave_um, flux_jy, left=0.0, right=0.0)
    right = np.clip(np.searchsorted(nodes, fine), 1, nodes.size - 1)
    share = (fine - nodes[right - 1]) / (nodes[right] - nodes[right - 1])
    left = np.bincount(right - 1, light * (1.0 - share), nodes.size)
    return left + np.bincount(right, light * share, nodes.size)


def simpson_weights(edges: FloatArray) -> FloatArray:
    """Weights of Simpson's rule at edges and the midpoints between them, shape (2 N - 1,) for edges (N,)."""
    step = np.diff(edges)
    weight = np.zeros(2 * edges.size - 1)
    weight[0:-2:2] += step / 6
    weight[2::2] += step / 6
    weight[1::2] = 4 * step / 6
    return weight


def _assemble(parts: Sequence[_Part]) -> Generators:
    """One table of float32 rows, every column over its own largest band flux.

    Each column has a trace of the hottest Planck source in it, which is natural too, so that none is zero in any
    set of bands.
    """
    first, families = 0, []
    hottest = parts[1].flux[:, parts[1].flux.shape[1] - len(parts[1].screens)]  # unscreened, the last temperature
    trace = (NIL * (hottest / hottest.max()))[:, None]
    table = np.empty((len(hottest), sum(part.flux.shape[1] for part in parts)), dtype=np.float32)
    for part in parts:
        families.append(Family(part.name, part.keys, part.sources, part.screens, first))
        top = part.flux.max(axis=0)
        own = table[:, first : first + top.size]
        np.divide(part.flux, np.where(top > 0, top, np.float32(1.0)), out=own)
        own[own < NIL] = 0.0
        own += trace
        first += top.size
    level = np.concatenate([part.level for part in parts])
    return Generators(tuple(table), Layout(tuple(families), np.flatnonzero(level >= 4), np.flatnonzero(level >= 2)))
