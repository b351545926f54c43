"""How often fluxes drawn from the nearest mixture come out as badly as those measured: a bootstrap, beside the bound."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tui.checks.mixture import ENOUGH, broadened, error_model, generators_for, problem_of
from tui.checks.spectra import as_measured, bound_templates, own_settings
from tui.model import Candidate, FloatArray, Settings
from tui.physics.cone import Bound, Fluxes, mixture_bound
from tui.physics.cone_errors import consistent_bound
from tui.physics.templates import Templates

DRAWS = 400


@dataclass(frozen=True, slots=True)
class Drawn:
    """Draws from the nearest mixture, and how many of them no mixture met better than the measured fluxes."""

    draws: int
    as_bad: int

    @property
    def p(self) -> float:
        """Share that came out as badly, the measured fluxes counted as one more draw: never nothing."""
        return (self.as_bad + 1) / (self.draws + 1)

    @property
    def sentence(self) -> str:
        """What that says, and that it proves nothing."""
        return (
            f"Of {self.draws} sets of fluxes drawn from the nearest mixture, {self.as_bad} came out as badly. This "
            "bootstrap takes that mixture for the true one, so it is no bound; the p above is."
        )


def drawn(
    candidate: Candidate, templates: Templates, settings: Settings, rng: np.random.Generator, draws: int = DRAWS
) -> Drawn | None:
    """Draw fluxes from the mixture nearest to a candidate and bound each anew; None where mixtures are not refused.

    Errors are those of the nearest mixture, upper limits stay as they are.

    Raises:
        TemplateError: `templates` lacks a band that the candidate has.
    Source: the parametric bootstrap, Efron & Tibshirani 1993, An Introduction to the Bootstrap, section 6.5.
    """
    candidate, settings = as_measured(candidate, templates), own_settings(settings, templates)
    templates = bound_templates([candidate], templates)
    problem = problem_of(broadened([candidate], templates), templates, settings)
    errors = error_model(problem)
    if not problem.detected.any() or problem.points[0] < 2:
        return None
    generators = generators_for(templates, problem.templates.names)
    bound = consistent_bound(generators, errors, settings.p_min, max(settings.p_min, ENOUGH))
    if bound.p[0] >= settings.p_min:
        return None
    flux = _draws(bound, errors.flux[0], errors.limited[0], rng, draws)
    covariance = np.broadcast_to(bound.covariance[0], (draws, *bound.covariance[0].shape))
    used = np.broadcast_to((errors.detected | errors.limited)[0], flux.shape)
    limited = np.broadcast_to(errors.limited[0], flux.shape)
    again = mixture_bound(generators, Fluxes(flux, covariance, used, limited), float(bound.p[0]))
    return Drawn(draws, int(np.sum(~again.at_most)))


def _draws(
    bound: Bound, measured: FloatArray, limited: np.ndarray, rng: np.random.Generator, draws: int
) -> FloatArray:
    """Fluxes about the nearest mixture, shape (draws, B)."""
    factor = np.linalg.cholesky(bound.covariance[0])
    noise = rng.standard_normal((draws, measured.size)) @ factor.T
    return np.where(limited, measured, bound.model[0] + noise)
