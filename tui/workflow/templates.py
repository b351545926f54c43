"""Template grids for a queue's settings: built once, kept in the user's cache by what they are made of."""

from __future__ import annotations

import contextlib
import hashlib
import threading
from collections import OrderedDict
from collections.abc import Mapping
from dataclasses import replace
from functools import cache
from importlib.resources import files
from pathlib import Path
from typing import TYPE_CHECKING, Any

from tui.errors import SettingError
from tui.model import Band, Settings, digest
from tui.workflow.cache_file import cache_folder, write_cached
from tui.workflow.grid_file import DamagedError, pack, unpack

if TYPE_CHECKING:
    from tui.physics.natural_sources import GivenSpectrum
    from tui.physics.photosphere import Photosphere
    from tui.physics.templates import Templates

KEPT_IN_MEMORY = 4
KEPT_ON_DISK = 24
_GRID_SETTINGS = ("photosphere", "law", "r_v", "source_floor", "floors")
_CONE_SETTINGS = ("photosphere", "law", "templates")
_memory: OrderedDict[tuple[str, str], Templates] = OrderedDict()
_lock = threading.Lock()


def templates_for(settings: Settings, user_bands: Mapping[str, Band] | None = None, queue: str = "") -> Templates:
    """The grids for some settings: from memory, else from the disk cache, else built and kept.

    Safe under threads and under several processes; a damaged file is built again.

    Args:
        queue: path of the queue that carries the user's spectra, where `photosphere` or `templates` names some.

    Raises:
        SettingError: R_V is neither a number nor `free`; the queue lacks the spectra.
        TemplateError: there is no such photosphere source.
    """
    bands = user_bands or {}
    key, cone = cache_key(settings, bands), cone_key(settings, bands)
    with _lock:
        found = _memory.get((key, cone))
        if found is None:
            found = read_cached(key) or keep(key, build(settings, bands, queue))
            found = _memory[key, cone] = with_cone(found, cone, settings, queue)
        _memory.move_to_end((key, cone))
        while len(_memory) > KEPT_IN_MEMORY:
            _memory.popitem(last=False)
    return found


def with_cone(templates: Templates, key: str, settings: Settings, queue: str) -> Templates:
    """The grids, knowing where the mixture bound's columns are kept."""
    from tui.workflow.cone_file import KeptCone

    return replace(templates, cone=KeptCone(key, templates, user_spectra(settings.templates, queue)))


def user_spectra(setting: str, queue: str) -> dict[str, GivenSpectrum]:
    """The natural sources that a queue adds to those of the mixture bound, by name."""
    if not setting:
        return {}
    from tui.store.connect import open_queue
    from tui.workflow.own_templates import kept_templates

    with contextlib.closing(open_queue(queue, write=False)) as connection:
        return kept_templates(connection, setting)


def templates_digest(settings: Settings, user_bands: Mapping[str, Band] | None = None) -> str:
    """Digest of all that the grids are made of, the same on every machine; needs no grids."""
    from tui.physics.templates import VERSION

    return digest({"version": VERSION, **made_of(settings, _GRID_SETTINGS, user_bands or {})})


def made_of(settings: Settings, names: tuple[str, ...], user_bands: Mapping[str, Band]) -> dict[str, Any]:
    """What grids are made of: tables, the user's bands and some settings."""
    return {
        "tables": packaged_digest(),
        "bands": {name: [getattr(band, part) for part in Band.__slots__] for name, band in user_bands.items()},
        "settings": {name: getattr(settings, name) for name in names},
    }


def cache_key(settings: Settings, user_bands: Mapping[str, Band]) -> str:
    """Name of the grids in the cache: it changes with tables, settings and the code that builds."""
    return digest([templates_digest(settings, user_bands), code_digest()])[:40]


def cone_key(settings: Settings, user_bands: Mapping[str, Band]) -> str:
    """Name of the mixture bound's columns in the cache; floors and R_V have no part in them."""
    return digest([made_of(settings, _CONE_SETTINGS, user_bands), code_digest()])[:40]


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
    write_cached(cached_path(key), [pack(replace(templates, cone=None))], KEPT_ON_DISK)
    return templates
