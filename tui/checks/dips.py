"""Dips: is a dimming grey, like an opaque body, or coloured, like dust?"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np

from tui.checks.record import any_stands
from tui.model import Band, Candidate, Dip, Evidence, Fit, FloatArray, Param, Settings
from tui.physics.dips import (
    ALPHAS,
    REFERENCE_UM,
    Shape,
    coloured_fit,
    grey_fit,
    law_curves,
    power_curves,
    screen_depth,
)
from tui.physics.extinction import R_V_RANGE, extinction_curve
from tui.physics.statistics import adequate, aic, bic, chi2_tail

KIND = "dips"
VERSION = 2  # raise it whenever the same candidate could get other numbers
GREY, LAW, POWER = "grey", "A(lambda), R_V", "lambda^-alpha"
COLOURED_SIGMA = 2.0  # a slope above zero by this much counts as colour; our choice
STANDS_SIGMA = 3.0  # a dip stands where some band's depth is at least this significant
R_V = np.linspace(*R_V_RANGE, 34)
LN_2PI = float(np.log(2 * np.pi))


@dataclass(frozen=True, slots=True, eq=False)
class Event:
    """The depths of one dimming, in order of wavelength."""

    name: str
    bands: tuple[Band, ...]
    depth: FloatArray  # shape (B,)
    error: FloatArray  # shape (B,)

    @property
    def stands(self) -> bool:
        """Whether the star dimmed beyond the errors: a band at 3 sigma, and all bands together."""
        ratio = self.depth / self.error
        return bool(ratio.max() >= STANDS_SIGMA and chi2_tail(float(np.sum(ratio**2)), ratio.size) < 0.01)


def assess(candidates: Sequence[Candidate], bands: Mapping[str, Band], settings: Settings) -> list[Evidence]:
    """Dip evidence for each candidate; order kept. A candidate without dips gets evidence that says nothing.

    Args:
        bands: band name -> band; dips in other bands, or without a positive error, are left out with a caution.
    """
    return [one_evidence(candidate, bands, settings) for candidate in candidates]


def one_evidence(candidate: Candidate, bands: Mapping[str, Band], settings: Settings) -> Evidence:
    """Fit the three models to each event and judge them."""
    events, left_out = events_of(candidate.dips, bands)
    if not events:
        return Evidence(KIND, VERSION, None, (), left_out)
    several = len(events) > 1
    fits = {event.name: event_fits(event, settings, several) for event in events}
    answers = {event.name: event_answers(event, fits[event.name], settings) for event in events}
    facts = dip_facts(events, fits, answers)
    said = tuple(text for event in events for text in event_sentences(event, fits[event.name], answers[event.name]))
    ordered = tuple(fit for event in events for fit in sorted(fits[event.name].values(), key=lambda one: one.bic))
    judged = [any_stands(answers[event.name]) for event in events if event.stands]
    used = sorted({band for event in events for band in event.bands}, key=lambda band: band.pivot_um)
    return Evidence(
        KIND, VERSION, all_of(judged) if judged else None, ordered, (*said, *left_out), facts,
        bands=tuple(band.name for band in used),
    )  # fmt: skip


def events_of(dips: Iterable[Dip], bands: Mapping[str, Band]) -> tuple[list[Event], tuple[str, ...]]:
    """Dips gathered by event, most significant first, and remarks on those left out."""
    by_event: dict[str, list[Dip]] = {}
    refused = []
    for dip in dips:
        if dip.band in bands and dip.depth_error > 0 and np.isfinite(dip.depth):
            by_event.setdefault(dip.event, []).append(dip)
        else:
            refused.append(f"{dip.event} {dip.band}".strip())
    events = []
    for name, found in by_event.items():
        found = sorted(found, key=lambda dip: bands[dip.band].pivot_um)
        depth, error = (np.array([getattr(dip, key) for dip in found], dtype=float) for key in ("depth", "depth_error"))
        events.append(Event(name, tuple(bands[dip.band] for dip in found), depth, error))
    events.sort(key=lambda event: -float(np.sum((event.depth / event.error) ** 2)))
    said = (f"Dips left out, band unknown or no error: {', '.join(refused)}.",) if refused else ()
    return events, said


@lru_cache(maxsize=64)
def curves_for(pivots: tuple[float, ...], law: str) -> FloatArray:
    """A(lambda)/A(V) of a law at some wavelengths for every R_V tried, shape (S, B)."""
    return law_curves(np.array(pivots), lambda wave, ratio: extinction_curve(wave, law, ratio), R_V)


def event_fits(event: Event, settings: Settings, several: bool) -> dict[str, Fit]:
    """The three models fitted to one event, by model; the event's name is added where there are several."""
    wave = np.array([band.pivot_um for band in event.bands])
    law = curves_for(tuple(wave.tolist()), settings.law)
    shapes = {
        GREY: grey_fit(event.depth, event.error),
        LAW: coloured_fit(event.depth, event.error, R_V, law),
        POWER: coloured_fit(event.depth, event.error, ALPHAS, power_curves(wave)),
    }
    label = f" ({event.name})" if several else ""
    return {model: fit_record(event, model, shape, label) for model, shape in shapes.items()}


def fit_record(event: Event, model: str, shape: Shape, label: str) -> Fit:
    """One fit as evidence holds it."""
    free = 1 if model == GREY else 2 - shape.is_limit
    points = event.depth.size
    dof = points - free
    minus2lnl = shape.chi2 + float(np.sum(2 * np.log(shape.sigma))) + points * LN_2PI
    pulls = (event.depth - shape.model) / shape.sigma
    return Fit(
        model=model + label,
        chi2=shape.chi2,
        dof=dof,
        p=float(chi2_tail(shape.chi2, dof)),
        aic=float(aic(minus2lnl, free)),
        bic=float(bic(minus2lnl, free, points)),
        params=shape_params(model, shape),
        pulls={band.name: float(pull) for band, pull in zip(event.bands, pulls, strict=True)},
        minus2lnl=minus2lnl,
    )


def shape_params(model: str, shape: Shape) -> dict[str, Param]:
    """Reported parameters of a dip."""
    size = Param(shape.amplitude, shape.amplitude_low, shape.amplitude_high, "" if model == GREY else "mag")
    if model == GREY:
        return {"depth": size}
    form = Param(shape.shape, shape.shape_low, shape.shape_high, "", shape.is_limit)
    return {"av": size, "r_v": form} if model == LAW else {"a_055": size, "alpha": form}


def model_depths(found: Fit, wave_um: FloatArray, law: str) -> FloatArray:
    """Depth (N,) that a fitted model gives at wavelengths (N,), micron: the curve to draw through the depths.

    Args:
        law: extinction law of the settings the fit was made with.
    """
    wave, params = np.asarray(wave_um, dtype=float), found.params
    if "depth" in params:
        return np.full(wave.shape, params["depth"].value)
    if "r_v" in params:
        return screen_depth(params["av"].value * extinction_curve(wave, law, params["r_v"].value))
    return screen_depth(params["a_055"].value * (wave / REFERENCE_UM) ** -params["alpha"].value)


def event_answers(event: Event, fits: Mapping[str, Fit], settings: Settings) -> dict[str, bool | None]:
    """Whether each model explains the event."""
    return {model: adequate(fit.chi2, event.depth.size, fit.dof, settings.p_min) for model, fit in fits.items()}


def dip_facts(
    events: Sequence[Event],
    fits: Mapping[str, Mapping[str, Fit]],
    answers: Mapping[str, Mapping[str, bool | None]],
) -> dict[str, Any]:
    """Facts of the most significant event, and what the standing events ask of the other checks."""
    main = events[0]
    found = fits[main.name]
    alpha = found[POWER].params["alpha"]
    standing = [event.name for event in events if event.stands]
    return {
        "stands": bool(standing),
        "events": [event.name for event in events],
        "standing_events": standing,
        "slope": alpha.value, "slope_low": alpha.low, "slope_high": alpha.high, "slope_is_limit": alpha.limit,
        "delta_chi2_grey": found[GREY].chi2 - min(found[LAW].chi2, found[POWER].chi2),
        "refused": [model for model, answer in answers[main.name].items() if answer is False],
        "grey_adequate": all_of([answers[name][GREY] for name in standing]),
        "law_adequate": all_of([answers[name][LAW] for name in standing]),
        "coloured_adequate": all_of([coloured_answer(fits[name], answers[name]) for name in standing]),
    }  # fmt: skip


def is_coloured(fits: Mapping[str, Fit], answers: Mapping[str, bool | None]) -> bool:
    """Whether a dip is deeper in the blue than a grey body's: its slope is above zero, or grey is refused for it.

    Large grains dim all bands alike and are grey here; a slope below zero is none of small grains.
    """
    alpha = fits[POWER].params["alpha"]
    if not alpha.value > 0:
        return False
    if answers[GREY] is False:
        return True
    return alpha.low > 0 if alpha.limit else alpha.value > COLOURED_SIGMA * (alpha.value - alpha.low)


def coloured_answer(fits: Mapping[str, Fit], answers: Mapping[str, bool | None]) -> bool | None:
    """Whether small grains explain a dip: by the law, or by a power law that is one and not flat."""
    power = answers[POWER]
    if power is True and not is_coloured(fits, answers):
        power = False
    return any_stands([answers[LAW], power])


def event_sentences(event: Event, fits: Mapping[str, Fit], answers: Mapping[str, bool | None]) -> list[str]:
    """What one event says, in words."""
    name = event.name or "dip"
    if not event.stands:
        return [f"{name}: no band is deeper than its error allows by {STANDS_SIGMA:g} sigma; it counts for nothing."]
    refused = [model for model in (GREY, LAW, POWER) if answers[model] is False]
    said = []
    if len(refused) == 3:
        said.append(f"{name}: neither a grey body nor dust of any size makes these depths.")
    elif refused:
        said.append(f"{name}: refused are {', '.join(refused)}.")
    alpha = fits[POWER].params["alpha"]
    if alpha.high < 0:
        said.append(
            f"{name}: deeper in the red than in the blue (alpha {alpha.value:.1f}); small grains do the opposite."
        )
    elif answers[POWER] is True and not is_coloured(fits, answers):
        said.append(
            f"{name}: alpha {tenth(alpha.value)} ({tenth(alpha.low)} to {tenth(alpha.high)}) is no colour: what is grey is "
            "an opaque body or large grains (see blend), and small grains are not needed."
        )
    if answers[GREY] is True and answers[LAW] is True:
        said.append(f"{name}: these depths cannot tell a grey body from dust.")
    if any(answers[model] is None for model in (GREY, LAW, POWER)):
        said.append(f"{name}: {event.depth.size} bands are too few to test every model.")
    return said


def tenth(value: float) -> str:
    """A slope to a tenth, a zero without sign.

    >>> tenth(-0.04), tenth(1.26)
    ('0.0', '1.3')
    """
    return f"{round(value, 1) + 0.0:.1f}"


def all_of(answers: Iterable[bool | None]) -> bool | None:
    """False if any is; else None if any is unknown or there is none; else True."""
    values = list(answers)
    if False in values:
        return False
    return None if None in values or not values else True


ASKED = {"blend": "grey_adequate", "extinction": "law_adequate", "dust": "coloured_adequate"}


def with_dips(kind: str, answer: bool | None, dips: Evidence | None) -> bool | None:
    """A check's `adequate` once standing dips are asked for too.

    `star` is never adequate while a dip stands; `blend` needs the dips grey, `extinction` the law's colours,
    `dust` any colours of small grains; `instrument` cannot explain a dip at all.
    """
    if dips is None or not dips.facts.get("stands"):
        return answer
    if kind in ("star", "instrument"):
        return False if answer is not None else None
    return all_of([answer, dips.facts.get(ASKED[kind])]) if kind in ASKED else answer
