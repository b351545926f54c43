"""The columns of the vetted list: what each is called, means, is measured in, and where its value comes from."""

from __future__ import annotations

import math
import sys
from array import array
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tui.model import CHECK_TITLES, CHECKS, KINDS, SURE, Evidence, Fit, Param

FITTED_ENDS = ("low", "high")
SHORT = 40  # characters up to which a text is likely to occur again


@dataclass(frozen=True, slots=True)
class VettedRow:
    """All that one row of the list is made of."""

    name: str
    facts: Mapping[str, Any]
    outcome: str
    pending_reason: str
    states: Mapping[str, str]
    counts: Mapping[str, Mapping[str, int]]  # check -> ruling -> how many current ones
    revised: Mapping[str, int]
    stale: Mapping[str, int]
    evidence: Mapping[str, Evidence]
    oddness: Mapping[str, Any] = field(default_factory=dict)  # sigma, band, pull
    photosphere: str = ""
    law: str = ""
    held_r_v: float | None = None  # of the settings, where R_V is not free

    def best(self, kind: str) -> Fit | None:
        """The best fit of one kind of evidence, or None."""
        found = self.evidence.get(kind)
        return found.best if found else None

    def fact(self, kind: str, name: str) -> Any:
        """A fact of one kind of evidence, or None."""
        found = self.evidence.get(kind)
        return found.facts.get(name) if found else None


@dataclass(frozen=True, slots=True)
class ExportColumn:
    """One column: `take` returns its value for a row, None where it is to be masked."""

    name: str
    kind: type  # str, int or float
    description: str
    take: Callable[[VettedRow], Any]
    unit: str = ""
    ucd: str = ""


INT_NULL = -2147483648  # no count or number of degrees of freedom; TNULL of FITS integer columns


class Cells:
    """The cells of the list, column by column, as small as numbers are: a million rows fit in memory."""

    def __init__(self, columns: Sequence[ExportColumn]) -> None:
        self.columns = tuple(columns)
        new = {float: lambda: array("d"), int: lambda: array("i"), str: list}
        self._values: dict[str, Any] = {column.name: new[column.kind]() for column in columns}

    def __len__(self) -> int:
        return len(self._values[self.columns[0].name])

    def add(self, row: VettedRow) -> None:
        """Take one row's cells."""
        for column in self.columns:
            value = column.take(row)
            if value is None:
                value = {float: math.nan, int: INT_NULL, str: None}[column.kind]
            elif column.kind is str:
                value = sys.intern(value) if len(value) < SHORT else value
            self._values[column.name].append(value)

    def column(
        self, column: ExportColumn, clean: Callable[[str], str] = str
    ) -> tuple[NDArray[Any], NDArray[np.bool_]]:
        """Values and mask of one column, shape (N,) each; a filler stands where masked, texts go through `clean`."""
        raw = self._values[column.name]
        if column.kind is str:
            filled = np.array(["" if value is None else clean(value) for value in raw], dtype=np.str_ if raw else "U1")
            return filled, np.array([value is None for value in raw], dtype=bool)
        values = np.array(raw, dtype=np.float64 if column.kind is float else np.int32)
        return values, np.isnan(values) if column.kind is float else values == INT_NULL

    def rows(self) -> Iterator[list[Any]]:
        """Each row's cells, None where masked."""
        for values in zip(*(self._values[column.name] for column in self.columns), strict=True):
            yield [None if value is None or value == INT_NULL or value != value else value for value in values]


def columns() -> tuple[ExportColumn, ...]:
    """Every column, in the order of the list."""
    return (
        *identity_columns(),
        *(column for check in CHECKS for column in check_columns(check)),
        *number_columns(),
        *context_columns(),
    )


def identity_columns() -> list[ExportColumn]:
    """Which star, and what became of it."""
    return [
        ExportColumn("name", str, "candidate", lambda row: row.name, ucd="meta.id;meta.main"),
        ExportColumn("ra", float, "right ascension as loaded", fact("ra"), "deg", "pos.eq.ra;meta.main"),
        ExportColumn("dec", float, "declination as loaded", fact("dec"), "deg", "pos.eq.dec;meta.main"),
        ExportColumn(
            "outcome", str, "ordinary, explained, unexplained or pending", lambda row: row.outcome, ucd="meta.code.status"
        ),
        ExportColumn("pending_reason", str, "why it is pending", lambda row: row.pending_reason, ucd="meta.note"),
    ]


def fact(name: str) -> Callable[[VettedRow], float | None]:
    """A number among the candidate's facts."""
    return lambda row: finite(row.facts.get(name))


def check_columns(check: str) -> list[ExportColumn]:
    """State and counts of rulings of one check."""
    title = CHECK_TITLES[check]
    found = [
        ExportColumn(
            f"{check}_state",
            str,
            f"{title}: open, split, explains, short or nodata",
            lambda row: row.states.get(check),
            ucd="meta.code.status",
        )
    ]
    for ruling in (*SURE, "unclear"):
        found.append(
            ExportColumn(
                f"{check}_{ruling}",
                int,
                f"{title}: current rulings '{ruling}'",
                lambda row, ruling=ruling: row.counts.get(check, {}).get(ruling, 0),
                ucd="meta.number",
            )
        )
    found.append(count_column(f"{check}_revised", f"{title}: rulings revised", lambda row: row.revised.get(check, 0)))
    found.append(count_column(f"{check}_stale", f"{title}: stale rulings", lambda row: row.stale.get(check, 0)))
    return found


def count_column(name: str, description: str, take: Callable[[VettedRow], int]) -> ExportColumn:
    """A column of counts."""
    return ExportColumn(name, int, description, take, ucd="meta.number")


def number_columns() -> list[ExportColumn]:
    """What the fits gave."""
    return [
        ExportColumn(
            "oddness", float, "sigma of the star-only p, one-sided", lambda row: finite(row.oddness.get("sigma")),
            ucd="stat.value",
        ),
        ExportColumn(
            "odd_band", str, "band of the largest pull from the star alone", lambda row: row.oddness.get("band") or None,
            ucd="instr.bandpass",
        ),
        *fitted("star_teff", "star", "teff", "effective temperature, star alone", "K", "phys.temperature.effective"),
        *goodness("star"),
        *fitted("extinction_av", "extinction", "av", "extinction A(V)", "mag", "phys.absorption;em.opt.V"),
        *ratio_columns(),
        *fitted(
            "extinction_teff", "extinction", "teff", "effective temperature behind the extinction", "K",
            "phys.temperature.effective",
        ),
        *goodness("extinction"),
        *fitted("dust_temperature", "dust", "dust_temperature", "dust temperature", "K", "phys.temperature"),
        *fitted(
            "dust_fractional_luminosity", "dust", "dust_fractional_luminosity", "dust luminosity / star luminosity", "",
            "phys.luminosity;arith.ratio",
        ),
        *fitted("dust_radius_au", "dust", "dust_radius", "distance of black-body dust from the star", "AU", "phys.size.radius"),
        *goodness("dust"),
        ExportColumn("blend_model", str, "best blend model", lambda row: model_of(row, "blend"), ucd="meta.code;meta.modelled"),
        *fitted("blend_teff1", "blend", "teff1", "temperature of the first source", "K", "phys.temperature.effective"),
        *fitted("blend_teff2", "blend", "teff2", "temperature of the second source", "K", "phys.temperature.effective"),
        *goodness("blend"),
    ]  # fmt: skip


def context_columns() -> list[ExportColumn]:
    """What lies around the fits, the mixture bound, the dips, and what all of it rests on."""
    return [
        known("blend_chance_alignment", "blend", "chance_alignment", "chance of an unrelated source", "", "stat.probability"),
        *ranged_fact("overluminosity", "blend", "over_luminosity", "magnitudes above one star at that parallax", "mag"),
        known("carrier_band", "instrument", "carrier_band", "band or instrument whose removal mends most", "", "instr.bandpass", str),
        known("carrier_p", "instrument", "carrier_p", "p of the carrier, corrected for the bands tried", "", "stat.probability"),
        known("instrument_suspect_bands", "instrument", "suspect_bands", "bands under independent suspicion", "", "instr.bandpass", str),
        known(
            "instrument_p_without_suspects", "instrument", "p_without_suspects", "p of the star alone without them", "",
            "stat.probability",
        ),
        known("mixture_chi2", "mixture", "chi2", "chi-square certified by the mixture bound", "", "stat.fit.chi2"),
        known("mixture_points", "mixture", "points", "data points in the mixture bound", "", "meta.number", int),
        known("mixture_p", "mixture", "p", "p that any natural mixture makes these fluxes, at most", "", "stat.probability"),
        *ranged_fact("dip_slope", "dips", "slope", "alpha of depth against wavelength^-alpha", "", "stat.fit.param"),
        ExportColumn("bands", str, "bands fitted, by wavelength", fitted_bands, ucd="instr.bandpass"),
        ExportColumn("photosphere", str, "photosphere source", lambda row: row.photosphere or None, ucd="meta.code;meta.modelled"),
        ExportColumn("law", str, "extinction law", lambda row: row.law or None, ucd="meta.code;meta.modelled"),
        ExportColumn("cautions", str, "physical remarks beside the fits", all_cautions, ucd="meta.note"),
    ]  # fmt: skip


def fitted(name: str, kind: str, param: str, description: str, unit: str, ucd: str) -> list[ExportColumn]:
    """A fitted value with the ends of its interval."""

    def take(row: VettedRow, end: str) -> float | None:
        best = row.best(kind)
        found: Param | None = best.params.get(param) if best else None
        return finite(getattr(found, end)) if found else None

    value = ExportColumn(name, float, description, lambda row: take(row, "value"), unit, ucd)
    return [value, *interval(name, take, unit, ucd)]


def interval(name: str, take: Callable[[VettedRow, str], float | None], unit: str, ucd: str) -> list[ExportColumn]:
    """The two ends of a value's interval, or of its one-sided limit."""
    words = {"low": "lower", "high": "upper"}
    return [
        ExportColumn(
            f"{name}_{end}",
            float,
            f"{words[end]} end of the 68 % interval of {name}, or its 95 % limit at a bound",
            lambda row, end=end: take(row, end),
            unit,
            f"{ucd};stat.{'min' if end == 'low' else 'max'}",
        )
        for end in FITTED_ENDS
    ]


def ratio_columns() -> list[ExportColumn]:
    """R_V where it was fitted, with its interval; where it was held, the value that was used, without."""
    value, *ends = fitted("extinction_r_v", "extinction", "r_v", "A(V) / E(B-V)", "", "phys.absorption;arith.ratio")

    def take(row: VettedRow) -> float | None:
        found = value.take(row)
        return row.held_r_v if found is None and row.best("extinction") else found

    return [replace(value, take=take), *ends]


def goodness(kind: str) -> list[ExportColumn]:
    """Chi-square, degrees of freedom and p of a check's best fit."""

    def take(attribute: str) -> Callable[[VettedRow], Any]:
        return lambda row: finite(getattr(best, attribute)) if (best := row.best(kind)) else None

    title = CHECK_TITLES[kind]
    return [
        ExportColumn(f"{kind}_chi2", float, f"{title}: chi-square of the best fit", take("chi2"), ucd="stat.fit.chi2"),
        ExportColumn(f"{kind}_dof", int, f"{title}: degrees of freedom", take("dof"), ucd="stat.fit.dof"),
        ExportColumn(f"{kind}_p", float, f"{title}: probability of so large a chi-square", take("p"), ucd="stat.probability"),
    ]


def known(
    name: str, kind: str, key: str, description: str, unit: str = "", ucd: str = "", type_: type = float
) -> ExportColumn:
    """A fact of some evidence."""
    return ExportColumn(name, type_, description, lambda row: as_type(row.fact(kind, key), type_), unit, ucd)


def ranged_fact(
    name: str, kind: str, key: str, description: str, unit: str, ucd: str = "phys.magAbs;arith.diff"
) -> list[ExportColumn]:
    """A fact with the ends of its interval, kept as `key`, `key_low`, `key_high`, or with one `key_error`."""

    def take(row: VettedRow, end: str) -> float | None:
        value = finite(row.fact(kind, key))
        if value is None or end == "value":
            return value
        stated = finite(row.fact(kind, f"{key}_{end}"))
        error = finite(row.fact(kind, f"{key}_error"))
        if stated is not None or error is None:
            return stated
        return value - error if end == "low" else value + error

    return [
        ExportColumn(name, float, description, lambda row: take(row, "value"), unit, ucd),
        *interval(name, take, unit, ucd),
    ]


def as_type(value: Any, type_: type) -> Any:
    """A fact as its column holds it; a list of names becomes one text."""
    if value is None:
        return None
    if type_ is str:
        return " ".join(map(str, value)) if isinstance(value, (list, tuple)) else str(value)
    number = finite(value)
    return None if number is None else type_(number)


def finite(value: Any) -> Any:
    """A number, or None where it is none or not finite; integers stay integers."""
    if isinstance(value, bool) or not isinstance(value, (int, float)):
        return None
    return value if math.isfinite(value) else None


def model_of(row: VettedRow, kind: str) -> str | None:
    """Name of the best model of one check."""
    best = row.best(kind)
    return best.model if best else None


def fitted_bands(row: VettedRow) -> str | None:
    """Bands that the star alone was fitted to."""
    star = row.evidence.get("star")
    return " ".join(star.bands) if star and star.bands else None


def all_cautions(row: VettedRow) -> str | None:
    """Every caution, each under its check, in the order of the walk."""
    found = [
        f"{CHECK_TITLES.get(kind, kind)}: {caution}"
        for kind in KINDS
        if kind in row.evidence
        for caution in row.evidence[kind].cautions
    ]
    return "; ".join(found) or None
