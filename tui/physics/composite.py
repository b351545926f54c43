"""Models made of a star and up to two further sources behind one screen of extinction.

Every model shares one row of parameters; a model frees some of its columns:

    LN_T    ln of the star's T_eff                    LN_S   ln of theta^2, theta = R/d in radian
    AV, RV  the screen                                X2, X3 ln T (or slope) of the further sources
    A2, A3  their amplitudes, >= 0: fraction of the star's luminosity (dust), of its Ks flux (star),
            of its surface (compact), of its flux at 3.4 micron (power law)
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from tui.model import FloatArray
from tui.physics.constants import MAG, PARSEC
from tui.physics.extinction import R_V_RANGE
from tui.physics.reddening import Reddening
from tui.physics.sources import SourceGrid
from tui.physics.templates import Templates

LN_T, LN_S, AV, RV, X2, A2, X3, A3 = range(8)
WIDTH = 8
POWER_REDDENING_K = 1000.0  # a power law is reddened as a source of this colour
A_MAX = 1e6
LN_S_RANGE = (-90.0, 0.0)
A_GALAXY = 30.0  # of the star's flux at 3.4 micron: a brighter one would not be called the star's background
NEAR = 1e-6  # a parameter this close to a bound, as a fraction of its range, lies at it


@dataclass(frozen=True, slots=True)
class Model:
    """One family of explanation as the fits see it."""

    name: str
    free: tuple[int, ...]  # columns of the parameter row
    sources: tuple[str, ...] = ()  # further sources: "dust", "star", "compact", "power"
    bound_pair: bool = False  # the second star's size follows from both temperatures; the parallax is a datum


STAR = Model("star", (LN_T, LN_S))
STAR_AV = Model("star + A_V", (LN_T, LN_S, AV))
STAR_AV_RV = Model("star + A_V, R_V", (LN_T, LN_S, AV, RV))
DUST = Model("star + dust", (LN_T, LN_S, X2, A2), ("dust",))
DUST_AV = Model("star + dust, A_V", (LN_T, LN_S, AV, X2, A2), ("dust",))
TWO_DUST = Model("star + two dusts, A_V", (LN_T, LN_S, AV, X2, A2, X3, A3), ("dust", "dust"))
BOUND_PAIR = Model("bound pair", (LN_T, LN_S, AV, X2), ("star",), bound_pair=True)
FREE_PAIR = Model("free pair", (LN_T, LN_S, AV, X2, A2), ("star",))
COMPACT = Model("star + compact", (LN_T, LN_S, AV, X2, A2), ("compact",))
GALAXY = Model("star + galaxy", (LN_T, LN_S, AV, X2, A2), ("power",))
MODELS = {
    model.name: model
    for model in (STAR, STAR_AV, STAR_AV_RV, DUST, DUST_AV, TWO_DUST, BOUND_PAIR, FREE_PAIR, COMPACT, GALAXY)
}


@dataclass(frozen=True, slots=True, eq=False)
class Kit:
    """The tables of one model, for one choice of bands."""

    model: Model
    star: SourceGrid
    star_reddening: Reddening
    further: tuple[SourceGrid, ...]
    further_reddening: tuple[Reddening, ...]
    ratio: SourceGrid  # ln of the star's flux at Ks, one column
    infrared: SourceGrid  # ln of the star's flux at 3.4 micron, one column
    ln_radius2: SourceGrid  # ln of the squared radius on the dwarf sequence, m2, one column

    def bounds(self, av_max: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Lowest and highest value of every parameter, each (M, 8)."""
        low, high = np.zeros((av_max.size, WIDTH)), np.zeros((av_max.size, WIDTH))
        low[:, LN_T], high[:, LN_T] = self.star.low, self.star.high
        low[:, LN_S], high[:, LN_S] = LN_S_RANGE
        high[:, AV] = av_max
        low[:, RV], high[:, RV] = R_V_RANGE
        for column, grid in zip((X2, X3), self.further, strict=False):
            low[:, column], high[:, column] = grid.low, grid.high
        high[:, A2] = high[:, A3] = A_GALAXY if "power" in self.model.sources else A_MAX
        return low, high

    def near(self, av_max: FloatArray) -> FloatArray:
        """How close to a bound counts as at it, (M, 8)."""
        low, high = self.bounds(av_max)
        near = NEAR * np.maximum(high - low, NEAR)
        near[:, A2] = near[:, A3] = 1e-12
        return near


def one_column(grid: SourceGrid, column: FloatArray) -> SourceGrid:
    """A table of one column over the parameter of `grid`."""
    table = column[:, None]
    return replace(grid, ln_flux=table, slope=np.gradient(table, axis=0))


def kit_for(model: Model, templates: Templates, r_v: float = 3.1, *, other_law: bool = False) -> Kit:
    """Collect the tables of a model; R_V is fixed where the model does not free it.

    Args:
        other_law: redden the star by the templates' other law (for a star behind a screen alone).
    """
    free_rv = RV in model.free

    def screen(reddening: Reddening) -> Reddening:
        return reddening if free_rv else reddening.fixed(r_v)

    screens = {"star": templates.star_reddening, "dust": templates.dust_reddening, "power": templates.dust_reddening}
    screens["compact"] = templates.compact_reddening
    with np.errstate(divide="ignore"):
        radius = np.where(np.isfinite(templates.radius_m), 2 * np.log(templates.radius_m), 0.0)
    return Kit(
        model=model,
        star=templates.star,
        star_reddening=templates.other_reddening if other_law else screen(templates.star_reddening),
        further=tuple(getattr(templates, source) for source in model.sources),
        further_reddening=tuple(screen(screens[source]) for source in model.sources),
        ratio=one_column(templates.star, templates.ln_ks),
        infrared=one_column(templates.star, templates.ln_infrared),
        ln_radius2=one_column(templates.star, radius),
    )


@dataclass(frozen=True, slots=True, eq=False)
class Prediction:
    """Model fluxes (M, B), the star's share of them, and derivatives (M, P, B) for the free columns."""

    flux: FloatArray
    star: FloatArray
    slopes: FloatArray
    second: FloatArray | None = None  # (M, B), a second star's share

    def take(self, rows: np.ndarray) -> Prediction:
        """The same for some rows."""
        second = None if self.second is None else self.second[rows]
        return Prediction(self.flux[rows], self.star[rows], self.slopes[rows], second)


def predict(kit: Kit, x: FloatArray) -> Prediction:
    """Fluxes of parameter rows `x` (M, 8) in Jy, with derivatives."""
    model = kit.model
    place = {column: index for index, column in enumerate(model.free)}
    value, slope = kit.star.at(x[:, LN_T])
    ratio = x[:, RV] if RV in place else None
    slopes = np.empty((x.shape[0], len(place), value.shape[1]))
    screen = None
    if AV in place:
        screen = kit.star_reddening.at(x[:, LN_T], x[:, AV], ratio)
        value = value - MAG * screen[0]
        slope = slope - MAG * screen[1]
    star = np.exp(value + x[:, LN_S, None])
    np.multiply(star, slope, out=slopes[:, place[LN_T]])
    if screen is not None:
        np.multiply(star, screen[2], out=slopes[:, place[AV]])
        if screen[3] is not None:
            np.multiply(star, screen[3], out=slopes[:, place[RV]])
    total, second = star, None
    for number, source in enumerate(model.sources):
        further = _add_source(kit, number, x, ratio, place, slopes)
        total = total + further
        second = further if source == "star" else second
    for column in (AV, RV):
        if column in place:
            slopes[:, place[column]] *= -MAG
    slopes[:, place[LN_S]] = total
    return Prediction(total, star, slopes, second)


def _add_source(
    kit: Kit, number: int, x: FloatArray, ratio: FloatArray | None, place: Mapping[int, int], slopes: FloatArray
) -> FloatArray:
    """Flux of a further source; its derivatives go into `slopes`, those with the screen not yet times -0.4 ln 10."""
    column_x, column_a = ((X2, A2), (X3, A3))[number]
    source = kit.model.sources[number]
    value, slope = kit.further[number].at(x[:, column_x])
    screen = None
    if AV in place:
        colour = np.full(x.shape[0], np.log(POWER_REDDENING_K)) if source == "power" else x[:, column_x]
        screen = kit.further_reddening[number].at(colour, x[:, AV], ratio)
        value = value - MAG * screen[0]
        slope = slope if source == "power" else slope - MAG * screen[1]
    ln_h, dh_star, dh_own = ln_unit(kit, source, x[:, LN_T], x[:, column_x])
    unit = np.exp(value + (ln_h + x[:, LN_S])[:, None])
    if kit.model.bound_pair:
        flux = unit
    else:
        flux = x[:, column_a, None] * unit
        slopes[:, place[column_a]] = unit
    if dh_star is not None:
        slopes[:, place[LN_T]] += flux * dh_star[:, None]
    np.multiply(flux, slope if dh_own is None else slope + dh_own[:, None], out=slopes[:, place[column_x]])
    if screen is not None:
        slopes[:, place[AV]] += flux * screen[2]
        if screen[3] is not None:
            slopes[:, place[RV]] += flux * screen[3]
    return flux


def ln_unit(
    kit: Kit, source: str, ln_t: FloatArray, own: FloatArray
) -> tuple[FloatArray, FloatArray | None, FloatArray | None]:
    """ln of the surface scale, over the star's, that an amplitude of 1 means, (R,).

    Also its derivatives with ln T and the source's own parameter (None: zero).
    """
    if kit.model.bound_pair:
        second, dsecond = kit.ln_radius2.at(own)
        first, dfirst = kit.ln_radius2.at(ln_t)
        return (second - first)[:, 0], -dfirst[:, 0], dsecond[:, 0]
    if source == "dust":
        return 4 * ln_t - 4 * own, np.full(ln_t.shape, 4.0), np.full(ln_t.shape, -4.0)
    if source == "star":
        first, dfirst = kit.ratio.at(ln_t)
        second, dsecond = kit.ratio.at(own)
        return (first - second)[:, 0], dfirst[:, 0], -dsecond[:, 0]
    if source == "power":
        first, dfirst = kit.infrared.at(ln_t)
        return first[:, 0], dfirst[:, 0], None
    return np.zeros(ln_t.shape), None, None


def parallax_of(kit: Kit, x: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Parallax (mas) that puts a dwarf of this T_eff at this angular size, and d ln parallax / d ln T_eff."""
    radius2, slope = kit.ln_radius2.at(x[:, LN_T])
    ln_distance = 0.5 * (radius2[:, 0] - x[:, LN_S])  # ln of metres
    return 1000.0 * PARSEC * np.exp(-ln_distance), -0.5 * slope[:, 0]
