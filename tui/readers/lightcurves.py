"""Light curves with event windows, to the depth of each event in each band.

A row is a point: `name, band, flux` or `mag`, `error`, `event`. Points whose `event` is empty lie outside all events
and give the level; the points of an event give its depth as a mean over the window, which compares bands without
favouring the noisier one as the deepest point would.
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

FEWEST_OUTSIDE = 3  # points outside all events, without which there is no level

Groups = dict[tuple[str, str], dict[str, list[int]]]  # (name, band) -> event -> rows; "" outside all events


def light_curve_dips(side: SideTable, bands: Mapping[str, Band], aliases: Mapping[str, str]) -> SideContents:
    """The depths of all events.

    Raises:
        TableError: the table has neither depths nor light curves.
    """
    key = "flux" if "flux" in side.columns else "mag"
    if key not in side.columns or "event" not in side.columns:
        raise TableError(side.table.path, "there is no column 'depth', nor flux (or mag) and event of light curves.")
    flux, error = _fluxes(side, key)
    groups = _groups(side, bands, aliases, key, flux)
    found: dict[str, list[Dip]] = defaultdict(list)
    for (name, band), events in groups.items():
        outside = events.pop("", [])
        if len(outside) < FEWEST_OUTSIDE:
            for rows in events.values():
                side.refuse(rows[0], "event", f"{band} has fewer than {FEWEST_OUTSIDE} points outside all events")
            continue
        for event, rows in events.items():
            dip = _dip(event, band, flux, error, rows, outside)
            if -1 < dip.depth <= 1:
                found[name].append(dip)
            else:
                side.refuse(rows[0], key, f"the light curve gives no depth of {event} in {band} between -1 and 1")
    return SideContents({name: tuple(dips) for name, dips in found.items() if dips}, side.refused, side.unknown)


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


def _dip(event: str, band: str, flux: FloatArray, error: FloatArray, rows: list[int], outside: list[int]) -> Dip:
    """Depth 1 - inside/outside, with both means' errors."""
    spread = float(np.std(flux[outside], ddof=1))  # where a point has no error of its own
    sigma = np.where(np.isfinite(error), error, spread)
    level, level_error = _mean(flux[outside], sigma[outside])
    low, low_error = _mean(flux[rows], sigma[rows])
    ratio = low / level if level else math.nan
    ratio_error = math.hypot(low_error, ratio * level_error) / abs(level) if level else math.nan
    return Dip(event, band, 1.0 - ratio, ratio_error if ratio_error > 0 else math.nan)


def _mean(flux: FloatArray, sigma: FloatArray) -> tuple[float, float]:
    """Weighted mean and its error; a plain mean where the errors are all zero."""
    if not np.all(sigma > 0):
        return float(np.mean(flux)), 0.0
    weight = sigma**-2.0
    return float(np.sum(weight * flux) / np.sum(weight)), float(np.sum(weight) ** -0.5)
