"""What evidence rests on apart from the candidate: settings, the queue's own bands, and the grids made of them."""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cache
from typing import TYPE_CHECKING, Any

from tui.errors import StoreError
from tui.model import Band, Settings, canonical_json

if TYPE_CHECKING:
    from tui.checks.tables import Tables
    from tui.physics.templates import Templates

BAND_KIND = "band"  # of the attachments that carry a user's band
_ARRAYS = ("wave_um", "response")


@dataclass(frozen=True, slots=True)
class Basis:
    """Settings and the queue's own bands at one moment."""

    settings: Settings = field(default_factory=Settings)
    user_bands: Mapping[str, Band] = field(default_factory=dict)
    queue: str = ""  # path of the file that carries the spectra of a grid

    def templates(self) -> Templates:
        """The template grids; from memory or the disk cache where they are there."""
        from tui.workflow.memory import keep_freed_memory
        from tui.workflow.templates import templates_for

        keep_freed_memory()
        return templates_for(self.settings, self.user_bands, self.queue)

    def templates_digest(self) -> str:
        """Digest of all that the grids are made of."""
        from tui.workflow.templates import templates_digest

        return templates_digest(self.settings, self.user_bands)

    def tables(self) -> Tables:
        """Flags, Gaia's loci, galaxy counts and natural classes, for the checks of data quality and surroundings."""
        return packaged_tables()

    def bands(self) -> dict[str, Band]:
        """Every band by name, the packaged ones first."""
        from tui.data.load import bands

        return {**self.user_bands, **bands()}


@cache
def packaged_tables() -> Tables:
    """The tables that the program carries for the checks."""
    from tui.checks.tables import build_tables
    from tui.data import load_flags as rows

    return build_tables(
        rows.flag_rows(),
        rows.gaia_excess_rows(),
        rows.gaia_scatter_rows(),
        rows.galaxy_count_rows(),
        rows.natural_class_rows(),
    )


def read_basis(connection: sqlite3.Connection) -> Basis:
    """The basis as the queue has it now."""
    from tui.store.settings import read_settings
    from tui.store.sides import attachments

    newest = {one.name: band_from(one.content) for one in attachments(connection, BAND_KIND)}
    return Basis(read_settings(connection), newest, getattr(connection, "queue_path", ""))


def keep_bands(connection: sqlite3.Connection, bands: Mapping[str, Band]) -> None:
    """Carry a user's bands in the queue.

    Raises:
        StoreError: the queue has another band under that name.
    """
    from tui.store.sides import attach, attachments

    held = {one.name: one.content for one in attachments(connection, BAND_KIND)}
    for name, band in bands.items():
        content = band_text(band)
        if held.get(name, content) != content:
            raise StoreError(f"The queue has another band named {name}; give yours another name in the column map.")
        attach(connection, BAND_KIND, name, content)


def band_text(band: Band) -> bytes:
    """A band as bytes that are the same on every machine."""
    return canonical_json({name: getattr(band, name) for name in Band.__slots__}).encode("ascii")


def band_from(content: bytes) -> Band:
    """What `band_text` wrote."""
    import numpy as np  # most queues have no bands of their own

    fields: dict[str, Any] = json.loads(content)
    for name in _ARRAYS:
        fields[name] = np.array(fields[name], dtype=np.float64)
    nothing = {name: float("nan") for name, value in fields.items() if value is None}
    return Band(**(fields | nothing))
