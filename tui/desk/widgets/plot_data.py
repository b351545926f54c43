"""What a spectrum plot draws: points, curves, and which part of them is on view."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from tui.model import FloatArray

NU_FNU = 2.99792458e-12  # nu F_nu in W m-2 of 1 Jy at 1 micron: c in micron/s times 1e-26 (exact, SI 2019)
PAD_X = 0.08  # dex left free at both ends of the wavelength axis
PAD_Y = 0.12
MIN_SPAN = 0.2  # dex: as near as zooming goes
EMPTY_RANGE = (math.log10(0.3), math.log10(30.0))


@dataclass(frozen=True, slots=True)
class PlotPoint:
    """One measurement: flux densities in Jy, wavelengths in micron, pulls in sigma."""

    band: str
    wave_um: float
    low_um: float
    high_um: float
    flux_jy: float
    error_low_jy: float = 0.0
    error_high_jy: float = 0.0
    limit: bool = False
    dropped: bool = False
    pull: float = math.nan
    other_pull: float = math.nan  # of the fit compared with
    floor: float = 0.0  # calibration floor of the band, a share of the flux


@dataclass(frozen=True, slots=True)
class PlotCurve:
    """One line: shapes (N,), wavelength in micron, flux density in Jy. `role`: total, component, other or spectrum."""

    label: str
    wave_um: FloatArray
    flux_jy: FloatArray
    role: str = "component"
    letter: str = ""


@dataclass(frozen=True, slots=True)
class SpectrumPulls:
    """How far the points of the candidate's own spectrum lie from the model: shapes (N,), micron and sigma.

    `fitted`: they are in the fit, and the pulls are the fit's; else they are held against the drawn curve, in units of
    the spectrum's own errors.
    """

    wave_um: FloatArray
    pulls: FloatArray
    fitted: bool


@dataclass(frozen=True, slots=True)
class PlotData:
    """All that one plot shows of one candidate."""

    points: tuple[PlotPoint, ...] = ()
    curves: tuple[PlotCurve, ...] = ()
    spectrum: SpectrumPulls | None = None
    message: str = ""  # in place of curves: why there are none


@dataclass(frozen=True, slots=True)
class PlotView:
    """What part is on view: log10 micron (None: all), F_nu or nu F_nu, and the index of the point under the cursor."""

    x_range: tuple[float, float] | None = None
    nu_fnu: bool = False
    cursor: int | None = None

    def shown_x(self, plot: PlotData) -> tuple[float, float]:
        """Range of log10 wavelength that is drawn."""
        return self.x_range or full_x(plot)

    def fresh(self) -> PlotView:
        """The whole plot without a cursor, in the same quantity: for the next candidate."""
        return PlotView(nu_fnu=self.nu_fnu)

    def zoomed(self, plot: PlotData, factor: float) -> PlotView:
        """Nearer (`factor` < 1) or farther, about the point under the cursor or the middle."""
        low, high = self.shown_x(plot)
        full_low, full_high = full_x(plot)
        middle = (low + high) / 2
        if self.cursor is not None and self.cursor < len(plot.points):
            middle = math.log10(plot.points[self.cursor].wave_um)
        span = max(MIN_SPAN, (high - low) * factor)
        if span >= full_high - full_low:
            return replace(self, x_range=None)
        low = min(max(middle - span / 2, full_low), full_high - span)
        return replace(self, x_range=(low, low + span))

    def panned(self, plot: PlotData, share: float) -> PlotView:
        """Moved along the wavelengths by a share of what is on view, never past the ends."""
        if self.x_range is None:
            return self
        low, high = self.x_range
        full_low, full_high = full_x(plot)
        low = min(max(low + share * (high - low), full_low), full_high - (high - low))
        return replace(self, x_range=(low, low + self.x_range[1] - self.x_range[0]))

    def stepped(self, plot: PlotData, step: int) -> PlotView:
        """The cursor on the next point by wavelength, with the view drawn along where that point lies outside."""
        order = walk_order(plot)
        if not order:
            return replace(self, cursor=None)
        if self.cursor is None or self.cursor not in order:
            index = order[0] if step > 0 else order[-1]
        else:
            index = order[min(max(order.index(self.cursor) + step, 0), len(order) - 1)]
        moved = replace(self, cursor=index)
        if self.x_range is None:
            return moved
        low, high = self.x_range
        x = math.log10(plot.points[index].wave_um)
        return moved if low <= x <= high else moved.panned(plot, (x - (low + high) / 2) / (high - low))


def walk_order(plot: PlotData) -> list[int]:
    """Indices of the points by wavelength, the order in which arrows walk them."""
    return sorted(range(len(plot.points)), key=lambda index: (plot.points[index].wave_um, index))


def full_x(plot: PlotData) -> tuple[float, float]:
    """Range of log10 wavelength that holds every point with its band."""
    ends = [math.log10(end) for point in plot.points for end in (point.low_um, point.high_um) if end > 0]
    for curve in plot.curves:
        if curve.role == "spectrum" and curve.wave_um.size:
            ends += [math.log10(curve.wave_um[0]), math.log10(curve.wave_um[-1])]
    if not ends:
        return EMPTY_RANGE
    low, high = min(ends) - PAD_X, max(ends) + PAD_X
    middle = (low + high) / 2
    half = max(high - low, 2 * MIN_SPAN) / 2
    return middle - half, middle + half


def quantity(flux_jy: FloatArray, wave_um: FloatArray, nu_fnu: bool) -> FloatArray:
    """Log10 of F_nu in Jy or of nu F_nu in W m-2; NaN where the flux is not positive."""
    flux = np.asarray(flux_jy, dtype=float)
    if nu_fnu:
        flux = flux * NU_FNU / np.asarray(wave_um, dtype=float)
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.where(flux > 0, np.log10(flux), np.nan)


def shown_y(plot: PlotData, view: PlotView) -> tuple[float, float]:
    """Range of log10 flux that holds what is on view: points with their errors, and the total near them."""
    low_x, high_x = view.shown_x(plot)
    values = [value for value in _point_values(plot, view, low_x, high_x) if math.isfinite(value)]
    if not values:
        values = [value for value in _curve_values(plot, view, low_x, high_x)]
    if not values:
        return -3.0, 0.0
    low, high = min(values), max(values)
    tops = [max(line) for line in (_curve_values(plot, view, low_x, high_x),) if line]
    if tops:
        high = max(high, min(tops[0], high + 0.5))
    pad = max(PAD_Y, 0.05 * (high - low))
    short = max(0.0, MIN_SPAN - (high - low)) / 2
    return low - pad - short, high + pad + short


def _point_values(plot: PlotData, view: PlotView, low_x: float, high_x: float) -> Iterator[float]:
    for point in plot.points:
        if not low_x <= math.log10(point.wave_um) <= high_x:
            continue
        scale = NU_FNU / point.wave_um if view.nu_fnu else 1.0
        top = point.flux_jy + (0.0 if point.limit else point.error_high_jy)
        for flux in (point.flux_jy, max(point.flux_jy - point.error_low_jy, 0.6 * point.flux_jy), top):
            if flux > 0:
                yield math.log10(flux * scale)


def _curve_values(plot: PlotData, view: PlotView, low_x: float, high_x: float) -> list[float]:
    for curve in plot.curves:
        if curve.role == "total" and curve.wave_um.size:
            inside = (curve.wave_um >= 10**low_x) & (curve.wave_um <= 10**high_x)
            line = quantity(curve.flux_jy, curve.wave_um, view.nu_fnu)[inside]
            return line[np.isfinite(line)].tolist()
    return []
