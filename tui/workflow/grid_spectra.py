"""The user's spectra, of photospheres or other sources: a folder of FITS, ECSV or two-column files, one spectrum each.

A file gives the units of wavelength and flux (per wavelength or per frequency) in its columns or header. A photosphere's
says its effective temperature in its header or its name (see `grid_names`) and gives the flux at the star's surface, or
`scale`: what its numbers are to be multiplied by to become that.
"""

from __future__ import annotations

import re
import warnings
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any, TypeVar

import numpy as np

from tui.errors import TableError
from tui.model import FloatArray
from tui.physics.grid import SurfaceSpectrum
from tui.physics.planck import surface_flux
from tui.workflow.grid_choice import GivenSpectrum
from tui.workflow.grid_names import atmosphere

ENDINGS = (".fits", ".fit", ".ecsv", ".txt", ".dat", ".csv")
TEFF_RANGE_K = (500.0, 200_000.0)
TOLD_IN_TEXT = re.compile(r"^#\s*([\w/\[\]. ]+?)\s*[:=]\s*(.+?)\s*$")
UNITS = ("wavelength", "flux")
LEAST_POINTS = 10
MOST_POINTS = 4_000_000  # of all spectra together
LIGHT_RANGE = (0.2, 1.2)  # a spectrum's integral over sigma T^4: less, it is cut short; more, it is no surface flux
HOLE, HOLE_LN = 10.0, 0.01  # a step this many times both of its neighbours', and wider than this in ln wavelength
SPEED_OF_LIGHT = 299_792_458.0  # m/s


Shape = tuple[Path, FloatArray, FloatArray]  # file, wavelength in micron, flux density in Jy
Made = TypeVar("Made")
Maker = Callable[[Path, Mapping[str, Any], Any, Any], Made]  # of file, header, wavelengths and fluxes with units


def read_spectra(folder: str) -> list[GivenSpectrum]:
    """All photospheres of a folder, in order of file name.

    Raises:
        TableError: no such folder; a file without temperature, unit or sense; far too many points.
    """
    return read_folder(folder, given_spectrum, lambda one: one.spectrum.wave_um.size)


def read_shapes(folder: str) -> list[Shape]:
    """All spectra of a folder, of any source at any scale, in order of file name.

    Raises:
        TableError: no such folder; a file without unit or light, or with gaps; far too many points.
    """
    return read_folder(folder, given_shape, lambda one: one[1].size)


def read_folder(folder: str, made: Maker[Made], points: Callable[[Made], int]) -> list[Made]:
    """What is made of each file of a folder, in order of file name. TableError as `read_spectra` says."""
    place = Path(folder).expanduser()
    if not place.is_dir():
        raise TableError(folder, "there is no such folder of spectra.")
    found: list[Made] = []
    for path in sorted(path for path in place.iterdir() if path.suffix.lower() in ENDINGS):
        found.append(read_file(path, made))
        if sum(map(points, found)) > MOST_POINTS:
            raise TableError(folder, f"the spectra hold more than {MOST_POINTS} points; bin them to bands' needs.")
    if not found:
        raise TableError(folder, f"there is no spectrum in it (a file that ends in {' '.join(ENDINGS)}).")
    return found


def read_file(path: Path, made: Maker[Made]) -> Made:
    """What is made of one file. TableError, naming it, where it cannot be used."""
    reader: Callable[[Path], tuple[Mapping[str, Any], Any, Any]] = read_table if is_table(path) else read_text
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            header, wave, flux = reader(path)
            return made(path, header, wave, flux)
    except TableError:
        raise
    except (OSError, ValueError, TypeError, KeyError, IndexError, MemoryError, OverflowError) as error:
        raise TableError(str(path), f"the spectrum cannot be read ({str(error)[:120]}).") from error


def is_table(path: Path) -> bool:
    """Whether a file is FITS or ECSV, whose columns carry their units."""
    return path.suffix.lower() in (".fits", ".fit", ".ecsv")


def read_table(path: Path) -> tuple[Mapping[str, Any], Any, Any]:
    """Header, wavelengths and fluxes, with units, of the first two columns of a FITS or ECSV table, or of an image."""
    from astropy.io import fits
    from astropy.table import Table

    header: dict[str, Any] = {}
    if path.suffix.lower() != ".ecsv":
        with fits.open(path) as hdus:
            header = {name.lower(): value for name, value in hdus[0].header.items() if name}
            if not any(isinstance(hdu, fits.BinTableHDU | fits.TableHDU) for hdu in hdus):
                return header, *read_image(path, hdus[0])
    table = Table.read(path, format="ascii.ecsv" if path.suffix.lower() == ".ecsv" else "fits")
    header |= {str(name).lower(): value for name, value in table.meta.items()}
    wave, flux = (table[name] for name in table.colnames[:2])
    if wave.unit is None or flux.unit is None:
        raise TableError(str(path), "a column has no unit: wavelength and surface flux need one each.")
    return header, wave.quantity, flux.quantity


def read_image(path: Path, hdu: Any) -> tuple[Any, Any]:
    """Wavelengths and fluxes, with units, of a FITS image of one axis, whose header tells CRVAL1, CDELT1 and units."""
    from astropy import units

    head = hdu.header
    lacking = [name for name in ("CRVAL1", "CDELT1", "CUNIT1", "BUNIT") if name not in head]
    if hdu.data is None or np.ndim(hdu.data) != 1 or lacking:
        why = f"its header lacks {lacking[0]}" if lacking else "it is no image of one axis"
        raise TableError(str(path), f"there is no table in it, and {why}: give a table of wavelength and flux.")
    pixel = np.arange(hdu.data.size) + 1.0 - float(head.get("CRPIX1", 1.0))
    wave = float(head["CRVAL1"]) + float(head["CDELT1"]) * pixel
    return wave * units.Unit(head["CUNIT1"]), np.asarray(hdu.data, dtype=np.float64) * units.Unit(head["BUNIT"])


def read_text(path: Path) -> tuple[Mapping[str, Any], Any, Any]:
    """The same of a text of two columns, whose lines `# wavelength: Angstrom` and `# flux: UNIT` say the units."""
    from astropy import units

    header: dict[str, str] = {}
    with path.open(encoding="utf-8", errors="replace") as stream:
        for line in stream:
            if not line.startswith("#"):
                break
            if told := TOLD_IN_TEXT.match(line[:500]):
                header[told[1].lower()] = told[2]
    for name in UNITS:
        if name not in header:
            raise TableError(str(path), f"no line says '# {name}: UNIT' at the top; both units are needed.")
    delimiter = "," if path.suffix.lower() == ".csv" else None
    columns = np.loadtxt(path, comments="#", delimiter=delimiter, usecols=(0, 1), unpack=True, ndmin=2)
    return header, columns[0] * units.Unit(header["wavelength"]), columns[1] * units.Unit(header["flux"])


def given_spectrum(path: Path, header: Mapping[str, Any], wave: Any, flux: Any) -> GivenSpectrum:
    """A spectrum in micron and Jy, checked to be the flux at a surface of its temperature."""
    told = atmosphere(path.stem, header)
    if told.teff_k is None or not TEFF_RANGE_K[0] <= told.teff_k <= TEFF_RANGE_K[1]:
        raise TableError(str(path), "no temperature: put teff (K) in the header or four to six digits in the name.")
    wave_um, flux_jy = in_order(path, *in_own_units(path, wave, flux * told.scale))
    share = light(wave_um, flux_jy) / float(surface_flux(told.teff_k))
    if not LIGHT_RANGE[0] <= share <= LIGHT_RANGE[1]:
        raise TableError(
            str(path),
            f"its light is {share:.3g} of a {told.teff_k:g} K surface's: give the surface flux over most of the light, "
            "or in the header the scale that makes it so.",
        )
    return GivenSpectrum(path, SurfaceSpectrum(told.teff_k, wave_um, flux_jy), told.logg, told.mh)


def given_shape(path: Path, header: Mapping[str, Any], wave: Any, flux: Any) -> Shape:
    """Wavelengths and fluxes in micron and Jy; what else the header tells does not matter."""
    wave_um, flux_jy = in_order(path, *in_own_units(path, wave, flux))
    if not flux_jy.any():
        raise TableError(str(path), "it has no light at any wavelength.")
    return path, wave_um, flux_jy


def in_own_units(path: Path, wave: Any, flux: Any) -> tuple[FloatArray, FloatArray]:
    """Wavelengths in micron and fluxes in Jy. TableError where the units are of neither."""
    from astropy import units

    try:
        wave_um = np.asarray(wave.to_value(units.um), dtype=np.float64)
    except units.UnitsError as error:
        raise TableError(str(path), f"the unit {wave.unit} is no wavelength.") from error
    try:
        flux_jy = flux.to_value(units.Jy, equivalencies=units.spectral_density(wave))
    except units.UnitsError as error:
        raise TableError(str(path), f"the unit {flux.unit} is no flux density.") from error
    return wave_um, np.asarray(flux_jy, dtype=np.float64)


def in_order(path: Path, wave_um: FloatArray, flux_jy: FloatArray) -> tuple[FloatArray, FloatArray]:
    """By wavelength. TableError where values or wavelengths are missing in between."""
    order = np.argsort(wave_um, kind="stable")
    wave_um, flux_jy = wave_um[order], flux_jy[order]
    fault = ~np.isfinite(flux_jy) | ~np.isfinite(wave_um) | (flux_jy < 0) | (wave_um <= 0)
    if fault.any():
        raise TableError(str(path), f"it has no flux, or a negative one, at {wave_um[fault][0]:.6g} micron.")
    if wave_um.size < LEAST_POINTS or not np.all(np.diff(wave_um) > 0):
        raise TableError(str(path), f"a spectrum needs {LEAST_POINTS} wavelengths or more, none of them twice.")
    step = np.diff(np.log(wave_um))
    hole = (step[1:-1] > HOLE * np.maximum(step[:-2], step[2:])) & (step[1:-1] > HOLE_LN)
    if hole.any():
        first = int(np.flatnonzero(hole)[0]) + 1
        raise TableError(str(path), f"there is a gap between {wave_um[first]:.6g} and {wave_um[first + 1]:.6g} micron.")
    return wave_um, flux_jy


def light(wave_um: FloatArray, flux_jy: FloatArray) -> float:
    """Integral of F_nu over frequency, W m-2, of a spectrum linear in frequency between its points."""
    frequency = SPEED_OF_LIGHT / (wave_um * 1e-6)  # Hz
    return float(np.trapezoid(flux_jy[::-1] * 1e-26, frequency[::-1]))
