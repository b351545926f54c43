"""Everything there is to show of one candidate, gathered once for text and for JSON."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from tui.model import CHECKS, Candidate, Dip, Evidence, Fit, Measurement, plain
from tui.workflow.records import CandidateView

if TYPE_CHECKING:
    from tui.checks.mixture_draws import Drawn
    from tui.workflow.basis import Basis
    from tui.workflow.lookalikes import LookAlikes
    from tui.workflow.session import Session

DIP_PARTS = ("band", "depth", "depth_error", "epoch")


@dataclass(frozen=True, slots=True)
class Dossier:
    """A candidate, today's evidence on it, and where it stands for the reader."""

    candidate: Candidate
    evidence: Mapping[str, Evidence]
    view: CandidateView
    oddness: Mapping[str, Any]  # sigma, band, pull; empty where there is no evidence for `star`
    measurements: tuple[Measurement, ...]  # by wavelength
    look_alikes: LookAlikes | None = None  # None where they were not looked for, or no pulls are known
    p_min: float = 0.01  # from which a fit stands, by the queue's settings
    drawn: Drawn | None = None  # fluxes drawn from the nearest mixture; None where mixtures are not refused

    def as_dict(self) -> dict[str, Any]:
        """The document of `show --json`: JSON values only, in a fixed order of keys."""
        return {
            "name": self.candidate.name,
            "outcome": self.view.outcome,
            "oddness": plain(self.oddness),
            "measurements": [measurement_dict(one) for one in self.measurements],
            "checks": {check: self.check_dict(check) for check in CHECKS},
            "mixture": evidence_dict(self.evidence.get("mixture")) | drawn_dict(self.drawn),
            "dips": dip_dicts(self.candidate.dips, self.evidence.get("dips")),
            "look_alikes": self.look_alikes.as_dict() if self.look_alikes else None,
        }

    def check_dict(self, check: str) -> dict[str, Any]:
        """One check: its state as the reader may know it, then its evidence."""
        found = self.evidence.get(check)
        return {
            "state": self.view.states.get(check, "todo"),
            "version": found.version if found else None,
            "digest": found.digest if found else None,
            "stale": self.view.stale.get(check),
            "adequate": found.adequate if found else None,
            "cautions": list(found.cautions) if found else [],
            "fits": [fit_dict(fit) for fit in found.fits] if found else [],
            "facts": plain(found.facts) if found else {},
        }


def dossier(session: Session, name: str) -> Dossier:
    """Gather what there is to show of a candidate, computing lacking evidence first.

    Look-alikes are looked for in a queue of up to LONG_QUEUE candidates only, since that takes seconds in a longer one.

    Raises:
        UnknownNameError: no candidate of that name.
    """
    candidate = session.candidate(name)
    evidence = session.evidence(name)
    bands = session.band_info()
    measured = sorted(
        candidate.measurements,
        key=lambda one: (bands[one.band].pivot_um if one.band in bands else math.inf, one.band, one.source, one.epoch),
    )
    from tui.workflow.lookalikes import LONG_QUEUE

    alike = session.look_alikes(name, evidence.get("star")) if session.candidate_count() <= LONG_QUEUE else None
    oddness = oddness_dict(evidence.get("star"))
    drawn = drawn_of(candidate, evidence.get("mixture"), session.basis)
    p_min = session.settings.p_min
    return Dossier(candidate, evidence, session.view(name), oddness, tuple(measured), alike, p_min, drawn)


def drawn_of(candidate: Candidate, mixture: Evidence | None, basis: Basis) -> Drawn | None:
    """Fluxes drawn from the nearest mixture, the same each time for the same evidence."""
    if mixture is None or mixture.adequate is not False:
        return None
    import numpy as np

    from tui.checks.mixture_draws import drawn
    from tui.workflow.spectral_grids import templates_of

    rng = np.random.default_rng(int(mixture.digest[:16], 16))
    return drawn(candidate, templates_of(candidate, basis), basis.settings, rng)


def drawn_dict(found: Drawn | None) -> dict[str, Any]:
    """What the draws say, beside the bound; nothing where there are none."""
    return {"bootstrap": {"draws": found.draws, "as_bad": found.as_bad, "p": found.p}} if found else {}


def oddness_dict(star: Evidence | None) -> dict[str, Any]:
    """Oddness in sigma beside the band of the largest pull and that pull, as the queue lists them."""
    from tui.store.deriving import oddness_of

    sigma, band, pull = oddness_of(star)
    return {} if sigma is None else {"sigma": sigma, "band": band, "pull": pull}


def evidence_dict(evidence: Evidence | None) -> dict[str, Any]:
    """Evidence that is no check (the mixture bound); empty where it was not computed."""
    if evidence is None:
        return {}
    return {
        "version": evidence.version,
        "digest": evidence.digest,
        "adequate": evidence.adequate,
        "cautions": list(evidence.cautions),
        "fits": [fit_dict(fit) for fit in evidence.fits],
        "facts": plain(evidence.facts),
    }


def fit_dict(fit: Fit) -> dict[str, Any]:
    """One fit, NaN as null."""
    return {
        "model": fit.model,
        "chi2": plain(fit.chi2),
        "dof": fit.dof,
        "p": plain(fit.p),
        "aic": plain(fit.aic),
        "bic": plain(fit.bic),
        "params": {
            name: {
                "value": plain(param.value),
                "low": plain(param.low),
                "high": plain(param.high),
                "unit": param.unit,
                "limit": param.limit,
            }
            for name, param in fit.params.items()
        },
        "pulls": plain(fit.pulls),
    }


def measurement_dict(one: Measurement) -> dict[str, Any]:
    """One measurement, in Jy and as given, NaN as null."""
    names = "band flux_jy error_jy limit nsigma source epoch flags exclude value value_error unit note".split()
    return {name: plain(getattr(one, name)) for name in names}


def dip_dicts(dips: Iterable[Dip], evidence: Evidence | None) -> list[dict[str, Any]]:
    """One object an event: its depths, its fits, and, for the most significant, the facts of the evidence."""
    events: dict[str, list[Dip]] = {}
    for dip in dips:
        events.setdefault(dip.event, []).append(dip)
    names = evidence.facts.get("events", []) if evidence else []
    ordered = [name for name in names if name in events] + [name for name in events if name not in names]
    return [event_dict(name, events[name], evidence, ordered) for name in ordered]


def event_dict(name: str, dips: Iterable[Dip], evidence: Evidence | None, events: Sequence[str]) -> dict[str, Any]:
    """One dimming event."""
    label = f" ({name})" if len(events) > 1 else ""
    fits = [fit_dict(fit) for fit in evidence.fits if fit.model.endswith(label)] if evidence else []
    return {
        "event": name,
        "stands": bool(evidence) and name in evidence.facts.get("standing_events", []),
        "depths": [plain({part: getattr(dip, part) for part in DIP_PARTS}) for dip in dips],
        "fits": [fit | {"model": fit["model"].removesuffix(label)} for fit in fits],
        "cautions": [text for text in evidence.cautions if text.startswith(f"{name}:")] if evidence else [],
        "facts": plain(evidence.facts) if evidence and name == events[0] else {},
    }
