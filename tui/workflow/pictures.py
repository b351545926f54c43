"""Load cutouts: a folder of FITS pictures NAME_BAND.fits, each of which may be damaged or hostile."""

from __future__ import annotations

import math
import sqlite3
import warnings
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any
from urllib.parse import unquote

import numpy as np

from tui.errors import TableError, reason_of
from tui.model import Band
from tui.store.candidates import ids_of
from tui.store.records import Cutout
from tui.store.sides import MAX_PIXELS, save_cutout
from tui.workflow.clock import utc_now
from tui.workflow.vocabulary import packaged_vocabulary

if TYPE_CHECKING:
    from tui.workflow.loading import Loaded

ENDINGS = (".fits", ".fit", ".fts")
MAX_BYTES = 64_000_000  # of one file: far more than a cutout of MAX_PIXELS needs
MAX_HEAD = 288_000  # bytes of the first head: a hundred blocks of 36 cards; usual ones have one to five
MAX_HDUS = 16  # looked at before a picture must have been found
TOLD = ("BUNIT", "TELESCOP", "INSTRUME", "DATE-OBS", "SURVEY")  # header cards kept with the picture
# What a packed file begins with, and what unpacks it. A small packed file can hold more than any memory does.
PACKED = {b"\x1f\x8b": "gunzip", b"BZh": "bunzip2", b"PK": "unzip", b"\xfd7zXZ": "unxz", b"\x1f\x9d": "uncompress"}
FITS_START, FITS_END = b"SIMPLE", b"END".ljust(80)


def load_cutouts(connection: sqlite3.Connection, folder: str, bands: Mapping[str, Band], done: Loaded) -> None:
    """Add every picture of a folder to its candidate; what cannot be taken is listed in `done`, one line each.

    Raises:
        TableError: there is no such folder.
    """
    place = Path(folder)
    if not place.is_dir():
        raise TableError(folder, "there is no such folder of cutouts.")
    words = (*bands, *packaged_vocabulary().aliases)
    paths = sorted(one for one in place.iterdir() if one.suffix.lower() in ENDINGS)
    if not paths:
        done.remarks.append(f"{folder}: there is no picture NAME_BAND.fits in this folder.")
    for path in paths:
        reason = load_cutout(connection, path, words, done)
        if reason:
            done.refused.append(f"{path}: {reason}")


def load_cutout(connection: sqlite3.Connection, path: Path, words: Iterable[str], done: Loaded) -> str:
    """Add one picture; the reason why it cannot be taken, or ''."""
    name, word = name_and_band(path.stem, words)
    if not word:
        return "the name must end in _BAND, such as SM-0001_W3.fits."
    if name not in ids_of(connection, [name]):
        return f"no candidate {name!r} is in the queue; load its table first."
    band = packaged_vocabulary().aliases.get(word, word)
    picture = read_picture(path, band)
    if isinstance(picture, str):
        return picture
    done.found += 1
    done.counts["cutouts"] += save_cutout(connection, name, picture, utc_now())
    return ""


def name_and_band(stem: str, words: Iterable[str]) -> tuple[str, str]:
    """Candidate and band of a file's stem: the longest band or alias that ends it; '' for a band when none does.

    >>> name_and_band("SM%2F1_Gaia_G", ["G", "Gaia_G"])
    ('SM/1', 'Gaia_G')
    """
    fitting = [word for word in words if stem.endswith(f"_{word}") and len(stem) > len(word) + 1]
    word = max(fitting, key=len, default="")
    return (unquote(stem[: -len(word) - 1]), word) if word else (unquote(stem), "")


def read_picture(path: Path, band: str) -> Cutout | str:
    """The first picture of a FITS file, or the reason why there is none; its size is read before its pixels."""
    from astropy.io import fits
    from astropy.utils.exceptions import AstropyWarning

    try:
        if path.stat().st_size > MAX_BYTES:
            return f"the file is larger than {MAX_BYTES // 1_000_000} MB; cut it to the candidate's surroundings."
        with path.open("rb") as stream:
            head = stream.read(MAX_HEAD)
        start = head[:6]
        for magic, mend in PACKED.items():
            if start.startswith(magic):
                return f"the file is compressed: unpack it first ({mend})."
        if start != FITS_START:
            return "the file does not begin as a FITS file does."
        if len(head) == MAX_HEAD and not any(head[at : at + 80] == FITS_END for at in range(0, MAX_HEAD, 80)):
            return f"its head is longer than {MAX_HEAD // 1000} kB; no picture needs so many cards."
        with warnings.catch_warnings():
            warnings.simplefilter("ignore", AstropyWarning)
            with fits.open(path, memmap=False, lazy_load_hdus=True, disable_image_compression=True) as hdus:
                return picture_of(hdus, path, band)
    except (OSError, ValueError, TypeError, KeyError, IndexError, AttributeError, MemoryError) as error:
        return f"the picture cannot be read: {reason_of(error)}."


def picture_of(hdus: Any, path: Path, band: str) -> Cutout | str:
    """The first part of an open FITS file that is a picture."""
    for number in range(MAX_HDUS):
        try:
            part = hdus[number]
        except IndexError:
            break
        if part.header.get("ZIMAGE") is True:
            return "the picture is compressed inside the file: unpack it first (funpack)."
        shape = tuple(getattr(part, "shape", ()) or ())
        if not getattr(part, "is_image", False) or not shape:
            continue
        if len(shape) != 2:
            return f"the picture has {len(shape)} axes; a cutout has two."
        if not 0 < math.prod(shape) <= MAX_PIXELS:
            return f"the picture has {shape[1]} x {shape[0]} pixels; a cutout has from 1 to {MAX_PIXELS}."
        image = np.asarray(part.data, dtype=np.float64)
        if not np.isfinite(image).any():
            return "the picture holds no number."
        return Cutout(band, image, arcsec_per_pixel(part.header), path.name, told(part.header))
    return "the file holds no picture."


def arcsec_per_pixel(header: Mapping[str, Any]) -> float:
    """Pixel scale from CDi_j, else from CDELTi, in degrees as the standard has them; NaN where the header has neither.

    Source: Greisen & Calabretta 2002, A&A 395, 1061: the area of a pixel is the determinant of the matrix.
    """
    names = ("CD1_1", "CD1_2", "CD2_1", "CD2_2")
    try:
        if "CD1_1" in header:
            a, b, c, d = (float(header.get(name, 0.0)) for name in names)
        else:
            a, b, c, d = float(header.get("CDELT1", math.nan)), 0.0, 0.0, float(header.get("CDELT2", math.nan))
    except (TypeError, ValueError):
        return math.nan
    scale = 3600.0 * math.sqrt(abs(a * d - b * c)) if math.isfinite(a * d - b * c) else math.nan
    return scale if scale > 0 else math.nan


def told(header: Mapping[str, Any]) -> dict[str, str]:
    """The cards that say what the picture is of."""
    return {name.lower(): str(header[name])[:80] for name in TOLD if name in header}
