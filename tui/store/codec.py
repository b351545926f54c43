"""Evidence as the JSON text that the queue keeps; every number comes back as it went in."""

from __future__ import annotations

import json
import math
from collections.abc import Callable, Mapping, Sequence
from functools import lru_cache
from typing import Any

from tui.errors import StoreError
from tui.model import Evidence, Fit, Param, plain

ENCODER = json.JSONEncoder(separators=(",", ":"), ensure_ascii=True, allow_nan=False)


def number(value: float) -> float | str | None:
    """A float as JSON can hold it: NaN as null, infinities as text."""
    value = float(value)
    if math.isfinite(value):
        return value
    return None if math.isnan(value) else str(value)


def from_number(value: float | str | None) -> float:
    """What `number` wrote."""
    return math.nan if value is None else float(value)


def evidence_text(evidence: Evidence) -> str:
    """Everything of the evidence but kind, version, digest and adequate, which are columns."""
    try:
        return ENCODER.encode(content_of(evidence, quick_fit, dict))
    except (TypeError, ValueError):  # numbers that JSON has not, or numpy's
        return ENCODER.encode(content_of(evidence, fit_list, plain))


def content_of(
    evidence: Evidence, fit: Callable[[Fit], list[Any]], facts: Callable[[Mapping[str, Any]], Any]
) -> dict[str, Any]:
    """What the text holds."""
    return {
        "fits": [fit(one) for one in evidence.fits],
        "cautions": list(evidence.cautions),
        "facts": facts(evidence.facts),
        "bands": list(evidence.bands),
    }


def quick_fit(fit: Fit) -> list[Any]:
    """`fit_list` for a fit whose numbers are all finite; four times as fast."""
    return [
        *(fit.model, fit.chi2, fit.dof, fit.p, fit.aic, fit.bic),
        {name: [one.value, one.low, one.high, one.unit, one.limit] for name, one in fit.params.items()},
        *(dict(fit.pulls), fit.minus2lnl),
    ]


def fit_list(fit: Fit) -> list[Any]:
    """One fit as a list, in the order of its fields."""
    return [
        fit.model,
        number(fit.chi2),
        int(fit.dof),
        *(number(value) for value in (fit.p, fit.aic, fit.bic)),
        {name: param_list(param) for name, param in fit.params.items()},
        {band: number(pull) for band, pull in fit.pulls.items()},
        number(fit.minus2lnl),
    ]


def param_list(param: Param) -> list[Any]:
    """One fitted number as a list, in the order of its fields."""
    return [number(param.value), number(param.low), number(param.high), param.unit, bool(param.limit)]


@lru_cache(maxsize=512)
def evidence_from(kind: str, version: int, digest: str, adequate: int | None, text: str) -> Evidence:
    """The evidence of one row; the same object for the same row, which nobody changes.

    Raises:
        StoreError: the text is not as `evidence_text` writes it.
    """
    try:
        return decoded(kind, version, digest, adequate, json.loads(text))
    except (AttributeError, KeyError, TypeError, ValueError, RecursionError) as error:
        raise StoreError(f"Evidence on {kind} is damaged; find the candidate with: plainlight audit QUEUE.") from error


def decoded(kind: str, version: int, digest: str, adequate: int | None, content: Mapping[str, Any]) -> Evidence:
    """The evidence of one row whose text was parsed."""
    return Evidence(
        kind=kind,
        version=version,
        adequate=None if adequate is None else bool(adequate),
        fits=tuple(fit_from(fit) for fit in content["fits"]),
        cautions=tuple(content["cautions"]),
        facts=content["facts"],
        digest=digest,
        bands=tuple(content["bands"]),
    )


def is_sound(row: Sequence[Any]) -> bool:
    """Whether a row (kind, version, digest, adequate, content), maybe from elsewhere, is as this module writes it."""
    try:
        evidence = evidence_from(*row)
        words = [*evidence.cautions, *evidence.bands]
        for fit in evidence.fits:
            words += [fit.model, *(param.unit for param in fit.params.values())]
        again = json.loads(evidence_text(evidence))
        return all(isinstance(word, str) for word in words) and again == json.loads(row[4])
    except (AttributeError, TypeError, ValueError, StoreError):
        return False


def fit_from(fit: list[Any]) -> Fit:
    """What `fit_list` wrote."""
    model, chi2, dof, p, aic, bic, params, pulls, minus2lnl = fit
    return Fit(
        model=model,
        chi2=from_number(chi2),
        dof=dof,
        p=from_number(p),
        aic=from_number(aic),
        bic=from_number(bic),
        params={
            name: Param(from_number(value), from_number(low), from_number(high), unit, limit)
            for name, (value, low, high, unit, limit) in params.items()
        },
        pulls={band: from_number(pull) for band, pull in pulls.items()},
        minus2lnl=from_number(minus2lnl),
    )
