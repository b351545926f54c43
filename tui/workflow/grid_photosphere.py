"""A photosphere source made of the user's spectra, carried in the queue by its content."""

from __future__ import annotations

import re
import sqlite3
import zlib
from collections.abc import Sequence
from functools import lru_cache
from pathlib import Path

import numpy as np

from tui.errors import SettingError, StoreError, TableError
from tui.physics.grid import SurfaceSpectrum
from tui.store.sides import attach, attachments
from tui.workflow.grid_choice import chosen_spectra, described
from tui.workflow.grid_file import DamagedError, pack, unpack
from tui.workflow.grid_spectra import read_spectra
from tui.workflow.safe_text import safe

GRID_KIND = "grid"  # of the attachments that carry spectra
PREFIX = "grid:"  # of the setting's value, before the first digits of the digest of the spectra
DIGITS = 16
KEY = re.compile(PREFIX + r"([0-9a-f]{16,64})(?: |$)")
WIDEST_STEP = 0.2  # of ln T between neighbouring spectra, our choice: 5000 to 6000 K is 0.18
LEAST_SPECTRA = 4
MOST_BYTES = 200_000_000  # of spectra taken out of a queue
CHOICES = ("logg", "mh")


def keep_grid(connection: sqlite3.Connection, typed: str) -> str:
    """Carry the spectra of a folder in the queue; the value that the setting `photosphere` then takes.

    Args:
        typed: the folder, and `logg=4.5 mh=0` behind it where a part of the spectra is meant.
    Raises:
        SettingError: a choice that is no number.
        TableError: the folder or a spectrum cannot be used, or there is a gap in temperature.
    """
    folder, wanted = folder_and_choice(typed)
    chosen = chosen_spectra(folder, read_spectra(folder), **wanted)
    if len(chosen) < LEAST_SPECTRA:
        raise TableError(folder, f"spectra that can be used: {len(chosen)}; a grid needs {LEAST_SPECTRA}.")
    refuse_gaps(folder, [one.spectrum.teff_k for one in chosen])
    content = zlib.compress(pack(tuple(one.spectrum for one in chosen)), 6)
    name = safe(Path(folder).expanduser().resolve().name)[:60] or "grid"
    return f"{PREFIX}{attach(connection, GRID_KIND, name, content)[:DIGITS]} {name} ({described(chosen)})"


def folder_and_choice(typed: str) -> tuple[str, dict[str, float]]:
    """The folder of `DIR logg=4.5 mh=0` and the numbers behind it. SettingError where one is no number.

    >>> folder_and_choice("my spectra logg=4.5")
    ('my spectra', {'logg': 4.5})
    """
    words, wanted = typed.split(" "), {}
    while words and (name := words[-1].partition("=")[0]) in CHOICES and "=" in words[-1]:
        try:
            wanted[name] = float(words.pop().partition("=")[2])
        except ValueError as error:
            raise SettingError("photosphere", f"{name} is to be a number, as in {name}=0.") from error
    return " ".join(words).strip(), wanted


def refuse_gaps(folder: str, teff_k: Sequence[float]) -> None:
    """TableError where neighbouring spectra lie too far apart to be interpolated."""
    for low, high in zip(teff_k, teff_k[1:], strict=False):
        if np.log(high / low) > WIDEST_STEP:
            raise TableError(folder, f"there is a gap between {low:g} and {high:g} K; add a spectrum between them.")


def kept_spectra(connection: sqlite3.Connection, setting: str) -> tuple[SurfaceSpectrum, ...]:
    """The spectra that a value of the setting names.

    Raises:
        SettingError: the value does not name spectra by their digest, or the queue does not hold them.
        StoreError: they are damaged.
    """
    named = KEY.match(setting)
    if not named:
        raise SettingError("photosphere", f"{setting!r} names no spectra in this queue; set it anew with grid DIR.")
    for one in attachments(connection, GRID_KIND):
        if one.digest.startswith(named[1]):
            return unpacked(one.digest, one.content)
    raise SettingError("photosphere", "the queue does not hold the spectra that it names; set it anew with grid DIR.")


@lru_cache(maxsize=1)
def unpacked(digest: str, content: bytes) -> tuple[SurfaceSpectrum, ...]:
    """Spectra from what a queue holds under `digest`; the last ones are kept. StoreError where they are damaged."""
    try:
        unzipper = zlib.decompressobj()
        return unpack(unzipper.decompress(content, MOST_BYTES), {SurfaceSpectrum.__name__: SurfaceSpectrum})
    except (DamagedError, zlib.error) as error:
        raise StoreError(f"The spectra of the photosphere grid in this queue ({digest[:DIGITS]}) are damaged.") from error
