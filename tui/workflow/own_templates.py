"""The user's templates: spectra of natural sources outside the thermal mixture, carried in the queue by their content."""

from __future__ import annotations

import re
import sqlite3
import zlib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

from tui.errors import SettingError, StoreError, TableError
from tui.model import FloatArray
from tui.physics.natural_sources import GivenSpectrum
from tui.store.sides import attach, attachments
from tui.workflow.grid_file import DamagedError, pack, unpack
from tui.workflow.grid_spectra import read_shapes
from tui.workflow.safe_text import safe

KIND = "templates"  # of the attachments that carry them
PREFIX = "templates:"  # of the setting's value, before the first digits of the digest of the spectra
DIGITS = 16
KEY = re.compile(PREFIX + r"([0-9a-f]{16,64})(?: |$)")
MOST = 50  # templates; each adds some 600 columns to the cone
MOST_BYTES = 200_000_000  # of spectra taken out of a queue
LONGEST_NAME = 40


@dataclass(frozen=True, slots=True, eq=False)
class OwnTemplate:
    """One spectrum: shape (N,) each, wavelength in micron increasing, flux density in Jy at any scale."""

    name: str
    wave_um: FloatArray
    flux_jy: FloatArray


def keep_templates(connection: sqlite3.Connection, folder: str) -> str:
    """Carry the spectra of a folder in the queue; the value that the setting `templates` then takes.

    Raises:
        TableError: the folder or a spectrum cannot be used, or two have one name.
    """
    found = read_shapes(folder)
    if len(found) > MOST:
        raise TableError(folder, f"it holds {len(found)} spectra; at most {MOST} can be templates.")
    kept = tuple(OwnTemplate(name_of(path), wave, flux) for path, wave, flux in found)
    names = [one.name for one in kept]
    for name in names:
        if names.count(name) > 1:
            raise TableError(folder, f"two spectra are named {name}; rename one of the files.")
    content = zlib.compress(pack(kept), 6)
    title = safe(Path(folder).expanduser().resolve().name)[:60] or "templates"
    digest = attach(connection, KIND, title, content)
    return f"{PREFIX}{digest[:DIGITS]} {title} ({', '.join(names)})"


def name_of(path: Path) -> str:
    """What a template is called: its file's name without ending."""
    return safe(path.stem)[:LONGEST_NAME] or "unnamed"


def kept_templates(connection: sqlite3.Connection, setting: str) -> dict[str, GivenSpectrum]:
    """The spectra that a value of the setting names, by name; none where it is empty.

    Raises:
        SettingError: the queue does not hold them.
        StoreError: they are damaged.
    """
    if not setting:
        return {}
    named = KEY.match(setting)
    for one in attachments(connection, KIND) if named else ():
        if one.digest.startswith(named[1]):
            return {each.name: (each.wave_um, each.flux_jy) for each in unpacked(one.digest, one.content)}
    raise SettingError("templates", "the queue does not hold the spectra that it names; set it anew with a folder.")


def unpacked(digest: str, content: bytes) -> Sequence[OwnTemplate]:
    """Spectra from what a queue holds under `digest`. StoreError where they are damaged."""
    types: Mapping[str, type] = {OwnTemplate.__name__: OwnTemplate}
    try:
        return unpack(zlib.decompressobj().decompress(content, MOST_BYTES), types)
    except (DamagedError, zlib.error) as error:
        raise StoreError(f"The templates in this queue ({digest[:DIGITS]}) are damaged.") from error
