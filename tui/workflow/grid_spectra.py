"""The user's photosphere spectra: a folder of FITS, ECSV or two-column files, one spectrum a temperature.

A file says its effective temperature in its header (`teff`) or its name (`t05772.dat`), its wavelengths' and fluxes'
units in its columns or header, and gives the flux at the star's surface, so that theta keeps its meaning.
"""

from __future__ import annotations

import re
import warnings
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from tui.errors import TableError
from tui.model import FloatArray

ENDINGS = (".fits", ".fit", ".ecsv", ".txt", ".dat", ".csv")
TEFF_NAMES = ("teff", "t_eff", "phxteff")
TEFF_IN_NAME = re.compile(r"(?<![0-9.])([0-9]{4,6})(?![0-9.])")
TEFF_RANGE_K = (500.0, 200_000.0)
UNIT_IN_TEXT = re.compile(r"^#\s*(teff|wavelength|flux)\s*[:=]\s*(.+?)\s*$", re.IGNORECASE)
LEAST_SPECTRA = 3
MOST_POINTS = 2_000_000  # of all spectra together
LIGHT_RANGE = (0.2, 1.2)  # a spectrum's integral over sigma T^4: less, it is cut short; more, it is no surface flux


@dataclass(frozen=True, slots=True, eq=False)
class SurfaceSpectrum:
    """One photosphere: shape (N,) each, wavelength in micron increasing, surface flux density in Jy at theta = 1."""

    teff_k: float
    wave_um: FloatArray
    flux_jy: FloatArray


def read_spectra(folder: str) -> list[SurfaceSpectrum]:
    """All spectra of a folder, coolest first.

    Raises:
        TableError: no folder; too few spectra; a file without temperature, unit or sense; two of one temperature.
    """
    place = Path(folder).expanduser()
    if not place.is_dir():
        raise TableError(folder, "there is no such folder of spectra.")
    paths = sorted(path for path in place.iterdir() if path.suffix.lower() in ENDINGS)
    found: dict[float, tuple[Path, SurfaceSpectrum]] = {}
    points = 0
    for path in paths:
        one = read_spectrum(path)
        points += one.wave_um.size
        if points > MOST_POINTS:
            raise TableError(folder, f"the spectra hold more than {MOST_POINTS} points; bin them to bands' needs.")
        if one.teff_k in found:
            other = found[one.teff_k][0].name
            raise TableError(str(path), f"{other} has {one.teff_k:g} K too; keep one log g and [M/H] in a folder.")
        found[one.teff_k] = (path, one)
    if len(found) < LEAST_SPECTRA:
        raise TableError(folder, f"there are {len(found)} spectra ({' '.join(ENDINGS)}); a grid needs {LEAST_SPECTRA}.")
    return [found[teff][1] for teff in sorted(found)]


def read_spectrum(path: Path) -> SurfaceSpectrum:
    """One file. TableError, naming it, where it cannot be used."""
    reader: Callable[[Path], tuple[Mapping[str, Any], Any, Any]] = read_table if is_table(path) else read_text
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            header, wave, flux = reader(path)
            return surface_spectrum(path, header, wave, flux)
    except TableError:
        raise
    except (OSError, ValueError, TypeError, KeyError, IndexError, MemoryError) as error:
        raise TableError(str(path), f"the spectrum cannot be read ({str(error)[:120]}).") from error


def is_table(path: Path) -> bool:
    """Whether a file is FITS or ECSV, whose columns carry their units."""
    return path.suffix.lower() in (".fits", ".fit", ".ecsv")


def read_table(path: Path) -> tuple[Mapping[str, Any], Any, Any]:
    """Header, wavelengths and fluxes, with units, of the first two columns of a FITS or ECSV table."""
    from astropy.table import Table

    form = "ascii.ecsv" if path.suffix.lower() == ".ecsv" else "fits"
    table = Table.read(path, format=form)
    header = {str(name).lower(): value for name, value in table.meta.items()}
    if form == "fits":
        from astropy.io import fits

        header = {name.lower(): value for name, value in fits.getheader(path).items()} | header
    wave, flux = (table[name] for name in table.colnames[:2])
    if wave.unit is None or flux.unit is None:
        raise TableError(str(path), "a column has no unit: wavelength and surface flux need one each.")
    return header, wave.quantity, flux.quantity


def read_text(path: Path) -> tuple[Mapping[str, Any], Any, Any]:
    """The same of a text of two columns, whose lines `# wavelength: Angstrom` and `# flux: UNIT` say the units."""
    from astropy import units

    header: dict[str, str] = {}
    with path.open(encoding="utf-8", errors="replace") as stream:
        for line in stream:
            if not line.startswith("#"):
                break
            if told := UNIT_IN_TEXT.match(line):
                header[told[1].lower()] = told[2]
    for name in ("wavelength", "flux"):
        if name not in header:
            raise TableError(str(path), f"no line says '# {name}: UNIT' at the top; both units are needed.")
    delimiter = "," if path.suffix.lower() == ".csv" else None
    columns = np.loadtxt(path, comments="#", delimiter=delimiter, usecols=(0, 1), unpack=True, ndmin=2)
    return header, columns[0] * units.Unit(header["wavelength"]), columns[1] * units.Unit(header["flux"])


def surface_spectrum(path: Path, header: Mapping[str, Any], wave: Any, flux: Any) -> SurfaceSpectrum:
    """A spectrum in micron and Jy, checked to be the flux at a surface of its temperature."""
    from astropy import units

    from tui.physics.planck import surface_flux

    wave_um = np.asarray(wave.to_value(units.um), dtype=np.float64)
    try:
        flux_jy = np.asarray(flux.to_value(units.Jy, equivalencies=units.spectral_density(wave)), dtype=np.float64)
    except units.UnitsError as error:
        raise TableError(str(path), f"the unit {flux.unit} is no flux density.") from error
    order = np.argsort(wave_um)
    wave_um, flux_jy = wave_um[order], flux_jy[order]
    if wave_um.size < 10 or not np.all(np.diff(wave_um) > 0) or not np.isfinite(flux_jy).all() or (flux_jy < 0).any():
        raise TableError(str(path), "a spectrum needs ten or more different wavelengths and no gap or negative flux.")
    teff_k = temperature(path, header)
    share = light(wave_um, flux_jy) / float(surface_flux(teff_k))
    if not LIGHT_RANGE[0] <= share <= LIGHT_RANGE[1]:
        raise TableError(
            str(path),
            f"its light is {share:.3g} of a {teff_k:g} K surface's: give the surface flux, over most of the light.",
        )
    return SurfaceSpectrum(teff_k, wave_um, flux_jy)


def temperature(path: Path, header: Mapping[str, Any]) -> float:
    """Effective temperature from the header, else from the file's name. TableError where neither says it."""
    named = next((header[name] for name in TEFF_NAMES if name in header), None)
    told = named if named is not None else next(iter(TEFF_IN_NAME.findall(path.stem)), None)
    try:
        teff_k = float(str(told).split()[0])
    except (ValueError, IndexError):
        teff_k = float("nan")
    if not TEFF_RANGE_K[0] <= teff_k <= TEFF_RANGE_K[1]:
        raise TableError(str(path), "no temperature: put teff (K) in the header or four to six digits in the name.")
    return teff_k


def light(wave_um: FloatArray, flux_jy: FloatArray) -> float:
    """Integral of F_nu over frequency, W m-2, of a spectrum linear in frequency between its points."""
    frequency = 299_792_458.0 / (wave_um * 1e-6)  # Hz
    return float(np.trapezoid(flux_jy[::-1] * 1e-26, frequency[::-1]))
