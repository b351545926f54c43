"""Everything the fits read off: bands, photosphere, dust, compact and power-law sources, reddening, errors."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from fnmatch import fnmatchcase
from typing import TYPE_CHECKING

import numpy as np

from tui.errors import TemplateError
from tui.model import Band, FloatArray, digest
from tui.physics.extinction import R_V_RANGE, BandCurves
from tui.physics.photometry import Quadrature, quadrature
from tui.physics.photosphere import (
    PLANCK_RANGE_K,
    Photosphere,
    dwarf_photosphere,
    ln_planck_bands,
    planck_photosphere,
)
from tui.physics.reddening import Reddening, expand_reddening
from tui.physics.sources import SourceGrid, source_grid

if TYPE_CHECKING:
    from tui.physics.generators import Source

VERSION = 1  # raise when the same tables would give other grids
STAR_STEP = 0.01  # of ln T
DUST_RANGE_K = (20.0, 2000.0)
COMPACT_RANGE_K = (5000.0, 100000.0)
SLOPE_RANGE = (0.0, 4.0)  # F_nu ~ wavelength^slope: galaxies and nuclei redder than any star in the infrared
SLOPE_SPLIT_UM = 3.4  # the power law is 1 here


@dataclass(frozen=True, slots=True)
class Spread:
    """Spread of real stars about a photosphere source: fraction of the star's model flux."""

    photosphere: str
    bands: str  # "all", "native", "filled" or a pattern of band names
    low_k: float
    high_k: float
    short_um: float
    long_um: float
    fraction: float


@dataclass(frozen=True, slots=True, eq=False)
class Templates:
    """Grids for B bands in order of wavelength, one photosphere source and one extinction law."""

    bands: tuple[Band, ...]
    photosphere: str
    law: str
    star: SourceGrid
    dust: SourceGrid
    compact: SourceGrid
    power: SourceGrid
    star_reddening: Reddening
    dust_reddening: Reddening
    compact_reddening: Reddening
    other_law: str  # a law that differs most from `law` in the infrared, to see what rests on the choice
    other_reddening: Reddening  # of the star, by the other law
    spread: FloatArray  # shape (N, B), on the star's grid
    radius_m: FloatArray  # shape (N,), on the star's grid; NaN where the source gives no radius
    ln_ks: FloatArray  # shape (N,), ln of the star's flux at 2.16 micron, on the star's grid
    ln_infrared: FloatArray  # shape (N,), the same at 3.4 micron
    silent: tuple[str, ...]  # bands the photosphere source says nothing about
    digest: str = ""
    broad: Templates | None = None  # the same source in the wide bands that spectra are compared in
    points: str = ""  # wavelength grid of the spectra whose points are among the bands
    cone: Source | None = None  # where the mixture bound's columns are kept; None: they are built when asked for

    @property
    def names(self) -> tuple[str, ...]:
        """Band names, in order of wavelength."""
        return tuple(band.name for band in self.bands)

    @property
    def pivot_um(self) -> FloatArray:
        """Pivot wavelengths, shape (B,)."""
        return np.array([band.pivot_um for band in self.bands])

    @property
    def floor(self) -> FloatArray:
        """Calibration floors, fraction, shape (B,)."""
        return np.array([band.floor for band in self.bands])

    def take(self, names: Sequence[str]) -> Templates:
        """The same for some bands, in the order given; TemplateError names a band it lacks."""
        place = {name: index for index, name in enumerate(self.names)}
        missing = [name for name in names if name not in place]
        if missing:
            raise TemplateError(f"The template grids lack the band {missing[0]}; add it to the queue's bands.")
        columns = [place[name] for name in names]
        parts = ("star", "dust", "compact", "power", "star_reddening", "dust_reddening", "compact_reddening")
        parts = (*parts, "other_reddening")
        return replace(
            self,
            bands=tuple(self.bands[column] for column in columns),
            spread=np.ascontiguousarray(self.spread[:, columns]),
            **{part: getattr(self, part).take(columns) for part in parts},
        )


def spread_table(
    spreads: Sequence[Spread], photosphere: Photosphere, bands: Sequence[Band], source_floor: float | None
) -> FloatArray:
    """Spread per temperature and band, shape (N, B); `source_floor` replaces the table where given."""
    table = np.zeros((photosphere.teff_k.size, len(bands)))
    if source_floor is not None:
        return table + source_floor
    family = photosphere.source if photosphere.source in ("dwarfs", "planck") else "grid"
    for row in spreads:
        if row.photosphere != family:
            continue
        hot = (photosphere.teff_k >= row.low_k) & (photosphere.teff_k < row.high_k)
        for column, band in enumerate(bands):
            kind = "native" if photosphere.native[column] else "filled"
            named = row.bands in ("all", kind) or fnmatchcase(band.name, row.bands)
            if named and row.short_um <= band.pivot_um < row.long_um:
                table[hot, column] = row.fraction
    return table


def even_grid(low: float, high: float, step: float) -> FloatArray:
    """An even grid from low to high whose step is at most `step`."""
    return np.linspace(low, high, int(np.ceil((high - low) / step)) + 1)


def build_photosphere(source: str, dwarfs, bands: Sequence[Band], all_bands: Mapping[str, Band]) -> Photosphere:
    """The photosphere `source` ("dwarfs" or "planck") through `bands` on the star grid.

    Args:
        dwarfs: the mean dwarf table: `teff_k`, `logl` (T,) and `absolute_mag` by band.
    """
    rules = {band.name: quadrature(band) for band in (*all_bands.values(), *bands)}
    wanted = [rules[band.name] for band in bands]
    if source == "planck":
        return planck_photosphere(np.exp(even_grid(*np.log(PLANCK_RANGE_K), STAR_STEP)), wanted)
    if source == "dwarfs":
        low, high = dwarfs.teff_k.min(), dwarfs.teff_k.max()
        teff = np.exp(even_grid(np.log(low), np.log(high), STAR_STEP))
        return dwarf_photosphere(dwarfs.teff_k, dwarfs.logl, dwarfs.absolute_mag, bands, all_bands, rules, teff)
    raise TemplateError(f"There is no photosphere source {source!r}; choose dwarfs, planck or grid DIR.")


def build_templates(
    bands: Sequence[Band],
    photosphere: Photosphere,
    law: str,
    spreads: Sequence[Spread],
    *,
    r_v: float | None = None,
    source_floor: float | None = None,
    floors: Mapping[str, float] | None = None,
) -> Templates:
    """All grids for `bands` (any order) and a photosphere on an even grid of ln T through the same bands.

    Args:
        r_v: only this R_V (mag/mag); None: the whole range 2.3 to 5.6.
        floors: band -> calibration floor (fraction) in place of the band's own.
    Raises:
        InputError: the law or R_V is not known.
    """
    order = np.argsort([band.pivot_um for band in bands], kind="stable")
    chosen = tuple(replace(bands[i], floor=(floors or {}).get(bands[i].name, bands[i].floor)) for i in order)
    rules = [quadrature(band) for band in chosen]
    star_x = np.log(photosphere.teff_k)
    dust_x, compact_x = even_grid(*np.log(DUST_RANGE_K), 0.02), even_grid(*np.log(COMPACT_RANGE_K), 0.02)
    slope_x = even_grid(*SLOPE_RANGE, 0.05)
    single = law == "wc19" or r_v is not None
    rv_range = (r_v or 3.1, r_v or 3.1) if single else R_V_RANGE

    other = "g23" if law == "wc19" else "wc19"

    def reddening(low_k: float, high_k: float, by: str = law, ratios: tuple[float, float] = rv_range) -> Reddening:
        curves = BandCurves([rule.wave_um for rule in rules], by)
        return expand_reddening(rules, curves, (low_k, high_k), ratios)

    star_table = photosphere.ln_flux[:, order]
    star_range = (float(photosphere.teff_k[0]), float(photosphere.teff_k[-1]))
    known = np.isfinite(star_table).all(axis=0)

    def star_at(wave_um: float) -> FloatArray:
        pivots = np.log([band.pivot_um for band, told in zip(chosen, known, strict=True) if told])
        return np.array([np.interp(np.log(wave_um), pivots, row[known]) for row in star_table])

    return Templates(
        bands=chosen,
        photosphere=photosphere.source,
        law=law,
        star=source_grid("star", star_x, star_table),
        dust=source_grid("dust", dust_x, ln_planck_bands(np.exp(dust_x), rules)),
        compact=source_grid("compact", compact_x, ln_planck_bands(np.exp(compact_x), rules)),
        power=source_grid("power", slope_x, power_law_bands(slope_x, rules)),
        star_reddening=reddening(*star_range),
        dust_reddening=reddening(*DUST_RANGE_K),
        compact_reddening=reddening(*COMPACT_RANGE_K),
        other_law=other,
        other_reddening=reddening(*star_range, other, (3.1, 3.1)),
        spread=spread_table(spreads, photosphere, bands, source_floor)[:, order],
        radius_m=photosphere.radius_m,
        ln_ks=star_at(2.16),
        ln_infrared=star_at(SLOPE_SPLIT_UM),
        silent=tuple(band.name for column, band in enumerate(chosen) if np.isnan(star_table[:, column]).all()),
        digest=templates_digest(chosen, photosphere, law, spreads, rv_range, source_floor),
    )


def power_law_bands(slope: FloatArray, rules: Sequence[Quadrature]) -> FloatArray:
    """ln of the band average of (wavelength/3.4 micron)^slope in F_nu, shape (N, B)."""
    return np.stack(
        [np.log(np.exp(slope[:, None] * np.log(rule.wave_um / SLOPE_SPLIT_UM)) @ rule.weight) for rule in rules], axis=1
    )


def templates_digest(
    bands: Sequence[Band],
    photosphere: Photosphere,
    law: str,
    spreads: Sequence[Spread],
    rv_range: tuple[float, float],
    source_floor: float | None,
) -> str:
    """Digest of all that the grids are made of."""
    return digest(
        {
            "version": VERSION,
            "bands": [
                [b.name, b.floor, b.instrument, b.reference_spectrum, b.reference_um, b.wave_um, b.response] for b in bands
            ],
            "photosphere": [photosphere.source, photosphere.teff_k, np.round(photosphere.ln_flux, 9), photosphere.radius_m],
            "law": [law, rv_range],
            "spread": [[getattr(s, f) for f in s.__slots__] for s in spreads],
            "source_floor": source_floor,
        }
    )
