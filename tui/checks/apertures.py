"""Aperture against profile magnitudes: a point source has one brightness by both."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from tui.checks.brightness import band_mag
from tui.checks.doubts import INFORMATIVE, SUSPICION, Doubt
from tui.checks.flags import BAND_LETTERS
from tui.model import Band, Candidate, Measurement

N_SIGMA = 3.0
LEAST_MAG = 0.1  # smaller differences are within what aperture corrections are good for; our choice
# columns of an aperture magnitude and its error: native form, AllWISE, 2MASS, Pan-STARRS; "?" is the band's letter
APERTURE_COLUMNS = (
    ("aperture_mag", "aperture_mag_error"),
    ("?mag", "?sigm"),
    ("?_m_stdap", "?_msig_stdap"),
    ("?MeanApMag", "?MeanApMagErr"),
)


@dataclass(frozen=True, slots=True)
class ApertureDifference:
    """Aperture minus profile magnitude: negative where the wider aperture sees more light."""

    band: str
    difference_mag: float
    error_mag: float

    @property
    def is_odd(self) -> bool:
        """Whether the two disagree beyond their errors."""
        return abs(self.difference_mag) > max(N_SIGMA * self.error_mag, LEAST_MAG)

    def as_doubt(self) -> Doubt:
        """The difference as evidence about the band."""
        number = f"{self.difference_mag:+.2f} +- {self.error_mag:.2f} mag"
        if not self.is_odd:
            return Doubt(self.band, "aperture", f"aperture and profile magnitudes agree ({number})", INFORMATIVE, is_fine=True)
        why = "light beside the star" if self.difference_mag < 0 else "the profile fit took in too much"
        return Doubt(self.band, "aperture", f"aperture minus profile magnitude {number}: {why}", SUSPICION)


def aperture_differences(candidate: Candidate, bands: Mapping[str, Band]) -> list[ApertureDifference]:
    """Differences for all detections that carry an aperture magnitude beside their own."""
    found = []
    for measurement in candidate.measurements:
        band = bands.get(measurement.band)
        if band is not None:
            found.extend(_difference(measurement, band))
    return found


def _difference(measurement: Measurement, band: Band) -> list[ApertureDifference]:
    letter = BAND_LETTERS.get(band.name, "")
    for columns in APERTURE_COLUMNS:
        column, error_column = (name.replace("?", letter) for name in columns)
        if column not in measurement.flags:
            continue
        mag, error = number(measurement.flags[column]), number(measurement.flags.get(error_column))
        own = band_mag(measurement, band)
        if math.isfinite(mag) and math.isfinite(own):
            profile = 1.0857 * measurement.error_jy / measurement.flux_jy
            known = [x for x in (error, profile) if math.isfinite(x)]
            return [ApertureDifference(band.name, mag - own, math.hypot(*known) if known else LEAST_MAG)]
    return []


def number(text: object) -> float:
    """A cell as float, NaN where it is not one."""
    try:
        return float(text)  # type: ignore[arg-type]
    except (TypeError, ValueError):
        return math.nan
