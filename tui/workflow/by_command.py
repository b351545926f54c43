"""A fit by command: it begins from the model that leads in the evidence, has intervals, and holds to every range."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from tui.errors import InputError
from tui.model import Candidate, Fit, Settings
from tui.workflow.probing import fitted_bands, parameter_name
from tui.workflow.spectral_grids import templates_of

if TYPE_CHECKING:
    from tui.physics.templates import Templates
    from tui.workflow.session import Session


def probe_by_command(
    session: Session,
    name: str,
    check: str,
    fixed: Mapping[str, float],
    dropped: Iterable[str] = (),
    model: str | None = None,
) -> Fit:
    """The best fit of one model of a check, with profile intervals of all that is not held; stores nothing.

    Args:
        fixed: parameter -> value, by the name or the short name of a parameter.
        dropped: bands to leave out, by name or alias.
        model: None: the best of the evidence's fits whose model has every held parameter.
    Raises:
        UnknownNameError: no such candidate or band.
        InputError: no such model or parameter, a value outside its range, or too few bands are left.
    """
    from tui import checks

    candidate = session.candidate(name)
    without = fitted_bands(candidate, dropped)
    held = {parameter_name(check, typed): value for typed, value in fixed.items()}
    leading = model or leading_model(session.evidence(name, (check,))[check].fits, check, held)
    templates = templates_of(candidate, session.basis)
    refuse_outside(candidate, check, leading, held, templates, session.settings)
    return checks.probe(
        candidate, check, held, without, templates, session.settings, model=leading, with_intervals=True
    )


def leading_model(fits: Sequence[Fit], check: str, held: Mapping[str, float]) -> str | None:
    """The model of the best fit that has every held parameter and can be fitted by hand; None where there is none."""
    from tui.checks.by_hand import CHECK_MODELS

    known = {model.name for model in CHECK_MODELS.get(check, ())}
    return next((fit.model for fit in fits if fit.model in known and set(held) <= set(fit.params)), None)


def refuse_outside(
    candidate: Candidate,
    check: str,
    model: str | None,
    held: Mapping[str, float],
    templates: Templates,
    settings: Settings,
) -> None:
    """InputError, naming the range, where a held value lies outside what its parameter may be.

    The ends count with the digits in which the message names them.
    """
    for name, (low, high) in ranges(candidate, check, model, held, templates, settings).items():
        if not float(f"{low:.4g}") <= held[name] <= float(f"{high:.4g}"):
            raise InputError(f"{name} = {held[name]:g} lies outside its range here, {low:.4g} to {high:.4g}.")


def ranges(
    candidate: Candidate,
    check: str,
    model: str | None,
    held: Mapping[str, float],
    templates: Templates,
    settings: Settings,
) -> dict[str, tuple[float, float]]:
    """Held parameter -> its lowest and highest value, in the units in which it is reported."""
    from tui.checks.by_hand import model_with
    from tui.checks.extinction import fixed_r_v
    from tui.checks.prepare import prepare
    from tui.checks.record import columns_of
    from tui.checks.spectra import as_measured, own_settings
    from tui.physics.composite import kit_for
    from tui.physics.reddening import AV_MAX

    settings = own_settings(settings, templates)
    problem = prepare([as_measured(candidate, templates)], templates, settings)
    if check == "extinction":  # there the prior is a caution, and no bound
        problem = replace(problem, av_max=np.full(1, AV_MAX))
    kit = kit_for(model_with(check, held, problem, model), problem.templates, fixed_r_v(settings))
    low, high = kit.bounds(problem.av_max)
    return {
        told.name: (told.shown(low[0, column]), told.shown(high[0, column]))
        for column, told in columns_of(kit).items()
        if told.name in held
    }
