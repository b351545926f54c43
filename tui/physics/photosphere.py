"""What an ordinary star's surface emits in each band, by effective temperature.

A photosphere here is ln of the band's flux density per unit of squared angular radius (Jy), on a grid in
ln T_eff: F = theta^2 * exp(ln_flux), theta = R/d in radian. Planck gives pi B_nu.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from scipy.interpolate import PchipInterpolator
from scipy.ndimage import gaussian_filter1d

from tui.model import Band, FloatArray
from tui.physics.constants import L_SUN, PARSEC
from tui.physics.photometry import Quadrature, flux_from_mag
from tui.physics.planck import ln_planck_jy, surface_flux

DWARF_SHORT_UM = 0.355  # no filling shortward of U: a star's ultraviolet is no Planck curve
FILL_FROM = ("U", "B", "V", "Rc", "Ic", "J", "H", "Ks", "W1", "W2", "W3", "W4")  # filled between in ln wavelength
FADE_LN_T = 0.1  # beyond its column a band's own offset from the filled value fades within this step of ln T
PLANCK_RANGE_K = (2300.0, 60000.0)
SMOOTH_NODES = 15  # table rows that a smoothed one looks at: the rows' temperatures scatter by 1 to 2 %, and the
# wiggles that this makes (3 to 6 % from row to row) would turn one minimum of chi-square into several
ROUND_LN_T = 0.05


@dataclass(frozen=True, slots=True, eq=False)
class Photosphere:
    """Band fluxes of one photosphere source on its own temperature grid."""

    source: str  # "dwarfs", "planck", or the name of a grid
    teff_k: FloatArray  # shape (N,), increasing
    ln_flux: FloatArray  # shape (N, B), ln Jy at theta = 1 radian; NaN where the source says nothing
    native: tuple[bool, ...]  # per band: in the source's own table, not filled
    radius_m: FloatArray  # shape (N,), stellar radius on the dwarf sequence, NaN for other sources


def ln_planck_bands(temperature_k: FloatArray, rules: Sequence[Quadrature]) -> FloatArray:
    """ln of the band average of pi B_nu, shape (N, B), for temperatures (N,)."""
    columns = []
    for rule in rules:
        ln_b = ln_planck_jy(rule.wave_um[None, :], temperature_k[:, None])
        top = ln_b.max(axis=1, keepdims=True)
        columns.append(np.log(np.pi * (np.exp(ln_b - top) @ rule.weight)) + top[:, 0])
    return np.stack(columns, axis=1)


def planck_photosphere(teff_k: FloatArray, rules: Sequence[Quadrature]) -> Photosphere:
    """Black bodies in the place of stars."""
    table = ln_planck_bands(teff_k, rules)
    return Photosphere("planck", teff_k, table, (True,) * len(rules), np.full(teff_k.shape, np.nan))


def smoothed(x: FloatArray, y: FloatArray, nodes: int = SMOOTH_NODES) -> FloatArray:
    """Local quadratic regression of `y` on increasing `x` with tricube weights (Cleveland 1979); NaN stay NaN."""
    known = np.flatnonzero(np.isfinite(y))
    result = np.full(y.shape, np.nan)
    count = min(nodes, known.size)
    for centre in known:
        nearest = known[np.argsort(np.abs(x[known] - x[centre]), kind="stable")[:count]]
        reach = 1.001 * np.abs(x[nearest] - x[centre]).max()
        weight = (1 - (np.abs(x[nearest] - x[centre]) / reach) ** 3) ** 1.5  # root of the tricube weight
        basis = (x[nearest] - x[centre])[:, None] ** np.arange(3)
        result[centre] = np.linalg.lstsq(basis * weight[:, None], y[nearest] * weight, rcond=None)[0][0]
    return result


def interpolate_gaps(x: FloatArray, y: FloatArray, at: FloatArray) -> FloatArray:
    """`y` over increasing `x` at even `at`: monotone (PCHIP) across NaN gaps, constant beyond the last values.

    The kinks that monotone pieces leave at the rows are rounded off over ROUND_LN_T.
    """
    known = np.isfinite(y)
    piece = PchipInterpolator(x[known], y[known])(np.clip(at, x[known][0], x[known][-1]))
    return gaussian_filter1d(piece, ROUND_LN_T / (at[1] - at[0]), mode="nearest")


def dwarf_photosphere(
    teff_table_k: FloatArray,
    logl: FloatArray,
    absolute_mag: Mapping[str, FloatArray],
    bands: Sequence[Band],
    all_bands: Mapping[str, Band],
    rules: Mapping[str, Quadrature],
    teff_k: FloatArray,
) -> Photosphere:
    """The mean dwarf sequence through `bands`, on the grid `teff_k`.

    In each tabulated band the logarithm of F/F_Ks is smoothed and interpolated after its Planck value is taken
    off, since what is left is small. The twelve bands of FILL_FROM keep their last remainder where their column
    ends; any other band, and any temperature beyond its column, takes the remainder between its neighbours
    among the twelve in ln wavelength (the last one's beyond 22 micron). Nothing is given shortward of 0.36 micron.

    Args:
        teff_table_k, logl: shape (T,), any order; `logl` dex of the nominal solar luminosity.
        absolute_mag: band -> (T,), NaN where the source has none; Ks complete.
        bands: the B bands wanted; `all_bands` and `rules` cover them and the tabulated ones.
        teff_k: shape (N,), increasing, inside the table.
    Source: Pecaut & Mamajek 2013, ApJS 208, 9 (2022 update); radius from L = 4 pi R^2 sigma T^4.
    """
    order = np.argsort(teff_table_k)
    x, at = np.log(teff_table_k[order]), np.log(teff_k)
    radius_10pc = np.sqrt(L_SUN * 10.0 ** logl[order] / (4 * np.pi * surface_flux(teff_table_k[order])))
    tabulated = {name: mags[order] for name, mags in absolute_mag.items() if name in all_bands}

    def remainder(name: str) -> FloatArray:
        planck = ln_planck_bands(teff_table_k[order], [rules[name], rules["Ks"]])
        flux = np.log(flux_from_mag(tabulated[name], all_bands[name].zero_point_jy))
        ks = np.log(flux_from_mag(tabulated["Ks"], all_bands["Ks"].zero_point_jy))
        return smoothed(x, (flux - ks) - (planck[:, 0] - planck[:, 1]))

    known = {name: remainder(name) for name in tabulated}
    ks_surface = np.log(flux_from_mag(tabulated["Ks"], all_bands["Ks"].zero_point_jy))
    ks_surface = ks_surface - 2 * np.log(radius_10pc / (10 * PARSEC))
    ks_planck = ln_planck_bands(teff_table_k[order], [rules["Ks"]])[:, 0]
    ks_ratio = interpolate_gaps(x, smoothed(x, ks_surface - ks_planck), at)
    fill_wave = np.log([all_bands[name].pivot_um for name in FILL_FROM])
    fill = np.stack([interpolate_gaps(x, known[name], at) for name in FILL_FROM], axis=1)
    wanted = ln_planck_bands(teff_k, [rules[band.name] for band in bands])
    for column, band in enumerate(bands):
        wanted[:, column] += ks_ratio + band_remainder(band, x, known.get(band.name), at, fill_wave, fill)
    radius = np.exp(interpolate_gaps(x, smoothed(x, np.log(radius_10pc)), at))
    return Photosphere("dwarfs", teff_k, wanted, tuple(band.name in known for band in bands), radius)


def band_remainder(
    band: Band, x: FloatArray, known: FloatArray | None, at: FloatArray, fill_wave: FloatArray, fill: FloatArray
) -> FloatArray:
    """Offset from Planck of ln(F/F_Ks) in one band, shape (N,) at ln T `at`; NaN where the sequence is silent."""
    if known is not None and band.name in FILL_FROM:
        return fill[:, FILL_FROM.index(band.name)]
    if band.pivot_um < DWARF_SHORT_UM:
        return np.full(at.shape, np.nan)
    wave = np.clip(np.log(band.pivot_um), fill_wave[0], fill_wave[-1])
    upper = int(np.clip(np.searchsorted(fill_wave, wave), 1, fill_wave.size - 1))
    share = (wave - fill_wave[upper - 1]) / (fill_wave[upper] - fill_wave[upper - 1])
    filled = (1 - share) * fill[:, upper - 1] + share * fill[:, upper]
    if known is None:
        return filled
    inside = x[np.isfinite(known)]
    beyond = np.maximum(inside[0] - at, 0) + np.maximum(at - inside[-1], 0)
    edge = np.interp(np.clip(at, inside[0], inside[-1]), at, filled)
    return filled + (interpolate_gaps(x, known, at) - edge) * np.exp(-beyond / FADE_LN_T)
