"""The frozen records that every layer shares, and the words that they may hold."""

from __future__ import annotations

import hashlib
import json
import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import TYPE_CHECKING, Any, TypeAlias

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

FloatArray: TypeAlias = "NDArray[np.float64]"  # in words: the records are there before numpy, which is slow to come

CHECKS = ("star", "instrument", "extinction", "blend", "dust")  # the order in which they are walked
NATURAL = CHECKS[1:]  # explanations of an odd star; `star` says that it was not odd
KINDS = (*CHECKS, "mixture", "dips")
CHECK_TITLES = MappingProxyType(
    {"star": "star", "instrument": "instrument", "extinction": "extinction", "blend": "blend", "dust": "warm dust"}
)
RULINGS = ("explains", "short", "unclear", "withdrawn")
SURE = ("explains", "short")
STATES = ("open", "split", "explains", "short", "nodata")
OUTCOMES = ("ordinary", "explained", "unexplained", "pending")
NATURES = (*CHECKS, "none")


@dataclass(frozen=True, slots=True, eq=False)
class Band:
    """One photometric band: its response, its magnitudes and what limits it."""

    name: str
    pivot_um: float  # Koornneef 1986 pivot wavelength, micron
    mag_system: str  # "Vega" or "AB"
    zero_point_jy: float  # flux density of magnitude 0
    floor: float  # calibration floor c_b, fraction of the flux
    instrument: str
    wave_um: FloatArray  # shape (M,), micron, strictly increasing; one entry where only the pivot is known
    response: FloatArray  # shape (M,), photon response, any scale
    reference_spectrum: str = ""  # "" flat F_nu; "nufnu" nu F_nu constant; "planck10000": what quoted Jy assume
    reference_um: float = math.nan  # wavelength at which quoted Jy hold
    beam_fwhm_arcsec: float = math.nan
    saturation_mag: float = math.nan
    limit_mag: float = math.nan
    source: str = ""


@dataclass(frozen=True, slots=True)
class Measurement:
    """One band's flux density or upper limit, as fitted and as given."""

    band: str
    flux_jy: float  # NaN never; negative where a catalogue gives a negative flux
    error_jy: float  # 1 sigma; NaN for a detection without error (takes the band's floor); NaN for a limit
    limit: bool = False  # flux_jy is an upper limit at nsigma
    nsigma: float = 2.0
    source: str = ""
    epoch: str = ""  # as given: ISO date, MJD or catalogue release
    flags: Mapping[str, str] = field(default_factory=dict)  # catalogue column -> its text for this band
    exclude: bool = False  # kept, shown, not fitted
    value: float = math.nan  # as given, in `unit`
    value_error: float = math.nan
    unit: str = "Jy"
    note: str = ""


@dataclass(frozen=True, slots=True)
class Neighbour:
    """Another catalogued source near a candidate."""

    separation_arcsec: float
    position_angle_deg: float = math.nan
    fluxes_jy: Mapping[str, float] = field(default_factory=dict)  # band -> flux density
    source: str = ""


@dataclass(frozen=True, slots=True)
class Dip:
    """One dimming event in one band: fraction of the flux lost at its deepest."""

    event: str
    band: str
    depth: float
    depth_error: float
    epoch: str = ""


@dataclass(frozen=True, slots=True)
class Spectrum:
    """A low-resolution spectrum: shape (N,) each, wavelength in micron strictly increasing, flux density in Jy."""

    wave_um: FloatArray
    flux_jy: FloatArray
    error_jy: FloatArray


@dataclass(frozen=True, slots=True)
class Candidate:
    """One star to vet: its measurements and the facts the catalogues give about it."""

    name: str
    measurements: tuple[Measurement, ...] = ()
    facts: Mapping[str, Any] = field(default_factory=dict)  # names and units of tui/data/facts.ecsv: ra, dec, parallax, ruwe, av_max ...
    neighbours: tuple[Neighbour, ...] = ()
    dips: tuple[Dip, ...] = ()
    spectrum: Spectrum | None = None


@dataclass(frozen=True, slots=True)
class Param:
    """A fitted number with its 68 % interval, or a one-sided 95 % limit when it lies at a bound."""

    value: float
    low: float
    high: float
    unit: str = ""
    limit: bool = False  # then only the end that differs from `value` bounds it, at 95 %


@dataclass(frozen=True, slots=True)
class Fit:
    """One model fitted to one candidate."""

    model: str
    chi2: float
    dof: int
    p: float
    aic: float
    bic: float
    params: Mapping[str, Param] = field(default_factory=dict)
    pulls: Mapping[str, float] = field(default_factory=dict)  # band -> (measured - model)/sigma; for a limit 0 where it is met
    minus2lnl: float = math.nan


@dataclass(frozen=True, slots=True)
class Evidence:
    """What the program computed for a candidate, for one kind."""

    kind: str
    version: int
    adequate: bool | None  # None: untestable
    fits: tuple[Fit, ...] = ()  # best first: lowest BIC
    cautions: tuple[str, ...] = ()
    facts: Mapping[str, Any] = field(default_factory=dict)  # JSON values only
    digest: str = ""  # of inputs and settings; set by workflow
    bands: tuple[str, ...] = ()  # bands fitted, in order of wavelength

    @property
    def best(self) -> Fit | None:
        """The fit with the lowest BIC, or None where nothing was fitted."""
        return self.fits[0] if self.fits else None


@dataclass(frozen=True, slots=True)
class Reviewer:
    """A person who joined the queue under a handle."""

    id: str
    handle: str
    joined_utc: str = ""


@dataclass(frozen=True, slots=True)
class Ruling:
    """A reviewer's judgement of one check: one row of the log, never changed."""

    candidate: str
    check: str
    reviewer_id: str
    ruling: str
    note: str = ""
    evidence_digest: str = ""  # evidence that was on screen
    seen_others: bool = False
    replaces: str = ""  # id of the reviewer's ruling that this one takes the place of
    utc: str = ""  # ISO 8601, microseconds, ends in Z
    id: str = ""
    previous_hash: str = ""
    hash: str = ""


@dataclass(frozen=True, slots=True)
class Settings:
    """All settings of a queue at one moment, with their defaults (design of the settings: README)."""

    quorum: int = 2
    agree_share: float = 1.0
    walk_all: bool = False
    photosphere: str = "dwarfs"
    law: str = "g23"
    r_v: str = "3.1"  # a number, or "free"
    av_prior: str = ""  # mag; empty: av_max of the candidate, else 1.8 mag/kpc, else 5 mag
    p_min: float = 0.01
    source_floor: float | None = None  # fraction; None: the floors table of the photosphere source
    floors: Mapping[str, float] = field(default_factory=dict)  # band -> fraction, in place of the table's
    common: Mapping[str, float] = field(default_factory=dict)  # instrument -> common error, fraction
    ruwe_max: float = 1.4
    n_searched: int | None = None
    templates: str = ""  # natural sources of the user's in the mixture bound, by their digest in the queue; empty: none


def plain(value: Any) -> Any:
    """`value` as JSON can hold it: NaN and infinities become None, mappings plain dicts, numpy scalars Python's.

    A minus zero becomes zero, as it does in an SQLite column.
    """
    if isinstance(value, Mapping):
        return {str(key): plain(item) for key, item in value.items()}
    if hasattr(value, "tolist"):  # numpy's arrays and scalars
        value = value.tolist()
    if isinstance(value, (list, tuple)):
        return [plain(item) for item in value]
    if isinstance(value, float):
        return value + 0.0 if math.isfinite(value) else None
    return value


def canonical_json(value: Any) -> str:
    """The one JSON text of a value: sorted keys, no spaces, ASCII, no NaN; what digests are taken of."""
    return json.dumps(plain(value), sort_keys=True, separators=(",", ":"), ensure_ascii=True, allow_nan=False)


def digest(value: Any) -> str:
    """SHA-256 of the canonical JSON, 64 hex digits."""
    return hashlib.sha256(canonical_json(value).encode("ascii")).hexdigest()
