"""All that speaks for or against one candidate's bands, apart from any fit."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from tui.checks.apertures import ApertureDifference, aperture_differences
from tui.checks.brightness import brightness_doubts
from tui.checks.doubts import Doubt, suspect_bands
from tui.checks.epochs import Constancy, epoch_constancy
from tui.checks.flags import FlagReading, candidate_flags
from tui.checks.gaia_quality import gaia_doubts, gaia_facts, gaia_numbers
from tui.checks.neighbours import Leak, neighbour_doubts, neighbour_leaks
from tui.checks.tables import Tables
from tui.model import Band, Candidate


@dataclass(frozen=True, slots=True, eq=False)
class Quality:
    """All that is known about one candidate's data apart from the fits."""

    flags: tuple[FlagReading, ...]
    epochs: tuple[Constancy, ...]
    apertures: tuple[ApertureDifference, ...]
    leaks: tuple[Leak, ...]
    gaia: Mapping[str, float]
    doubts: tuple[Doubt, ...]
    suspects: frozenset[str]  # bands that some suspicion stands against
    is_loaded: bool  # whether any column was there that could speak against a band

    def as_facts(self) -> dict[str, Any]:
        """As the evidence stores it: what says that all is well is only counted."""
        telling = [reading for reading in self.flags if reading.cause]
        others = [doubt for doubt in self.doubts if doubt.kind != "flag"]
        return {
            **self.gaia,
            "flags": [reading.as_dict() for reading in telling],
            "flags_fine": len(self.flags) - len(telling),
            "doubts": [doubt.as_dict() for doubt in others if not doubt.is_fine],
            "doubts_fine": sum(doubt.is_fine for doubt in others),
            "epochs": {e.band: {"n": e.n, "scatter": round(e.scatter, 6), "p": e.p} for e in self.epochs},
            "apertures": {
                a.band: {"difference": round(a.difference_mag, 4), "error": round(a.error_mag, 4)}
                for a in self.apertures
            },
            "neighbour_leaks": [leak.as_dict() for leak in self.leaks if leak.leak_jy > 0],
        }


def candidate_quality(
    candidate: Candidate,
    bands: Mapping[str, Band],
    tables: Tables,
    gaia: Mapping[str, float],
    anomaly_jy: Mapping[str, float],
) -> Quality:
    """Everything independent of the fits that can be said about a candidate's bands."""
    flags = candidate_flags(candidate, tables.flags)
    epochs = tuple(epoch_constancy(candidate, {name: band.floor for name, band in bands.items()}))
    apertures = tuple(aperture_differences(candidate, bands))
    leaks = neighbour_leaks(candidate, bands, anomaly_jy)
    doubts = [reading.as_doubt() for reading in flags]
    doubts += brightness_doubts(candidate, bands)
    doubts += gaia_doubts(gaia, tuple(dict.fromkeys(m.band for m in candidate.measurements)))
    doubts += [item.as_doubt() for item in (*epochs, *apertures)]
    doubts += neighbour_doubts(candidate, bands, leaks)
    has_flags = any(str(text).strip() for m in candidate.measurements for text in m.flags.values())
    is_loaded = bool(has_flags or flags or epochs or apertures or candidate.neighbours or gaia)
    return Quality(flags, epochs, apertures, tuple(leaks), gaia, tuple(doubts), suspect_bands(doubts), is_loaded)


def all_gaia_facts(
    candidates: Sequence[Candidate], bands: Mapping[str, Band], tables: Tables
) -> list[dict[str, float]]:
    """Gaia's numbers for each candidate."""
    numbers = gaia_numbers(candidates, bands, tables.excess, tables.quiet)
    return [gaia_facts(numbers, row) for row in range(len(candidates))]
