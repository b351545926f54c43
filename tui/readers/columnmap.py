"""The column map: a TOML file that says what a table's columns are.

[columns]
J_mag = "jmag"            # what it is = the file's column
[units]
W4_flux = "mJy"           # by either name
[source]
label = "my survey"       # for all bands that have no catalogue of their own
J = "UKIDSS"              # for one band
[bands.Hcont]             # a band of one's own
pivot_um = 1.57           # or: curve = "hcont.csv", two columns: micron, response
zero_point_jy = 1050.0
"""

from __future__ import annotations

import os
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from tui.errors import InputError, TableError, reason_of
from tui.model import Band
from tui.readers.userbands import user_band

SECTIONS = ("columns", "units", "source", "bands")
LARGEST_MAP = 1_000_000  # bytes


@dataclass(frozen=True, slots=True)
class ColumnMap:
    """A column map as read; empty where there is none."""

    path: str = ""
    columns: Mapping[str, str] = field(default_factory=dict)  # what it is -> the file's column
    units: Mapping[str, str] = field(default_factory=dict)
    sources: Mapping[str, str] = field(default_factory=dict)  # band -> label
    label: str = ""
    bands: Mapping[str, Band] = field(default_factory=dict)


def read_column_map(path: str | os.PathLike[str] | None) -> ColumnMap:
    """The column map of a file; the empty one for None.

    Raises:
        TableError: it cannot be read, is no TOML, or holds what no column map has.
    """
    if path is None:
        return ColumnMap()
    shown = os.fspath(path)
    try:
        if os.path.getsize(shown) > LARGEST_MAP:
            raise TableError(shown, "a column map is a short text; this file is not.")
        content = tomllib.loads(Path(shown).read_bytes().decode("utf-8"))
    except (OSError, UnicodeDecodeError, tomllib.TOMLDecodeError, RecursionError, ValueError) as error:
        if isinstance(error, TableError):
            raise
        why = str(error) if isinstance(error, tomllib.TOMLDecodeError) else reason_of(error)
        raise TableError(shown, f"the column map cannot be read: {why}.") from error
    for section, entries in content.items():
        if section not in SECTIONS or not isinstance(entries, dict):
            raise TableError(
                shown, f"a column map has the parts {', '.join(f'[{s}]' for s in SECTIONS)}, not {section!a}."
            )
    sources = _texts(shown, "source", content)
    label = sources.pop("label", "")
    bands = {name: _band(shown, name, entry) for name, entry in content.get("bands", {}).items()}
    return ColumnMap(shown, _texts(shown, "columns", content), _texts(shown, "units", content), sources, label, bands)


def _texts(path: str, section: str, content: Mapping[str, Any]) -> dict[str, str]:
    entries = content.get(section, {})
    for key, value in entries.items():
        if not isinstance(value, str):
            raise TableError(path, f"[{section}] {key} must be a text in quotes.")
    return dict(entries)


def _band(path: str, name: str, entry: Any) -> Band:
    try:
        return user_band(name, entry, Path(path).parent)
    except InputError as error:
        raise error if isinstance(error, TableError) else TableError(path, str(error)) from error
