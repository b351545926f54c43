"""One invented star: what it is, and what happened to it on the way into the catalogues."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

MARSH, MEADOW = "marsh", "meadow"  # the survey's two fields: near the galactic plane, and far from it


@dataclass(frozen=True, slots=True)
class Dust:
    """Dust around the star: temperature and fraction of the star's light that it takes and sends out again."""

    kelvin: float
    fraction: float


@dataclass(frozen=True, slots=True)
class Companion:
    """A second dwarf at the same distance."""

    kelvin: float


@dataclass(frozen=True, slots=True)
class Compact:
    """A white dwarf at the same distance."""

    kelvin: float
    radius_sun: float


@dataclass(frozen=True, slots=True)
class Nucleus:
    """A galaxy behind the star: F_nu ~ wavelength^slope, `ratio` of the star's flux at 3.4 micron."""

    slope: float
    ratio: float


@dataclass(frozen=True, slots=True)
class Screen:
    """A screen that no dust makes: it takes `depth` of the light outside (or, for a notch, inside) a range."""

    low_um: float
    high_um: float
    depth: float
    notch: bool = False


@dataclass(frozen=True, slots=True)
class Star:
    """One candidate to be. Magnitudes are apparent, before extinction."""

    recipe: str  # how it was made, in a few words
    nature: str  # a check, or "none"
    teff_k: float
    ks_mag: float
    shows: str = ""  # the one item of evidence it was built to show
    radius: float = 1.0  # of a dwarf of this temperature
    av_mag: float = 0.0
    r_v: float = 3.1
    parts: tuple[Dust | Companion | Compact | Nucleus, ...] = ()
    screen: Screen | None = None
    offset_mag: Mapping[str, float] = field(default_factory=dict)  # band -> error of the catalogue, minus is too bright
    absent: tuple[str, ...] = ()  # bands that no catalogue gives
    gaia: Mapping[str, Any] = field(default_factory=dict)  # columns that are not as usual
    twomass: Mapping[str, Any] = field(default_factory=dict)
    wise: Mapping[str, Any] = field(default_factory=dict)
    facts: Mapping[str, Any] = field(default_factory=dict)
    place: str = MEADOW
    motion_mas_yr: tuple[float, float] = (0.0, 0.0)
    wise_offset_arcsec: tuple[float, float] = (0.0, 0.0)  # east, north of where the star was
    further: tuple[str, ...] = ()  # bands of the further tables
    sdss: bool = False
    sdss_odd: Mapping[str, Any] = field(default_factory=dict)  # columns of SDSS that are not as usual
    archives: Mapping[str, Mapping[str, Any]] = field(default_factory=dict)  # catalogue -> columns not as usual
    epochs: Mapping[str, tuple[float, ...]] = field(default_factory=dict)  # band -> mag offsets of single epochs
    neighbours: tuple[tuple[float, float, float, float], ...] = ()  # arcsec, angle, T_eff, mag fainter than it at Ks
    neighbours_told: bool = True  # in the table of neighbours; else only 2MASS tells how near the nearest is
    dip: tuple[str, float] = ("", 0.0)  # "coloured" and A_V, or "grey" and the depth
    curves: bool = False  # its dip is there as light curves
    spectrum: bool = False
    pictures: tuple[str, ...] = ()
    control: bool = False
    later: bool = False  # a correction of its photometry arrives after the first rulings
    stream: tuple[int, int] = (0, 0)  # family and place in it: its own random states, whatever other stars there are
