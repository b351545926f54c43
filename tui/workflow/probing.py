"""Fits by hand, and the spectrum of a fit for the plot; nothing here is stored."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from types import MappingProxyType
from typing import TYPE_CHECKING

import numpy as np

from tui.errors import InputError, UnknownNameError
from tui.model import Candidate, Evidence, Fit, FloatArray
from tui.workflow.basis import Basis
from tui.workflow.spectral_grids import templates_of

if TYPE_CHECKING:
    from tui.checks import Curve

POINTS = 400  # wavelengths of a curve: finer than the dots of a wall screen
MARGIN = 1.6  # how far a curve goes beyond the shortest and longest band, as a factor
BARE_RANGE_UM = (0.3, 30.0)  # where a candidate has no band that the program knows
SPECTRUM = "spectrum"  # to drop all points of one
SHORT_NAMES = MappingProxyType(
    {"T": "teff", "Teff": "teff", "A_V": "av", "AV": "av", "Av": "av", "R_V": "r_v", "RV": "r_v"}
    | {"Td": "dust_temperature", "T_d": "dust_temperature", "f": "dust_fractional_luminosity"}
)
_OWN_T = MappingProxyType({"dust": "dust_temperature", "blend": "teff1"})  # what a bare T means in a check


def parameter_name(check: str, typed: str) -> str:
    """The name of a parameter as a person may type it: `T` is the dust's in `dust`, the star's elsewhere.

    >>> parameter_name("dust", "T"), parameter_name("star", "T"), parameter_name("extinction", "A_V")
    ('dust_temperature', 'teff', 'av')
    """
    if typed == "T" and check in _OWN_T:
        return _OWN_T[check]
    return SHORT_NAMES.get(typed, typed)


def band_name(candidate: Candidate, typed: str) -> str:
    """A band of the candidate by name or alias. UnknownNameError naming those it has."""
    from tui.data.load import band_aliases

    measured = {one.band for one in candidate.measurements}
    if typed == SPECTRUM and candidate.spectrum is not None:
        return typed
    for name in (typed, band_aliases().get(typed, typed)):
        if name in measured:
            return name
    raise UnknownNameError("band", typed, f"{candidate.name} has {' '.join(sorted(measured)) or 'none'}.")


def fitted_bands(candidate: Candidate, dropped: Iterable[str]) -> frozenset[str]:
    """The names of the bands to leave out. InputError where none would be left to fit."""
    without = frozenset(band_name(candidate, band) for band in dropped)
    if not {one.band for one in candidate.measurements if not one.exclude} - without:
        raise InputError(f"No band of {candidate.name} is left to fit.")
    return without


def probe(
    candidate: Candidate,
    check: str,
    fixed: Mapping[str, float],
    dropped: frozenset[str],
    basis: Basis,
    model: str | None = None,
) -> tuple[Fit, Curve]:
    """Fit one check with some parameters fixed and some bands dropped.

    Args:
        fixed: parameter -> value, by the name or the short name of a parameter.
        dropped: bands to leave out, by name or alias.
        model: the one to fit; None, or one that no hand can change: the simplest that has every fixed parameter.
    Raises:
        UnknownNameError: no such band.
        InputError: no such parameter in any model of the check, or too few bands are left.
    """
    from tui import checks
    from tui.checks.by_hand import CHECK_MODELS

    held = {parameter_name(check, name): value for name, value in fixed.items()}
    without = fitted_bands(candidate, dropped)
    templates = templates_of(candidate, basis)
    own = model if model in {one.name for one in CHECK_MODELS.get(check, ())} else None
    fit = checks.probe(candidate, check, held, without, templates, basis.settings, model=own)
    return fit, checks.curve(candidate, fit, check, templates, basis.settings, curve_wavelengths(candidate, basis))


def fit_curve(candidate: Candidate, evidence: Evidence, fit_index: int, basis: Basis) -> Curve | None:
    """The spectrum of one fit of some evidence, by component; None where there is no such fit."""
    if not 0 <= fit_index < len(evidence.fits):
        return None
    from tui import checks

    fit = evidence.fits[fit_index]
    wave_um = curve_wavelengths(candidate, basis)
    return checks.curve(candidate, fit, evidence.kind, templates_of(candidate, basis), basis.settings, wave_um)


def curve_wavelengths(candidate: Candidate, basis: Basis) -> FloatArray:
    """Where to draw a curve: shape (POINTS,), micron, even in the logarithm, a little beyond the bands measured."""
    known = basis.bands()
    pivots = [known[one.band].pivot_um for one in candidate.measurements if one.band in known]
    low, high = (min(pivots) / MARGIN, max(pivots) * MARGIN) if pivots else BARE_RANGE_UM
    return np.geomspace(low, high, POINTS)
