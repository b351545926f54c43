"""A low-resolution spectrum as narrow bands, one a point, and its broad shape as a few wide ones."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from tui.model import Band, FloatArray, Spectrum, digest
from tui.physics.photometry import AB_ZERO_JY, quadrature

INSTRUMENT = "spectrum"
PREFIX = "spectrum:"  # of a point's band, before its wavelength in micron
MOST_POINTS = 100  # of a spectrum in a fit: neighbours of a longer one are averaged
POINT_FLOOR = 0.01  # independent calibration error of a point, our choice; `floor.spectrum` sets it
LEAST_POINTS = 3  # of a spectrum that enters fits, or wide bands that it fills: temperature and scale make two
SCALE_ERROR = 0.10  # common error of all points, our choice for slit losses; `common.spectrum` sets it
UNEVEN = 2.0  # a point reaches no farther to one side than this times its reach to the other: holes stay holes
BROAD_RANGE_UM = (0.36, 22.0)  # where the dwarf sequence speaks
BROAD_LN = 0.18  # width of a wide band in ln wavelength: as wide as a filter, far wider than any feature
LEAST_IN_BROAD = 4  # points of a wide band; fewer say little of its mean


@dataclass(frozen=True, slots=True, eq=False)
class Points:
    """A spectrum as it enters fits: shape (N,) each, N at most MOST_POINTS."""

    bands: tuple[Band, ...]
    flux_jy: FloatArray
    error_jy: FloatArray


def is_point(band: str) -> bool:
    """Whether a band is a point of a spectrum.

    >>> is_point("spectrum:0.55"), is_point("Ks")
    (True, False)
    """
    return band.startswith(PREFIX)


def stretches(points: list[str], among: list[str]) -> list[str]:
    """Where some points of a spectrum lie, neighbours as one stretch, longest first.

    Args:
        points, among: names of points by wavelength; `among` all there are.

    >>> all_points = [f"spectrum:{wave}" for wave in (0.5, 0.6, 0.7, 0.8)]
    >>> stretches([all_points[0], all_points[1], all_points[3]], all_points)
    ['the spectrum at 0.5 to 0.6 micron', 'the spectrum at 0.8 micron']
    """
    place = [among.index(point) for point in points]
    runs: list[list[str]] = []
    for number, point in enumerate(points):
        if number and place[number] == place[number - 1] + 1:
            runs[-1].append(point)
        else:
            runs.append([point])
    ends = [[run[0].removeprefix(PREFIX), run[-1].removeprefix(PREFIX)] for run in sorted(runs, key=len, reverse=True)]
    return [f"the spectrum at {' to '.join(dict.fromkeys(pair))} micron" for pair in ends]


def grid_key(spectrum: Spectrum) -> str:
    """Name of a wavelength grid: spectra of one key share their narrow bands."""
    return digest(np.round(np.log(spectrum.wave_um), 9))[:16]


def thinned(spectrum: Spectrum) -> Spectrum:
    """The same, or averages of as many neighbours as make it short enough."""
    each = -(-spectrum.wave_um.size // MOST_POINTS)
    if each == 1:
        return spectrum
    first = np.arange(0, spectrum.wave_um.size, each)
    count = np.diff(np.append(first, spectrum.wave_um.size))
    wave, flux, square = (
        np.add.reduceat(column, first) / count for column in (spectrum.wave_um, spectrum.flux_jy, spectrum.error_jy**2)
    )
    return Spectrum(wave, flux, np.sqrt(square / count))


def point_edges(wave_um: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Both ends of each point's band: the midpoints to its neighbours, shape (N,) each.

    >>> [ends.tolist() for ends in point_edges(np.array([1.0, 2.0, 3.0, 9.0]))]
    [[0.5, 1.5, 2.5, 6.0], [1.5, 2.5, 4.0, 12.0]]
    """
    if wave_um.size < 2:
        return wave_um, wave_um
    half = np.diff(wave_um) / 2
    left, right = np.concatenate([half[:1], half]), np.concatenate([half, half[-1:]])
    return wave_um - np.minimum(left, UNEVEN * right), wave_um + np.minimum(right, UNEVEN * left)


def points_of(spectrum: Spectrum, floor: float = POINT_FLOOR) -> Points:
    """A spectrum's points, each a top-hat between the midpoints to its neighbours."""
    short = thinned(spectrum)
    ends = zip(point_names(short.wave_um), *point_edges(short.wave_um), short.wave_um, strict=True)
    bands = tuple(top_hat(name, low, high, floor, wave) for name, low, high, wave in ends)
    return Points(bands, short.flux_jy, short.error_jy)


def point_names(wave_um: FloatArray) -> list[str]:
    """A band's name for each point, with as many digits as tell them apart.

    >>> point_names(np.array([0.5, 0.55]))
    ['spectrum:0.5', 'spectrum:0.55']
    """
    for digits in range(4, 17):
        names = [f"{PREFIX}{wave:.{digits}g}" for wave in wave_um]
        if len(set(names)) == len(names):
            break
    return names


def top_hat(name: str, low_um: float, high_um: float, floor: float, pivot_um: float | None = None) -> Band:
    """A band that passes photons of all wavelengths between two."""
    ends = np.array([low_um, high_um]) if high_um > low_um else np.array([low_um])
    pivot = float(np.sqrt(low_um * high_um)) if pivot_um is None else float(pivot_um)
    return Band(name, pivot, "AB", AB_ZERO_JY, floor, INSTRUMENT, ends, np.ones(ends.size))


def broad_bands(floor: float = POINT_FLOOR) -> tuple[Band, ...]:
    """Wide bands side by side through BROAD_RANGE_UM."""
    low, high = np.log(BROAD_RANGE_UM)
    edges = np.exp(np.linspace(low, high, int((high - low) / BROAD_LN) + 1))
    return tuple(
        top_hat(f"broad:{(a * b) ** 0.5:.3g}", a, b, floor) for a, b in zip(edges[:-1], edges[1:], strict=True)
    )


def broad_means(spectrum: Spectrum, bands: Iterable[Band]) -> tuple[FloatArray, FloatArray]:
    """Band averages of a spectrum and their errors, Jy; NaN where it does not fill the band.

    The spectrum is linear between its points; a hole wider than half of the band is not filled in.
    """
    return tuple(np.array(column) for column in zip(*(broad_mean(spectrum, band) for band in bands), strict=True))


def broad_mean(spectrum: Spectrum, band: Band) -> tuple[float, float]:
    """One band of `broad_means`."""
    rule, wave = quadrature(band), spectrum.wave_um
    low, high = rule.wave_um[0], rule.wave_um[-1]
    inside = np.flatnonzero((wave > low) & (wave < high))
    if inside.size < LEAST_IN_BROAD or wave[0] > low or wave[-1] < high:
        return float("nan"), float("nan")
    if np.diff(wave[inside[0] - 1 : inside[-1] + 2]).max() > (high - low) / 2:
        return float("nan"), float("nan")
    right = np.clip(np.searchsorted(wave, rule.wave_um), 1, wave.size - 1)
    share = (rule.wave_um - wave[right - 1]) / (wave[right] - wave[right - 1])
    weight = np.zeros(wave.size)
    np.add.at(weight, right - 1, rule.weight * (1 - share))
    np.add.at(weight, right, rule.weight * share)
    return float(weight @ spectrum.flux_jy), float(np.sqrt((weight**2) @ (spectrum.error_jy**2)))


@dataclass(frozen=True, slots=True)
class Shape:
    """How well a star of some temperature, at any scale, makes a spectrum."""

    chi2: float
    dof: int
    teff_k: float


def shape_fit(
    flux: FloatArray, error: FloatArray, ln_star: FloatArray, spread: FloatArray, teff_k: FloatArray
) -> Shape:
    """The best of some stars at any scale; errors follow the larger of flux and model.

    Args:
        flux, error: shape (B,), Jy.
        ln_star: shape (T, B), ln of the stars' fluxes at any scale.
        spread: shape (T, B), fraction: the spread of real stars and the calibration, added in squares.
        teff_k: shape (T,).
    """
    star = np.exp(ln_star - ln_star.max(axis=1, keepdims=True))
    model = np.broadcast_to(np.maximum(flux, 0.0), star.shape)
    for _ in range(3):
        weight = 1.0 / (error**2 + (spread * np.maximum(model, flux)) ** 2)
        scale = np.maximum((weight * star * flux).sum(axis=1), 0.0) / (weight * star**2).sum(axis=1)
        model = scale[:, None] * star
    chi2 = (weight * (flux - model) ** 2).sum(axis=1)
    best = int(np.argmin(chi2))
    return Shape(float(chi2[best]), max(flux.size - 2, 1), float(teff_k[best]))
