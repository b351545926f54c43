"""Template grids for a queue's settings: built once, kept in the user's cache by what they are made of."""

from __future__ import annotations

import contextlib
import hashlib
import os
import tempfile
import threading
from collections import OrderedDict
from collections.abc import Mapping
from functools import cache
from dataclasses import replace
from importlib.resources import files
from pathlib import Path
from typing import TYPE_CHECKING, Any

from tui.errors import SettingError
from tui.model import Band, Settings, digest
from tui.workflow.grid_file import DamagedError, pack, unpack

if TYPE_CHECKING:
    from tui.physics.photosphere import Photosphere
    from tui.physics.templates import Templates

KEPT_IN_MEMORY = 4
KEPT_ON_DISK = 24
_GRID_SETTINGS = ("photosphere", "law", "r_v", "source_floor", "floors")
_memory: OrderedDict[str, Templates] = OrderedDict()
_lock = threading.Lock()


def templates_for(settings: Settings, user_bands: Mapping[str, Band] | None = None, queue: str = "") -> Templates:
    """The grids for some settings: from memory, else from the disk cache, else built and kept.

    Safe under threads and under several processes; a damaged file is built again.

    Args:
        queue: path of the queue that carries the user's spectra, where `photosphere` names some.

    Raises:
        SettingError: R_V is neither a number nor `free`.
        TemplateError: there is no such photosphere source.
    """
    key = cache_key(settings, user_bands or {})
    with _lock:
        found = _memory.get(key)
        if found is None:
            found = read_cached(key) or keep(key, build(settings, user_bands or {}, queue))
            _memory[key] = found
        _memory.move_to_end(key)
        while len(_memory) > KEPT_IN_MEMORY:
            _memory.popitem(last=False)
    return found


def templates_digest(settings: Settings, user_bands: Mapping[str, Band] | None = None) -> str:
    """Digest of all that the grids are made of, the same on every machine; needs no grids."""
    from tui.physics.templates import VERSION

    return digest(
        {
            "version": VERSION,
            "tables": packaged_digest(),
            "bands": {
                name: [getattr(band, part) for part in Band.__slots__] for name, band in (user_bands or {}).items()
            },
            "settings": {name: getattr(settings, name) for name in _GRID_SETTINGS},
        }
    )


def cache_key(settings: Settings, user_bands: Mapping[str, Band]) -> str:
    """Name of the grids in the cache: it changes with tables, settings and the code that builds."""
    return digest([templates_digest(settings, user_bands), code_digest()])[:40]


@cache
def packaged_digest() -> str:
    """Digest of the packaged tables that evidence rests on: all but the one that describes facts."""
    folder = files("tui.data")
    tables = [*folder.iterdir(), *folder.joinpath("bandpasses").iterdir()]
    used = [path for path in tables if path.name.endswith(".csv") and path.name != "facts.csv"]
    return content_digest(sorted(used, key=lambda path: path.name))


@cache
def code_digest() -> str:
    """Digest of the modules of physics and of numpy's version: grids of other code are never read."""
    import numpy as np

    modules = [path for path in files("tui.physics").iterdir() if path.name.endswith(".py")]
    return digest([content_digest(sorted(modules, key=lambda path: path.name)), np.__version__])


def content_digest(paths: list[Any]) -> str:
    """SHA-256 of some files' names and contents."""
    total = hashlib.sha256()
    for path in paths:
        total.update(path.name.encode() + b"\0" + hashlib.sha256(path.read_bytes()).digest())
    return total.hexdigest()


def build(settings: Settings, user_bands: Mapping[str, Band], queue: str = "") -> Templates:
    """Build the grids from the packaged tables and, for a grid, the queue's spectra; seconds."""
    from tui.data import load
    from tui.physics.spectral import INSTRUMENT, POINT_FLOOR, broad_bands

    packaged = load.bands()
    bands = [*packaged.values(), *(band for name, band in user_bands.items() if name not in packaged)]
    wide = list(broad_bands(settings.floors.get(INSTRUMENT, POINT_FLOOR)))
    return replace(grids_through(bands, settings, queue), broad=grids_through(wide, settings, queue))


def grids_through(bands: list[Band], settings: Settings, queue: str = "") -> Templates:
    """The grids through some bands."""
    from tui.data import load
    from tui.physics.templates import Spread, build_templates

    photosphere = photosphere_of(settings.photosphere, bands, queue)
    spreads = [
        Spread(
            row["photosphere"],
            row["bands"],
            *(load.number(row[name]) for name in ("low_k", "high_k", "short_um", "long_um", "spread")),
        )
        for row in load.spreads()
    ]
    return build_templates(
        bands,
        photosphere,
        settings.law,
        spreads,
        r_v=fixed_r_v(settings),
        source_floor=settings.source_floor,
        floors=settings.floors,
    )


def photosphere_of(source: str, bands: list[Band], queue: str) -> Photosphere:
    """The photosphere source of the settings, through `bands`."""
    from tui.data import load
    from tui.physics.templates import build_photosphere

    if not source.startswith("grid"):
        return build_photosphere(source, load.dwarfs(), bands, load.bands())
    from tui.physics.grid import grid_photosphere
    from tui.store.connect import open_queue
    from tui.workflow.grid_photosphere import kept_spectra

    with contextlib.closing(open_queue(queue, write=False)) as connection:
        spectra = kept_spectra(connection, source)
    return grid_photosphere(source, spectra, bands)


def fixed_r_v(settings: Settings) -> float | None:
    """The one R_V of the settings, or None where it is free."""
    if settings.r_v == "free":
        return None
    try:
        return float(settings.r_v)
    except ValueError as error:
        raise SettingError("r_v", f"{settings.r_v!r} is neither a number nor free.") from error


def cache_folder() -> Path:
    """Where grids are kept: `PLAINLIGHT_CACHE`, else the user's cache folder."""
    named = os.environ.get("PLAINLIGHT_CACHE")
    if named:
        return Path(named).expanduser()
    import platformdirs

    return platformdirs.user_cache_path("plainlight")


def cached_path(key: str) -> Path:
    """The file that holds the grids of one key."""
    return cache_folder() / f"grids-{key}.bin"


def read_cached(key: str) -> Templates | None:
    """Grids from the disk; None where there are none, or they are damaged."""
    from tui.physics.reddening import Reddening
    from tui.physics.sources import SourceGrid
    from tui.physics.templates import Spread, Templates

    types = {one.__name__: one for one in (Templates, SourceGrid, Reddening, Spread, Band)}
    try:
        found = unpack(cached_path(key).read_bytes(), types)
    except (OSError, DamagedError):
        return None
    return found if isinstance(found, Templates) else None


def keep(key: str, templates: Templates) -> Templates:
    """Write grids to the cache, whole or not at all; a cache that cannot be written costs only time."""
    target = cached_path(key)
    with contextlib.suppress(OSError):
        target.parent.mkdir(parents=True, exist_ok=True)
        handle, scratch = tempfile.mkstemp(prefix=".grids-", dir=target.parent)
        try:
            with os.fdopen(handle, "wb") as stream:
                stream.write(pack(templates))
            os.replace(scratch, target)
        except BaseException:
            with contextlib.suppress(OSError):
                os.unlink(scratch)
            raise
        make_room(target.parent)
    return templates


def make_room(folder: Path) -> None:
    """Remove all but the newest grids."""
    kept = sorted(folder.glob("grids-*.bin"), key=lambda path: path.stat().st_mtime, reverse=True)
    for path in kept[KEPT_ON_DISK:]:
        path.unlink(missing_ok=True)
