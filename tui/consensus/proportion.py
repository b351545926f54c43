"""Exact bounds on a proportion: so many events in so many trials.

Source: Clopper & Pearson 1934, Biometrika 26, 404. The bounds are beta quantiles; for no event the upper one is
1 - alpha**(1/n), of which 3/n is the rule of thumb at 95 %.
"""

from __future__ import annotations

from dataclasses import dataclass

from tui.errors import InputError

CONFIDENCE = 0.95


def lower_bound(events: int, trials: int, alpha: float) -> float:
    """The one-sided lower bound at confidence 1 - alpha; 0 for no event."""
    _require_counts(events, trials)
    if events == 0:
        return 0.0
    from scipy.special import betaincinv

    return float(betaincinv(events, trials - events + 1, alpha))


def upper_bound(events: int, trials: int, alpha: float) -> float:
    """The one-sided upper bound at confidence 1 - alpha; 1 where every trial was an event."""
    _require_counts(events, trials)
    if events == trials:
        return 1.0
    from scipy.special import betaincinv

    return float(betaincinv(events + 1, trials - events, 1 - alpha))


def _require_counts(events: int, trials: int) -> None:
    if not 0 <= events <= trials:
        raise InputError(f"{events} events cannot come from {trials} trials.")


@dataclass(frozen=True, slots=True)
class Rate:
    """A share that was counted, with its two-sided exact interval; nothing is known of it without a trial."""

    events: int
    trials: int
    confidence: float = CONFIDENCE

    @property
    def value(self) -> float | None:
        """events / trials; None without a trial."""
        return self.events / self.trials if self.trials else None

    @property
    def low(self) -> float | None:
        """Lower end of the interval; None without a trial."""
        return lower_bound(self.events, self.trials, (1 - self.confidence) / 2) if self.trials else None

    @property
    def high(self) -> float | None:
        """Upper end of the interval; None without a trial."""
        return upper_bound(self.events, self.trials, (1 - self.confidence) / 2) if self.trials else None

    def as_dict(self) -> dict[str, float | int | None]:
        """For JSON."""
        return {
            "events": self.events, "trials": self.trials, "value": self.value,
            "low": self.low, "high": self.high, "confidence": self.confidence,
        }  # fmt: skip
