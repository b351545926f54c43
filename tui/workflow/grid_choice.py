"""Which of a folder's spectra make the photosphere source: one log g and [M/H], as on the main sequence."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from tui.errors import TableError
from tui.physics.grid import SurfaceSpectrum

MAIN_SEQUENCE_LOGG = 4.5  # cgs; the nominal Sun has 4.44 (Prsa et al. 2016, AJ 152, 41)
SOLAR_MH = 0.0
ALIKE = 0.011  # of log g or [M/H], by which a number that was asked for may be missed


@dataclass(frozen=True, slots=True)
class GivenSpectrum:
    """One file: its spectrum, and log g and [M/H] where it tells them."""

    path: Path
    spectrum: SurfaceSpectrum
    logg: float | None = None
    mh: float | None = None


def chosen_spectra(
    folder: str, given: Sequence[GivenSpectrum], logg: float | None = None, mh: float | None = None
) -> list[GivenSpectrum]:
    """One spectrum a temperature, coolest first.

    [M/H] is the one nearest the Sun's, log g at each temperature the one nearest 4.5, unless the numbers are given:
    then only spectra that have them are taken.
    Raises:
        TableError: no spectrum has what was asked for, or two files are alike in all.
    """
    left = asked_for(folder, given, "logg", logg)
    left = asked_for(folder, left, "mh", mh)
    told = sorted({one.mh for one in left if one.mh is not None}, key=lambda value: (abs(value - SOLAR_MH), value))
    if told:
        left = [one for one in left if one.mh in (told[0], None)]
    found: dict[float, GivenSpectrum] = {}
    for one in sorted(left, key=lambda one: (one.spectrum.teff_k, from_main_sequence(one), one.logg or 0.0)):
        other = found.setdefault(one.spectrum.teff_k, one)
        if other is not one and other.logg == one.logg:
            raise TableError(
                str(one.path),
                f"{other.path.name} has {one.spectrum.teff_k:g} K too, and nothing tells them apart; keep one.",
            )
    return [found[teff_k] for teff_k in sorted(found)]


def from_main_sequence(one: GivenSpectrum) -> float:
    """How far a spectrum's log g is from a dwarf's; untold counts as one."""
    return 0.0 if one.logg is None else abs(one.logg - MAIN_SEQUENCE_LOGG)


def asked_for(
    folder: str, given: Sequence[GivenSpectrum], name: str, wanted: float | None
) -> list[GivenSpectrum]:
    """Those with the log g or [M/H] that was asked for; all where nothing was."""
    if wanted is None:
        return list(given)
    left = [one for one in given if (value := getattr(one, name)) is not None and abs(value - wanted) < ALIKE]
    if not left:
        told = sorted({value for one in given if (value := getattr(one, name)) is not None})
        has = ", ".join(f"{value:g}" for value in told) or "none told in header or file name"
        raise TableError(folder, f"no spectrum has {name} {wanted:g}; there are {has}.")
    return left


def described(chosen: Sequence[GivenSpectrum]) -> str:
    """What was chosen, in words for every output: `3500-7000 K, log g 4.5, [M/H] 0`."""
    parts = [f"{chosen[0].spectrum.teff_k:g}-{chosen[-1].spectrum.teff_k:g} K"]
    for name, title in (("logg", "log g"), ("mh", "[M/H]")):
        told = sorted({value for one in chosen if (value := getattr(one, name)) is not None})
        if told:
            parts.append(f"{title} {told[0]:g}" + (f" to {told[-1]:g}" if told[-1] > told[0] else ""))
    return ", ".join(parts)
