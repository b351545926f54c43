"""Light curves with event windows, to the depth of each event in each band.

A row is a point: `name, band, flux` or `mag`, `error`, `event`. Points whose `event` is empty lie outside all events
and give the level; the points of an event give its depth as a mean over the window, which compares bands without
favouring the noisier one as the deepest point would. In place of `event`, the windows may be a table of their own, to
which each point's `time` is compared (`windows.py`).
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Mapping

import numpy as np

from tui.errors import TableError
from tui.model import Band, Dip, FloatArray
from tui.readers.cells import quoted
from tui.readers.native import band_name
from tui.readers.records import SideContents
from tui.readers.sidetable import SideTable
from tui.readers.windows import Windows

FEWEST_OUTSIDE = 3  # points outside all events, without which there is no level

Groups = dict[tuple[str, str], dict[str, list[int]]]  # (name, band) -> event -> rows; "" outside all events


def light_curve_dips(
    side: SideTable, bands: Mapping[str, Band], aliases: Mapping[str, str], windows: Windows | None = None
) -> SideContents:
    """The depths of all events.

    Raises:
        TableError: the table has neither depths nor light curves, or nothing says where the events are.
    """
    key = "flux" if "flux" in side.columns else "mag"
    known = windows is not None and windows.by_name
    _check_columns(side, key, windows if known else None)
    flux, error = _fluxes(side, key)
    groups = _groups(side, bands, aliases, key, flux)
    if known:
        groups = _by_window(side, groups, windows)
    found: dict[str, list[Dip]] = defaultdict(list)
    for (name, band), events in groups.items():
        outside = events.pop("", [])
        if len(outside) < FEWEST_OUTSIDE:
            for rows in events.values():
                side.refuse(rows[0], "event", f"{band} has fewer than {FEWEST_OUTSIDE} points outside all events")
            continue
        usual = _usual(flux, error, outside)
        for event, rows in events.items():
            dip = _dip(event, band, flux, error, rows, usual)
            if -1 < dip.depth <= 1:
                found[name].append(dip)
            else:
                side.refuse(rows[0], key, f"the light curve gives no depth of {event} in {band} between -1 and 1")
    return SideContents({name: tuple(dips) for name, dips in found.items() if dips}, side.refused, side.unknown)


def _check_columns(side: SideTable, key: str, windows: Windows | None) -> None:
    path = side.table.path
    if key not in side.columns or not ("event" in side.columns or windows or "time" in side.columns):
        raise TableError(path, "there is no column 'depth', nor flux (or mag) and event of light curves.")
    if windows is None and "event" not in side.columns:
        mend = "add a column 'event', or give their windows (name, event, start, end) as another table of dips"
        raise TableError(path, f"nothing says where the events of these light curves are: {mend}.")
    if windows is not None and "event" not in side.columns and "time" not in side.columns:
        raise TableError(path, "windows are given, but there is no column 'time' to compare with them.")
    own = side.columns["time"].unit if "time" in side.columns else ""
    if windows is not None and own and windows.unit and own.strip() != windows.unit.strip():
        raise TableError(path, f"its times are in {own!a}, those of the windows in {windows.unit!a}: use one unit.")


def _by_window(side: SideTable, groups: Groups, windows: Windows) -> Groups:
    """The points without an event, put into the windows that hold their times."""
    if "time" not in side.columns:
        return groups
    times = side.numbers("time")
    for (name, band), events in groups.items():
        if name not in windows.by_name:
            continue
        free = [row for row in events.pop("", []) if not math.isnan(times[row]) or _refuse_time(side, row)]
        for row, event in zip(free, windows.events(name, band, times[free]), strict=True):
            events[event].append(row)
    return groups


def _refuse_time(side: SideTable, row: int) -> bool:
    if side.usable[row]:  # else its cell was refused already
        side.refuse(row, "time", "no time is given")
    return False


def _fluxes(side: SideTable, key: str) -> tuple[FloatArray, FloatArray]:
    """Fluxes on any scale and their errors, NaN where none is given."""
    values, error = side.numbers(key), side.numbers("error")
    with np.errstate(over="ignore", invalid="ignore"):
        if key == "mag":
            flux = 10.0 ** (-0.4 * values)
            error = 0.4 * math.log(10) * flux * error
        else:
            flux = values
        return np.where(np.isfinite(flux), flux, math.nan), np.where(error > 0, error, math.nan)


def _groups(
    side: SideTable, bands: Mapping[str, Band], aliases: Mapping[str, str], key: str, flux: FloatArray
) -> Groups:
    """Rows by candidate, band and event."""
    given, events = side.texts("band"), side.texts("event")
    groups: Groups = defaultdict(lambda: defaultdict(list))
    for row in np.flatnonzero(side.usable).tolist():
        band = band_name(given[row], bands, aliases)
        if not band:
            side.refuse(row, "band", f"{quoted(given[row])} is no known band")
        elif math.isnan(flux[row]):
            side.refuse(row, key, "no flux is given")
        else:
            groups[side.names[row], band][events[row]].append(row)
    return groups


def _usual(flux: FloatArray, error: FloatArray, outside: list[int]) -> tuple[float, float, float]:
    """The level outside all events, its error, and the spread about it, for points without an error of their own."""
    spread = float(np.std(flux[outside], ddof=1))
    return *_mean(flux[outside], _sigma(error, outside, spread)), spread


def _sigma(error: FloatArray, rows: list[int], spread: float) -> FloatArray:
    return np.where(np.isfinite(error[rows]), error[rows], spread)


def _dip(
    event: str, band: str, flux: FloatArray, error: FloatArray, rows: list[int], usual: tuple[float, float, float]
) -> Dip:
    """Depth 1 - inside/outside, with both means' errors."""
    level, level_error, spread = usual
    low, low_error = _mean(flux[rows], _sigma(error, rows, spread))
    ratio = low / level if level else math.nan
    ratio_error = math.hypot(low_error, ratio * level_error) / abs(level) if level else math.nan
    return Dip(event, band, 1.0 - ratio, ratio_error if ratio_error > 0 else math.nan)


def _mean(flux: FloatArray, sigma: FloatArray) -> tuple[float, float]:
    """Weighted mean and its error; a plain mean where the errors are all zero."""
    if not np.all(sigma > 0):
        return float(np.mean(flux)), 0.0
    weight = sigma**-2.0
    return float(np.sum(weight * flux) / np.sum(weight)), float(np.sum(weight) ** -0.5)
