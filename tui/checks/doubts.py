"""A reason to doubt one band, in words, with whether it can change the flux of a real star."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

SUSPICION = "suspicion"
INFORMATIVE = "informative"
DOUBT_KINDS = ("flag", "saturation", "depth", "colour excess", "scatter", "epoch", "aperture", "neighbour")


@dataclass(frozen=True, slots=True)
class Doubt:
    """Independent evidence about one band: independent of whether a model fits it."""

    band: str
    kind: str  # one of DOUBT_KINDS
    text: str
    severity: str = INFORMATIVE
    is_fine: bool = False  # it says that nothing is wrong: counted, and not told again

    @property
    def is_suspicion(self) -> bool:
        """Whether the cause can change the flux of a real star."""
        return self.severity == SUSPICION

    def as_dict(self) -> dict[str, str]:
        """As the evidence stores it."""
        return {"band": self.band, "kind": self.kind, "text": self.text, "severity": self.severity}


def suspect_bands(doubts: Iterable[Doubt]) -> frozenset[str]:
    """Bands that at least one suspicion stands against."""
    return frozenset(doubt.band for doubt in doubts if doubt.is_suspicion)


def sentences(doubts: Iterable[Doubt]) -> tuple[str, ...]:
    """One sentence for each different suspicion, its bands gathered, as in `W1, W2: text.`"""
    bands_of: dict[str, list[str]] = {}
    for doubt in doubts:
        if doubt.is_suspicion:
            bands = bands_of.setdefault(doubt.text, [])
            if doubt.band not in bands:
                bands.append(doubt.band)
    return tuple(f"{', '.join(bands)}: {text}." for text, bands in bands_of.items())
