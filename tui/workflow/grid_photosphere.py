"""A photosphere source made of the user's spectra, carried in the queue by its content."""

from __future__ import annotations

import sqlite3
import zlib
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from tui.errors import SettingError, StoreError, TableError
from tui.model import Band, FloatArray
from tui.store.sides import attach, attachment
from tui.workflow.grid_file import DamagedError, pack, unpack
from tui.workflow.grid_spectra import SurfaceSpectrum, read_spectra

if TYPE_CHECKING:
    from tui.physics.photosphere import Photosphere

GRID_KIND = "grid"  # of the attachments that carry spectra
PREFIX = "grid:"  # of the setting's value, before the digest of the spectra
NODES = 4000  # of a band's quadrature: lines of a spectrum are narrower than a band
WIDEST_STEP = 0.2  # of ln T between neighbouring spectra, our choice: 5000 to 6000 K is 0.18
MOST_BYTES = 200_000_000  # of spectra taken out of a queue


def keep_grid(connection: sqlite3.Connection, folder: str) -> str:
    """Carry the spectra of a folder in the queue; the value that the setting `photosphere` then takes.

    Raises:
        TableError: the folder or a spectrum cannot be used, or there is a gap in temperature.
    """
    spectra = read_spectra(folder)
    refuse_gaps(folder, [one.teff_k for one in spectra])
    content = zlib.compress(pack(tuple(spectra)), 6)
    return PREFIX + attach(connection, GRID_KIND, Path(folder).name or "grid", content)


def refuse_gaps(folder: str, teff_k: Sequence[float]) -> None:
    """TableError where neighbouring spectra lie too far apart to be interpolated."""
    for low, high in zip(teff_k, teff_k[1:], strict=False):
        if np.log(high / low) > WIDEST_STEP:
            raise TableError(folder, f"there is a gap between {low:g} and {high:g} K; add a spectrum between them.")


def kept_spectra(connection: sqlite3.Connection, setting: str) -> tuple[SurfaceSpectrum, ...]:
    """The spectra that a value of the setting names.

    Raises:
        SettingError: the value does not name spectra by their digest.
        StoreError: the queue does not hold them, or they are damaged.
    """
    if not setting.startswith(PREFIX):
        raise SettingError("photosphere", f"{setting!r} names no spectra in this queue; set it anew with grid DIR.")
    raw = zlib.decompressobj().decompress(attachment(connection, setting.removeprefix(PREFIX)).content, MOST_BYTES)
    try:
        return unpack(raw, {SurfaceSpectrum.__name__: SurfaceSpectrum})
    except DamagedError as error:
        raise StoreError(f"The spectra of the photosphere grid in this queue are damaged ({error}).") from error


def grid_photosphere(source: str, spectra: Sequence[SurfaceSpectrum], bands: Sequence[Band]) -> Photosphere:
    """The spectra through `bands`, on an even grid of ln T between the coolest and the hottest.

    In each band ln F minus its Planck value is interpolated, monotone, through the spectra; a band that one of them
    does not reach is NaN at every temperature.
    """
    from scipy.interpolate import PchipInterpolator

    from tui.physics.photometry import quadrature
    from tui.physics.photosphere import Photosphere, ln_planck_bands
    from tui.physics.templates import STAR_STEP, even_grid

    rules = [quadrature(band) for band in bands]
    x = np.log([one.teff_k for one in spectra])
    at = even_grid(x[0], x[-1], STAR_STEP)
    measured = np.array([[ln_band_flux(one, band) for band in bands] for one in spectra])
    remainder = measured - ln_planck_bands(np.exp(x), rules)
    table = ln_planck_bands(np.exp(at), rules)
    for column in range(len(bands)):
        known = np.isfinite(remainder[:, column]).all()
        table[:, column] += PchipInterpolator(x, remainder[:, column])(at) if known else np.nan
    return Photosphere(source, np.exp(at), table, (True,) * len(bands), np.full(at.shape, np.nan))


def ln_band_flux(one: SurfaceSpectrum, band: Band) -> float:
    """ln of a spectrum's flux density in a band, Jy; NaN where it does not reach the whole band or is dark there."""
    from tui.physics.photometry import quadrature

    rule = quadrature(band, NODES)
    if one.wave_um[0] > rule.wave_um[0] or one.wave_um[-1] < rule.wave_um[-1]:
        return float("nan")
    flux: FloatArray = np.interp(rule.wave_um, one.wave_um, one.flux_jy)
    total = float(np.sum(rule.weight * flux))
    return float(np.log(total)) if total > 0 else float("nan")
