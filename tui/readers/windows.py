"""Event windows of light curves in a table of their own: `name, event, start, end` and, optional, `band`.

The times count as those of the light curves do: a window takes the points from its start to its end, both included,
and one without a band takes them in every band. A point in two windows belongs to the one that is given first.
"""

from __future__ import annotations

import os
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from tui.model import Band, FloatArray
from tui.readers.cells import quoted
from tui.readers.columnmap import ColumnMap, read_column_map
from tui.readers.files import open_table
from tui.readers.native import band_name
from tui.readers.records import Refused
from tui.readers.sidetable import SideTable

TELLING = frozenset({"start", "end"})
OTHERS = frozenset({"depth", "flux", "mag"})  # what a table of dips has, and one of windows has not


@dataclass(frozen=True, slots=True)
class Window:
    """One event's stretch of time."""

    event: str
    band: str  # "" for all
    start: float
    end: float
    place: Refused  # how it is refused if no light curve reaches it


@dataclass(slots=True)
class Windows:
    """All windows by candidate, and which of them a light curve has reached."""

    by_name: dict[str, list[Window]] = field(default_factory=dict)
    refused: list[Refused] = field(default_factory=list)
    unit: str = ""  # of the times, "" where none is given
    reached: set[Window] = field(default_factory=set)

    def events(self, name: str, band: str, times: FloatArray) -> list[str]:
        """The event of each time of one light curve, "" outside all windows."""
        found, order = [""] * len(times), np.argsort(times)
        ordered = times[order]
        for window in self.by_name.get(name, ()):
            if window.band not in ("", band):
                continue
            first, last = np.searchsorted(ordered, window.start), np.searchsorted(ordered, window.end, side="right")
            for place in order[first:last].tolist():
                found[place] = found[place] or window.event
                self.reached.add(window)
        return found

    def unreached(self) -> list[Refused]:
        """Windows in which no light curve has a point."""
        return [one.place for windows in self.by_name.values() for one in windows if one not in self.reached]


def is_windows(path: str | os.PathLike[str], columns: ColumnMap) -> bool:
    """Whether a table is one of windows, by its columns.

    Raises:
        TableError: the file cannot be read.
    """
    names = {name.lower() for name in open_table(path).columns} | set(columns.columns)
    return names >= TELLING and not names & OTHERS


def read_windows(
    paths: Iterable[str | os.PathLike[str]],
    bands: Mapping[str, Band],
    aliases: Mapping[str, str],
    *,
    columns: str | os.PathLike[str] | None = None,
) -> tuple[Windows, list[str]]:
    """The windows of those tables that hold windows, and the paths of the others.

    Raises:
        TableError: a file cannot be read.
    """
    windows, others, column_map = Windows(), [], read_column_map(columns)
    for path in paths:
        if is_windows(path, column_map):
            _add(windows, SideTable(path, column_map, ("name", "start", "end"), ("event", "band")), bands, aliases)
        else:
            others.append(os.fspath(path))
    return windows, others


def _add(windows: Windows, side: SideTable, bands: Mapping[str, Band], aliases: Mapping[str, str]) -> None:
    start, end = side.numbers("start"), side.numbers("end")
    events, given = side.texts("event"), side.texts("band")
    windows.unit = windows.unit or side.columns["start"].unit
    for row in np.flatnonzero(side.usable).tolist():
        band = band_name(given[row], bands, aliases) if given[row] else ""
        if given[row] and not band:
            side.refuse(row, "band", f"{quoted(given[row])} is no known band")
        elif not start[row] <= end[row]:
            side.refuse(row, "end", "a window needs a start, and an end that is not before it")
        else:
            mine = windows.by_name.setdefault(side.names[row], [])
            mine.append(Window(events[row] or _next(mine), band, float(start[row]), float(end[row]), _place(side, row)))
    windows.refused += side.refused


def _next(windows: Sequence[Window]) -> str:
    """A name for a window without one: its number among the candidate's."""
    return str(len(windows) + 1)


def _place(side: SideTable, row: int) -> Refused:
    return Refused(
        side.table.path, int(side.table.row_numbers[row]), "start", "no light curve of the load has a point in it"
    )
