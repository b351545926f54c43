"""The names that readers may meet: packaged bands, their aliases, facts, and the archives' columns."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from typing import TYPE_CHECKING

from tui.model import Band

if TYPE_CHECKING:
    from tui.readers.archives import Archive


@dataclass(frozen=True, slots=True)
class FactRow:
    """One fact that a table may give of a candidate."""

    name: str
    unit: str
    kind: str  # float, int, str or bool
    ucd: str = ""
    description: str = ""


@dataclass(frozen=True, slots=True)
class Vocabulary:
    """The names that readers may meet."""

    bands: Mapping[str, Band]
    aliases: Mapping[str, str]
    facts: Mapping[str, FactRow]
    archives: Sequence[Archive]


@cache
def packaged_vocabulary() -> Vocabulary:
    """What the program itself knows; a queue may add bands."""
    from importlib.resources import files

    from tui.data.load import band_aliases, bands
    from tui.readers.archives import parse_archives

    tables = [path for path in files("tui.data").joinpath("archives").iterdir() if path.name.endswith(".csv")]
    archives = parse_archives({path.name.removesuffix(".csv"): path.read_text("utf-8") for path in tables})
    return Vocabulary(bands(), band_aliases(), facts(), archives)


@cache
def facts() -> Mapping[str, FactRow]:
    """The packaged facts by name."""
    from tui.data.load import read_rows

    return {row["name"]: FactRow(**row) for row in read_rows("facts.csv")}
