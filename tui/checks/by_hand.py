"""One candidate, one check, by hand: the spectrum of a fit for a plot, and fits with parameters held."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from tui.checks.extinction import fixed_r_v
from tui.checks.prepare import prepare
from tui.checks.record import RAD_TO_MAS, columns_of, fits_of
from tui.checks.spectra import as_measured, own_settings
from tui.errors import InputError
from tui.model import Candidate, Fit, FloatArray, Settings
from tui.physics.composite import (
    A2,
    A3,
    AV,
    BOUND_PAIR,
    COMPACT,
    DUST,
    DUST_AV,
    FREE_PAIR,
    GALAXY,
    LN_S,
    LN_T,
    MODELS,
    RV,
    STAR,
    STAR_AV,
    STAR_AV_RV,
    TWO_DUST,
    WIDTH,
    X2,
    X3,
    Kit,
    Model,
    kit_for,
    predict,
)
from tui.physics.constants import MAG
from tui.physics.extinction import extinction_curve
from tui.physics.fitting import finish, first_errors, rested, starting_rows
from tui.physics.likelihood import errors_of
from tui.physics.looking import held_down
from tui.physics.planck import planck_jy
from tui.physics.problem import Problem
from tui.physics.reddening import AV_MAX
from tui.physics.spectral import INSTRUMENT, is_point
from tui.physics.templates import SLOPE_SPLIT_UM, Templates

HAND_PASSES, HAND_STEPS, HAND_SETTLED, HAND_TOLERANCE = 8, 25, 0.002, 1e-5
CHECK_MODELS: Mapping[str, tuple[Model, ...]] = {
    "star": (STAR,),
    "instrument": (STAR,),
    "extinction": (STAR_AV, STAR_AV_RV),
    "blend": (BOUND_PAIR, FREE_PAIR, COMPACT, GALAXY),
    "dust": (DUST, DUST_AV, TWO_DUST),
}


@dataclass(frozen=True, slots=True, eq=False)
class Curve:
    """A model spectrum for the eye: shape (N,) each, Jy."""

    wave_um: FloatArray
    total_jy: FloatArray
    components: Mapping[str, FloatArray]  # "star", "dust", "dust2", "second star", "compact", "galaxy"


def curve(
    candidate: Candidate, fit: Fit, check: str, templates: Templates, settings: Settings, wave_um: FloatArray
) -> Curve:
    """Spectrum of a fit at `wave_um` (micron). The star is drawn through its band values, smooth between them.

    Raises:
        InputError: `fit` is of no model that `check` has.
    """
    model = MODELS.get("star" if fit.model.startswith("star without") else fit.model)
    if model is None:
        raise InputError(f"The check {check} has no model {fit.model!r}.")
    kit = kit_for(model, templates)
    x = row_of(fit, kit)
    ratio = x[RV] if RV in model.free else fixed_r_v(settings)
    screen = np.exp(-MAG * x[AV] * extinction_curve(wave_um, settings.law, float(np.clip(ratio, 2.3, 5.6))))
    components = {"star": star_curve(kit, templates, x[LN_T], x[LN_S], wave_um) * screen}
    for number, source in enumerate(model.sources):
        column_x, column_a = ((X2, A2), (X3, A3))[number]
        name = {"dust": ("dust", "dust2")[number], "star": "second star", "power": "galaxy"}.get(source, source)
        components[name] = further_curve(kit, templates, source, x, column_x, column_a, wave_um) * screen
    return Curve(wave_um, np.sum(list(components.values()), axis=0), components)


def star_curve(kit: Kit, templates: Templates, ln_t: float, ln_s: float, wave_um: FloatArray) -> FloatArray:
    """The star's spectrum: Planck times its band values over Planck's, interpolated in ln wavelength."""
    value = kit.star.at(np.array([ln_t]))[0][0]
    known = np.isfinite(value)
    pivot = templates.pivot_um[known]
    order = np.argsort(pivot)
    kelvin = np.exp(ln_t)
    offset = value[known] - np.log(np.pi * planck_jy(pivot, kelvin))
    smooth = np.interp(np.log(wave_um), np.log(pivot[order]), _thinned(offset[order]))
    return np.exp(smooth + ln_s) * np.pi * planck_jy(wave_um, kelvin)


def _thinned(offset: FloatArray) -> FloatArray:
    """Neighbouring bands' offsets averaged by three, so that broad and narrow bands do not zigzag the line."""
    padded = np.concatenate([offset[:1], offset, offset[-1:]])
    return (padded[:-2] + padded[1:-1] + padded[2:]) / 3


def further_curve(
    kit: Kit, templates: Templates, source: str, x: FloatArray, column_x: int, column_a: int, wave_um: FloatArray
) -> FloatArray:
    """Spectrum of a further source, without the screen."""
    one = np.array([x[LN_T]])
    own = np.array([x[column_x]])
    if source == "dust":
        ln_h = 4 * (x[LN_T] - x[column_x])
        return x[column_a] * np.exp(ln_h + x[LN_S]) * np.pi * planck_jy(wave_um, np.exp(x[column_x]))
    if source == "compact":
        return x[column_a] * np.exp(x[LN_S]) * np.pi * planck_jy(wave_um, np.exp(x[column_x]))
    if source == "power":
        ln_h = float(kit.infrared.at(one)[0][0, 0])
        return x[column_a] * np.exp(ln_h + x[LN_S]) * (wave_um / SLOPE_SPLIT_UM) ** x[column_x]
    if kit.model.bound_pair:
        shift = float((kit.ln_radius2.at(own)[0] - kit.ln_radius2.at(one)[0])[0, 0])
    else:
        shift = float((kit.ratio.at(one)[0] - kit.ratio.at(own)[0])[0, 0]) + float(np.log(max(x[column_a], 1e-300)))
    return star_curve(kit, templates, x[column_x], x[LN_S] + shift, wave_um)


def row_of(fit: Fit, kit: Kit) -> FloatArray:
    """The parameter row that reported parameters stand for, shape (8,)."""
    row = np.zeros(WIDTH)
    row[RV] = 3.1
    rest = {X2: 300.0, X3: 300.0}
    for column, told in columns_of(kit).items():
        param = fit.params.get(told.name)
        value = rest.get(column, 0.0) if param is None else param.value
        row[column] = inner_value(told.name, value)
    return row


def inner_value(name: str, value: float) -> float:
    """A reported value on the scale that the fits use."""
    if name == "theta":
        return float(2 * np.log(max(value, 1e-300) / RAD_TO_MAS))
    if name in ("teff", "teff1", "teff2", "dust_temperature", "dust2_temperature"):
        return float(np.log(max(value, 1e-3)))
    return value**2 if name == "radius_ratio" else value


def probe(
    candidate: Candidate,
    check: str,
    fixed: Mapping[str, float],
    dropped: frozenset[str],
    templates: Templates,
    settings: Settings,
    *,
    model: str | None = None,
    with_intervals: bool = False,
) -> Fit:
    """Best fit of a check with some parameters held and some bands left out.

    Args:
        model: one of the check's; None: the simplest that has every held parameter.
        with_intervals: also profile intervals of what is not held.
    Raises:
        InputError: no such model, no model of the check has these parameters, or no band is left.
    """
    settings = own_settings(settings, templates)
    problem = dropped_bands(prepare([as_measured(candidate, templates)], templates, settings), dropped)
    if not problem.detected.any():
        raise InputError(f"No band of {candidate.name} is left to fit.")
    if check == "extinction":
        problem = replace(problem, av_max=np.full(1, AV_MAX))
    kit = kit_for(model_with(check, fixed, problem, model), problem.templates, fixed_r_v(settings))
    return conditional(problem, kit, fixed, with_intervals)


def conditional(problem: Problem, kit: Kit, fixed: Mapping[str, float], with_intervals: bool = False) -> Fit:
    """The best fit with parameters held, errors following the model."""
    names = {told.name: column for column, told in columns_of(kit).items()}
    held, values = np.zeros(WIDTH, bool), np.zeros(WIDTH)
    low, high = kit.bounds(problem.av_max)
    for name, value in fixed.items():
        column = names[name]
        held[column] = True
        values[column] = np.clip(inner_value(name, value), low[0, column], high[0, column])
    errors = first_errors(problem)
    x = np.where(held, values, starting_rows(problem, kit, errors)[:, 0])
    for _ in range(HAND_PASSES):
        rows, still = np.zeros(x.shape[0], np.intp), np.tile(held, (x.shape[0], 1))
        found, cost = held_down(problem, kit, errors, x, rows, still, HAND_STEPS, HAND_TOLERANCE)
        x = found[[cost.argmin()]]
        last, errors = errors, errors_of(problem, x, predict(kit, x))
        if np.all(np.abs(errors.sigma / last.sigma - 1.0) < HAND_SETTLED):
            break
    x = np.where(held, x, rested(kit, x))
    return fits_of(finish(problem, kit, last, x), with_intervals=with_intervals, held=held)[0]


def dropped_bands(problem: Problem, dropped: frozenset[str]) -> Problem:
    """The problem without some bands; `spectrum` stands for all points of one."""
    whole = INSTRUMENT in dropped
    mask = np.array([[name in dropped or (whole and is_point(name)) for name in problem.templates.names]])
    return problem.without(np.broadcast_to(mask, problem.detected.shape))


def model_with(check: str, fixed: Mapping[str, float], problem: Problem, wanted: str | None = None) -> Model:
    """The model asked for, or the first of a check that has every held parameter. InputError naming those there are."""
    models = {model.name: model for model in CHECK_MODELS.get(check, ())}
    if wanted is not None and wanted not in models:
        raise InputError(f"The check {check} has no model {wanted!r}; it has {', '.join(models)}.")
    known: set[str] = set()
    for model in models.values() if wanted is None else [models[wanted]]:
        names = {told.name for told in columns_of(kit_for(model, problem.templates)).values()}
        known |= names
        if set(fixed) <= names:
            return model
    unknown = sorted(set(fixed) - known) or sorted(fixed)
    raise InputError(f"The check {check} has no model with {', '.join(unknown)}; it knows {', '.join(sorted(known))}.")
