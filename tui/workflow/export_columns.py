"""The columns of the vetted list: what each is called, means, is measured in, and where its value comes from."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

from tui.model import CHECK_TITLES, CHECKS, KINDS, SURE, Param
from tui.workflow.export_row import ExportColumn, VettedRow, as_type, finite

FITTED_ENDS = ("low", "high")


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
    outcomes = "ordinary, explained, unexplained or pending"
    return [
        ExportColumn("name", str, "candidate", lambda row: row.name, ucd="meta.id;meta.main"),
        ExportColumn("ra", float, "right ascension as loaded", fact("ra"), "deg", "pos.eq.ra;meta.main"),
        ExportColumn("dec", float, "declination as loaded", fact("dec"), "deg", "pos.eq.dec;meta.main"),
        ExportColumn("outcome", str, outcomes, lambda row: row.outcome, ucd="meta.code.status"),
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
    teff, ratio = "phys.temperature.effective", "arith.ratio"
    return [
        ExportColumn("oddness", float, "sigma of the star-only p, one-sided", odd("sigma"), ucd="stat.value"),
        ExportColumn("odd_band", str, "band farthest from the star alone", odd("band"), ucd="instr.bandpass"),
        *fitted("star_teff", "star.teff", "effective temperature, star alone", "K", teff),
        *goodness("star"),
        *fitted("extinction_av", "extinction.av", "extinction A(V)", "mag", "phys.absorption;em.opt.V"),
        *ratio_columns(),
        *fitted("extinction_teff", "extinction.teff", "effective temperature behind the extinction", "K", teff),
        *goodness("extinction"),
        *fitted("dust_temperature", "dust.dust_temperature", "dust temperature", "K", "phys.temperature"),
        *fitted(
            "dust_fractional_luminosity",
            "dust.dust_fractional_luminosity",
            "dust luminosity / star luminosity",
            "",
            f"phys.luminosity;{ratio}",
        ),
        *fitted("dust_radius_au", "dust.dust_radius", "distance of black-body dust", "AU", "phys.size.radius"),
        *goodness("dust"),
        ExportColumn("blend_model", str, "best blend model", model_of("blend"), ucd="meta.code;meta.modelled"),
        *fitted("blend_teff1", "blend.teff1", "temperature of the first source", "K", teff),
        *fitted("blend_teff2", "blend.teff2", "temperature of the second source", "K", teff),
        *goodness("blend"),
    ]


def context_columns() -> list[ExportColumn]:
    """What lies around the fits, the mixture bound, the dips, and what all of it rests on."""
    p, band, made = "stat.probability", "instr.bandpass", "meta.code;meta.modelled"
    bright = "phys.magAbs;arith.diff"
    return [
        known("blend_chance_alignment", "blend.chance_alignment", float, "chance of an unrelated source", p),
        *ranged("overluminosity", "blend.over_luminosity", "above one star at that parallax", "mag", bright),
        known("carrier_band", "instrument.carrier_band", str, "band or instrument that carries the anomaly", band),
        known("carrier_p", "instrument.carrier_p", float, "p of the carrier, corrected for the bands tried", p),
        known("instrument_suspect_bands", "instrument.suspect_bands", str, "bands under independent suspicion", band),
        known("instrument_p_without_suspects", "instrument.p_without_suspects", float, "p of the star without them", p),
        known("mixture_chi2", "mixture.chi2", float, "chi-square certified by the mixture bound", "stat.fit.chi2"),
        known("mixture_points", "mixture.points", int, "data points in the mixture bound", "meta.number"),
        known("mixture_p", "mixture.p", float, "p that any natural mixture makes these fluxes, at most", p),
        *ranged("dip_slope", "dips.slope", "alpha of depth as wavelength^-alpha", "", "stat.fit.param"),
        ExportColumn("bands", str, "bands fitted, by wavelength", fitted_bands, ucd=band),
        ExportColumn("photosphere", str, "photosphere source", lambda row: row.photosphere or None, ucd=made),
        ExportColumn("law", str, "extinction law", lambda row: row.law or None, ucd=made),
        ExportColumn("cautions", str, "physical remarks beside the fits", all_cautions, ucd="meta.note"),
    ]


def odd(key: str) -> Callable[[VettedRow], Any]:
    """A part of the oddness, None where it was not computed."""
    return lambda row: row.oddness.get(key) or None


def fitted(name: str, source: str, description: str, unit: str, ucd: str) -> list[ExportColumn]:
    """A fitted value with the ends of its interval; `source` is kind of evidence and parameter of its best fit."""
    kind, param = source.split(".")

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
    value, *ends = fitted("extinction_r_v", "extinction.r_v", "A(V) / E(B-V)", "", "phys.absorption;arith.ratio")

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
        ExportColumn(f"{kind}_p", float, f"{title}: p of the best fit", take("p"), ucd="stat.probability"),
    ]


def known(name: str, source: str, kind_of: type, description: str, ucd: str) -> ExportColumn:
    """A fact of some evidence; `source` is kind of evidence and name of the fact."""
    kind, key = source.split(".")
    return ExportColumn(name, kind_of, description, lambda row: as_type(row.fact(kind, key), kind_of), ucd=ucd)


def ranged(name: str, source: str, description: str, unit: str, ucd: str) -> list[ExportColumn]:
    """A fact with the ends of its interval, kept as `key`, `key_low`, `key_high`, or with one `key_error`."""
    kind, key = source.split(".")

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


def model_of(kind: str) -> Callable[[VettedRow], str | None]:
    """Name of the best model of one check."""
    return lambda row: best.model if (best := row.best(kind)) else None


def fitted_bands(row: VettedRow) -> str | None:
    """Bands that the star alone was fitted to; the points of a spectrum as one."""
    from tui.physics.spectral import INSTRUMENT, is_point

    star = row.evidence.get("star")
    if not star or not star.bands:
        return None
    return " ".join(dict.fromkeys(INSTRUMENT if is_point(band) else band for band in star.bands))


def all_cautions(row: VettedRow) -> str | None:
    """Every caution, each under its check, in the order of the walk."""
    found = [
        f"{CHECK_TITLES.get(kind, kind)}: {caution}"
        for kind in KINDS
        if kind in row.evidence
        for caution in row.evidence[kind].cautions
    ]
    return "; ".join(found) or None
