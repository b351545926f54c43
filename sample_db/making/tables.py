"""The tables of the survey, written as one would get them: several formats, gaps, sentinels."""

from __future__ import annotations

import csv
from collections.abc import Iterable, Mapping, Sequence
from pathlib import Path
from typing import Any

import numpy as np
from astropy.table import Table
from making.archives import (
    ARCHIVE_TABLE,
    CURVES,
    GLIMPSE_TABLE,
    LAYOUTS,
    WINDOWS,
    archive_rows,
    curve_rows,
    head_of,
    window_rows,
)
from making.catalogues import Observer
from making.pictures import picture
from making.sky import extinction, magnitude
from making.star import Star

SDSS_BANDS = ("SDSS_u", "SDSS_g", "SDSS_r", "SDSS_i", "SDSS_z")
SDSS_SOFTENING = (1.4e-10, 0.9e-10, 1.2e-10, 1.8e-10, 7.4e-10)  # Lupton, Gunn & Szalay 1999
DIP_BANDS = ("B", "V", "Rc", "Ic", "J")
LATER_BANDS = ("IRAC1", "IRAC2", "IRAC3", "IRAC4", "MIPS24")
EPOCHS_MJD = (56800.0, 57500.0, 58250.0)
SPECTRUM_UM = np.geomspace(0.42, 2.3, 36)
NATIVE_FACTS = (
    "av_max",
    "age_myr",
    "sp_type",
    "otype",
    "density_galaxy",
    "density_galaxy_band",
    "density_galaxy_mag",
    "density_galaxy_slope",
)
UNITS = {
    "ra": "deg",
    "dec": "deg",
    "ra_error": "mas",
    "dec_error": "mas",
    "parallax": "mas",
    "parallax_error": "mas",
    "pmra": "mas / yr",
    "pmdec": "mas / yr",
    "pmra_error": "mas / yr",
    "pmdec_error": "mas / yr",
    "teff_gspphot": "K",
    "err_maj": "arcsec",
    "sigra": "arcsec",
    "sigdec": "arcsec",
    "av_max": "mag",
    "age_myr": "Myr",
    "ref_epoch": "yr",
}
SHARED = ("designation", "ra", "dec", "ph_qual")


def name_of(number: int) -> str:
    """`SM-0001` ..."""
    return f"SM-{number:04d}"


def crossmatch(stars: Sequence[Star], observer: Observer) -> Table:
    """Gaia DR3, 2MASS and AllWISE, one row a candidate; columns that two of them share carry _2 and _3."""
    rows = []
    for number, star in enumerate(stars, 1):
        observer.turn_to(star, 0)
        gaia = observer.gaia(star, number)
        others = (observer.twomass(star, gaia), observer.wise(star, gaia))
        row: dict[str, Any] = {"name": name_of(number), **gaia}
        for suffix, found in enumerate(others, 2):
            row |= {f"{key}_{suffix}" if key in SHARED else key: value for key, value in found.items()}
        rows.append(row)
    if any(star.absent for star in stars):
        rows = [without(row, star) for row, star in zip(rows, stars, strict=True)]
    return table_of(rows)


def without(row: dict[str, Any], star: Star) -> dict[str, Any]:
    """A row of a star that some catalogue has not seen at all: that catalogue's columns are empty."""
    for wanted, keep in (
        ({"J", "H", "Ks"}, TWOMASS_COLUMNS),
        ({"W1", "W2", "W3", "W4"}, WISE_COLUMNS),
        ({"Gaia_G"}, GAIA_COLUMNS),
    ):
        if wanted <= set(star.absent):
            row = {key: None if key in keep else value for key, value in row.items()}
    return row


TWOMASS_COLUMNS = (
    "ra_2",
    "dec_2",
    "err_maj",
    "jdate",
    "gal_contam",
    "mp_flg",
    "prox",
    "cc_flg",
    "bl_flg",
    "rd_flg",
    "ph_qual_2",
)
WISE_COLUMNS = (
    "ra_3",
    "dec_3",
    "sigra",
    "sigdec",
    "nb",
    "na",
    "cc_flags",
    "ext_flg",
    "var_flg",
    "moon_lev",
    "w1mjdmean",
    "ph_qual_3",
)
GAIA_COLUMNS = (
    "source_id",
    "ruwe",
    "ipd_frac_multi_peak",
    "ipd_gof_harmonic_amplitude",
    "duplicated_source",
    "non_single_star",
    "phot_variable_flag",
    "phot_proc_mode",
    "phot_g_n_obs",
    "phot_bp_n_obs",
    "phot_rp_n_obs",
    "phot_bp_n_blended_transits",
    "phot_rp_n_blended_transits",
    "phot_bp_n_contaminated_transits",
    "phot_rp_n_contaminated_transits",
    "teff_gspphot",
    "logg_gspphot",
)


def table_of(rows: Sequence[Mapping[str, Any]]) -> Table:
    """Rows as a masked astropy table with units."""
    names = list(dict.fromkeys(key for row in rows for key in row))
    table = Table(masked=True)
    for name in names:
        cells = [row.get(name) for row in rows]
        mask = [cell is None for cell in cells]
        known = next(cell for cell in cells if cell is not None)
        empty = "" if isinstance(known, str) else type(known)(0)
        table[name] = np.ma.array([empty if cell is None else cell for cell in cells], mask=mask)
        unit = UNITS.get(name.removesuffix("_2").removesuffix("_3"))
        if unit:
            table[name].unit = unit
    return table


def facts_table(stars: Sequence[Star]) -> Table:
    """What the survey knows besides: line of sight, age, class, counts of galaxies around."""
    rows = [
        {"name": name_of(number)} | {key: star.facts[key] for key in NATIVE_FACTS if key in star.facts}
        for number, star in enumerate(stars, 1)
        if set(star.facts) & set(NATIVE_FACTS)
    ]
    return table_of(rows)


def sdss_rows(stars: Sequence[Star], observer: Observer) -> Iterable[dict[str, Any]]:
    """SDSS PSF magnitudes (asinh); -9999 where a band was not measured."""
    for number, star in enumerate(stars, 1):
        if not star.sdss:
            continue
        observer.turn_to(star, 1)
        row: dict[str, Any] = {"name": name_of(number)}
        for band, softening in zip(SDSS_BANDS, SDSS_SOFTENING, strict=True):
            flux, error = observer.seen(star, band)
            zero = observer.sky.bands[band].zero_point_jy
            ratio = flux / zero / (2 * softening)
            mag = -2.5 / np.log(10) * (np.arcsinh(ratio) + np.log(softening))
            sigma = 2.5 / np.log(10) * error / zero / np.hypot(flux / zero, 2 * softening)
            missing = number % 7 == 0 and band == "SDSS_u"
            row |= {
                f"psfMag_{band[-1]}": -9999.0 if missing else round(float(mag), 4),
                f"psfMagErr_{band[-1]}": -9999.0 if missing else round(float(sigma), 4),
            }
        yield row | {"type": 6, "clean": 1, "flags_g": 0} | dict(star.sdss_odd)


def long_rows(stars: Sequence[Star], observer: Observer) -> Iterable[list[Any]]:
    """Further bands and epochs, a row a measurement."""
    for number, star in enumerate(stars, 1):
        observer.turn_to(star, 2)
        for band in star.further:
            yield measured(observer, star, number, band)
        for band, offsets in star.epochs.items():
            quiet = observer.sky.flux(star, band)
            for mjd, offset in zip(EPOCHS_MJD, offsets, strict=True):
                flux = quiet * 10 ** (-0.4 * offset) * (1 + 0.012 * observer.rng.standard_normal())
                mag = magnitude(flux, observer.sky.bands[band])
                yield [name_of(number), band, round(mag, 3), 0.013, "mag", "", "", "NEOWISE", f"MJD {mjd:.0f}"]


def measured(observer: Observer, star: Star, number: int, band: str) -> list[Any]:
    """One row of the long table: mJy, or magnitudes for what is measured so; a 3 sigma limit where nothing was seen."""
    flux, error = observer.seen(star, band)
    source = {
        "IRAC": "Spitzer",
        "MIPS": "Spitzer",
        "AKARI": "AKARI",
        "PACS": "Herschel",
        "Johnson": "Saltmarsh 0.6 m",
        "GALEX": "GALEX",
    }
    row = observer.sky.bands[band]
    label = source[row.instrument]
    if row.instrument == "Johnson":
        return [
            name_of(number),
            band,
            round(magnitude(flux, row), 3),
            round(1.0857 * error / flux, 3),
            "mag",
            "",
            "",
            label,
            "2014-06-11",
        ]
    if flux < 3 * error:
        return [name_of(number), band, round(1e3 * (max(flux, 0) + 3 * error), 5), "", "mJy", "true", 3, label, ""]
    return [name_of(number), band, round(1e3 * flux, 5), round(1e3 * error, 5), "mJy", "", "", label, ""]


def later_rows(stars: Sequence[Star], observer: Observer) -> Iterable[list[Any]]:
    """Spitzer's photometry of a few stars, which arrived after the first rulings."""
    for number, star in enumerate(stars, 1):
        if star.later:
            observer.turn_to(star, 3)
            for band in LATER_BANDS:
                yield measured(observer, star, number, band)


def dip_rows(stars: Sequence[Star], observer: Observer, pivots: Mapping[str, float]) -> Iterable[list[Any]]:
    """Depths of dimming events, a row a band."""
    wave = np.array([pivots[band] for band in DIP_BANDS])
    for number, star in enumerate(stars, 1):
        kind, size = star.dip
        if not kind or star.curves:
            continue
        observer.turn_to(star, 4)
        depth = 1 - 10 ** (-0.4 * size * extinction(wave, 3.1)) if kind == "coloured" else np.full(wave.size, size)
        error = np.full(wave.size, 0.004)
        for band, value, sigma in zip(
            DIP_BANDS, depth + error * observer.rng.standard_normal(wave.size), error, strict=True
        ):
            yield [name_of(number), "2014 June", band, round(float(value), 4), sigma, "2014-06-11"]


def neighbour_table(stars: Sequence[Star], observer: Observer) -> Table:
    """Sources near some candidates."""
    rows = []
    for number, star in enumerate(stars, 1):
        for near in star.neighbours if star.neighbours_told else ():
            row: dict[str, Any] = {
                "name": name_of(number),
                "separation": round(near[0], 2),
                "position_angle": round(near[1], 1),
            }
            for band in ("Gaia_G", "J", "Ks", "W1", "W2", "W3", "W4"):
                row[f"{band}_mag"] = round(
                    magnitude(observer.neighbour_flux(star, near, band), observer.sky.bands[band]), 3
                )
            rows.append(row)
    table = table_of(rows)
    table["separation"].unit, table["position_angle"].unit = "arcsec", "deg"
    return table


def spectra_table(stars: Sequence[Star], observer: Observer) -> Table:
    """Low-resolution spectra, a row a point."""
    rows = []
    for number, star in enumerate(stars, 1):
        if star.spectrum:
            observer.turn_to(star, 5)
            flux = 1e3 * observer.sky.spectrum(star, SPECTRUM_UM)
            seen = flux * (1 + 0.02 * observer.rng.standard_normal(flux.size))
            rows += [
                {
                    "name": name_of(number),
                    "wavelength": round(float(w), 4),
                    "flux": float(f"{f:.5g}"),
                    "error": float(f"{0.02 * t:.4g}"),
                }
                for w, f, t in zip(SPECTRUM_UM, seen, flux, strict=True)
            ]
    table = table_of(rows)
    table["wavelength"].unit, table["flux"].unit, table["error"].unit = "um", "mJy", "mJy"
    return table


def write_csv(path: Path, head: Sequence[str], rows: Iterable[Sequence[Any]]) -> None:
    """A CSV file with Unix line ends."""
    with path.open("w", encoding="utf-8", newline="") as stream:
        writer = csv.writer(stream, lineterminator="\n")
        writer.writerow(head)
        writer.writerows(rows)


def write_all(folder: Path, stars: Sequence[Star], observer: Observer) -> None:
    """Every table and picture, in `folder`."""
    matched = crossmatch(stars, observer)
    matched.write(folder / "crossmatch.vot", format="votable", tabledata_format="binary2", overwrite=True)
    facts_table(stars).write(folder / "known.ecsv", overwrite=True)
    sdss = list(sdss_rows(stars, observer))
    write_csv(folder / "sdss.csv", list(sdss[0]), [list(row.values()) for row in sdss])
    head = ["name", "band", "value", "error", "unit", "limit", "nsigma", "source", "epoch"]
    write_csv(folder / "further_bands.csv", head, long_rows(stars, observer))
    write_csv(folder / "spitzer_later.csv", head, later_rows(stars, observer))
    pivots = {name: band.pivot_um for name, band in observer.sky.bands.items()}
    write_csv(
        folder / "dips.csv", ["name", "event", "band", "depth", "error", "epoch"], dip_rows(stars, observer, pivots)
    )
    write_csv(folder / CURVES, ["name", "band", "time", "flux", "error"], curve_rows(stars, observer, pivots))
    write_csv(folder / WINDOWS, ["name", "event", "start", "end"], window_rows(stars))
    others = tuple(name for name in LAYOUTS if name != "GLIMPSE")
    for file, names in ((ARCHIVE_TABLE, others), (GLIMPSE_TABLE, ("GLIMPSE",))):
        rows = archive_rows(stars, observer, names)
        head = head_of(rows)
        write_csv(folder / file, head, [[row.get(key, "") for key in head] for row in rows])
    neighbour_table(stars, observer).write(folder / "neighbours.ecsv", overwrite=True)
    spectra_table(stars, observer).write(folder / "spectra.fits", overwrite=True)
    pictures = folder / "cutouts"
    pictures.mkdir(exist_ok=True)
    for number, star in enumerate(stars, 1):
        observer.turn_to(star, 6)
        for band in star.pictures:
            where = (float(matched["ra"][number - 1]), float(matched["dec"][number - 1]))
            picture(star, band, observer, *where).writeto(pictures / f"{name_of(number)}_{band}.fits", overwrite=True)
    write_csv(
        folder / "truth.csv", ["name", "nature"], [[name_of(n), s.nature] for n, s in enumerate(stars, 1) if s.control]
    )
    key = [[name_of(n), s.nature, s.recipe, s.shows, "yes" if s.later else ""] for n, s in enumerate(stars, 1)]
    write_csv(folder / "key.csv", ["name", "nature", "recipe", "shows", "late"], key)
