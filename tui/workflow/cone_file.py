"""The mixture bound's columns in the user's cache: one file, read band by band, each band checked by its digest.

Layout, little-endian: MAGIC, length of the head (8 bytes), the head as `grid_file.pack` writes it, zeros to a multiple
of ALIGNED, then a row of float32 per band, each as long as there are columns.
"""

from __future__ import annotations

import hashlib
import threading
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from tui.model import FloatArray
from tui.physics.generators import Family, Generators, Layout
from tui.physics.natural_sources import GivenSpectrum, generators_of
from tui.physics.templates import Templates
from tui.workflow.cache_file import cache_folder, write_cached
from tui.workflow.grid_file import DamagedError, pack, unpack

MAGIC = b"plainlight cone 1\n"
KEPT_ON_DISK = 3  # each some 60 MB
ALIGNED = 64
_LENGTH = 8
Row = NDArray[np.float32]


@dataclass(frozen=True, slots=True, eq=False)
class Head:
    """What a file holds."""

    names: tuple[str, ...]  # bands
    digests: tuple[str, ...]  # SHA-256 of each band's row
    columns: int
    layout: Layout


@dataclass(eq=False)
class KeptCone:
    """Where the columns of some templates come from: memory, else the disk, else they are built and kept.

    Safe under threads and under several processes; a damaged file is built again.
    """

    key: str  # names the file: it changes with whatever the columns are made of
    base: Templates
    user: Mapping[str, GivenSpectrum]  # natural sources that the user adds, by name

    def __post_init__(self) -> None:
        self._lock = threading.Lock()
        self._layout: Layout | None = None
        self._rows: dict[str, Row] = {}

    @property
    def added(self) -> tuple[str, ...]:
        """Names of the user's own sources."""
        return tuple(self.user)

    def __call__(self, templates: Templates, names: Sequence[str]) -> Generators:
        """The columns in some bands of `templates`; those of a spectrum's points are built each time."""
        if not set(names) <= set(self.base.names):
            place = {name: column for column, name in enumerate(templates.names)}
            return generators_of(templates, self.user).through([place[name] for name in names])
        with self._lock:
            if self._layout is None or not all(name in self._rows for name in names):
                self._fetch(names)
            assert self._layout is not None
            return Generators(tuple(self._rows[name] for name in names), self._layout)

    def _fetch(self, names: Sequence[str]) -> None:
        path = cone_path(self.key)
        try:
            self._layout, rows = read_rows(path, [name for name in names if name not in self._rows])
            self._rows |= rows
        except (OSError, DamagedError):
            made = generators_of(self.base, self.user)
            write_rows(path, self.base.names, made)
            self._layout, self._rows = made.layout, dict(zip(self.base.names, made.rows, strict=True))


def cone_path(key: str) -> Path:
    """The file that holds the columns of one key."""
    return cache_folder() / f"cone-{key}.bin"


def write_rows(path: Path, names: Sequence[str], made: Generators) -> None:
    """Keep all columns, whole or not at all."""
    rows = [np.ascontiguousarray(row, dtype="<f4") for row in made.rows]
    digests = tuple(hashlib.sha256(row).hexdigest() for row in rows)
    head = pack(Head(tuple(names), digests, rows[0].size, made.layout))
    start = MAGIC + len(head).to_bytes(_LENGTH, "little") + head
    write_cached(path, [start, bytes(-len(start) % ALIGNED), *rows], KEPT_ON_DISK)


def read_rows(path: Path, names: Sequence[str]) -> tuple[Layout, dict[str, Row]]:
    """Layout and the rows of some bands.

    Raises:
        OSError: there is no such file, or it cannot be read.
        DamagedError: it is not what was written.
    """
    with path.open("rb") as stream:
        if stream.read(len(MAGIC)) != MAGIC:
            raise DamagedError("no columns, or damaged")
        size = int.from_bytes(stream.read(_LENGTH), "little")
        types = {one.__name__: one for one in (Head, Layout, Family)}
        head = unpack(stream.read(min(size, path.stat().st_size)), types)
        if not isinstance(head, Head):
            raise DamagedError("something else than columns")
        first = -(-(len(MAGIC) + _LENGTH + size) // ALIGNED) * ALIGNED
        rows = {}
        for name in names:
            if name not in head.names:
                raise DamagedError(f"the columns lack the band {name}")
            place = head.names.index(name)
            stream.seek(first + 4 * head.columns * place)
            row = np.fromfile(stream, "<f4", head.columns)
            if hashlib.sha256(row).hexdigest() != head.digests[place]:
                raise DamagedError(f"the columns of {name} are damaged")
            rows[name] = row
    return head.layout, rows
