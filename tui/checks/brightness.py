"""Is the star too bright or too faint for the survey: saturation, non-linearity, depth."""

from __future__ import annotations

import math
from collections.abc import Mapping

from tui.checks.doubts import INFORMATIVE, SUSPICION, Doubt
from tui.model import Band, Candidate, Measurement
from tui.physics.gaia import BRIGHT_G_RANGE, bright_correction

NEAR_SATURATION_MAG = 0.5  # fainter than the limit by less than this: the detector may not be linear; our choice
DETECTED_SIGMA = 2.0  # AllWISE calls what lies below it an upper limit (ph_qual U); Explanatory Supplement II.1.a
FAINT_BP_MAG = 20.3  # beyond it BP of red sources is too bright (Riello et al. 2021, A&A 649, A3, section 8.1)


def band_mag(measurement: Measurement, band: Band) -> float:
    """Magnitude in the band's own system; NaN for a limit or where the flux is not positive."""
    if measurement.limit or not measurement.flux_jy > 0:
        return math.nan
    return -2.5 * math.log10(measurement.flux_jy / band.zero_point_jy)


def is_detected(measurement: Measurement) -> bool:
    """Whether the catalogue saw the star in this band, and did not just measure its place on the sky."""
    if measurement.limit or measurement.flags.get("ph_qual", "").strip() == "U":
        return False
    return not measurement.flux_jy < DETECTED_SIGMA * measurement.error_jy


def brightness_doubts(candidate: Candidate, bands: Mapping[str, Band]) -> list[Doubt]:
    """Saturation (suspicion), nearness to it, and detections below the survey's depth, for each measured band."""
    doubts: list[Doubt] = []
    for measurement in candidate.measurements:
        band = bands.get(measurement.band)
        mag = math.nan if band is None else band_mag(measurement, band)
        if math.isfinite(mag):
            doubts.extend(_bright(band, mag))
            doubts.extend(_faint(band, mag) if is_detected(measurement) else [])
    return list(dict.fromkeys(doubts))


def _bright(band: Band, mag: float) -> list[Doubt]:
    room = mag - band.saturation_mag
    if room < 0:
        text = f"{mag:.1f} mag lies above the saturation limit, {band.saturation_mag:.1f} mag"
        return [Doubt(band.name, "saturation", text, SUSPICION)]
    if room < NEAR_SATURATION_MAG:
        text = f"{mag:.1f} mag lies within {NEAR_SATURATION_MAG} mag of the saturation limit: non-linearity is possible"
        return [Doubt(band.name, "saturation", text, INFORMATIVE)]
    if band.name == "Gaia_G" and BRIGHT_G_RANGE[0] < mag < BRIGHT_G_RANGE[1]:
        text = (
            f"bright for Gaia: {float(bright_correction(mag)):+.3f} mag should be added to G (Riello et al. 2021, "
            "C.1); the fits use the catalogue's value"
        )
        return [Doubt(band.name, "saturation", text, INFORMATIVE)]
    return []


def _faint(band: Band, mag: float) -> list[Doubt]:
    if band.name == "Gaia_BP" and mag > FAINT_BP_MAG:
        text = f"{mag:.1f} mag: BP fainter than {FAINT_BP_MAG} mag is too bright for red sources (Riello et al. 2021)"
        return [Doubt(band.name, "depth", text, SUSPICION)]
    if mag > band.limit_mag:
        text = (
            f"{mag:.1f} mag lies below the survey's usual depth, {band.limit_mag:.1f} mag: "
            "what is detected there is on average too bright"
        )
        return [Doubt(band.name, "depth", text, INFORMATIVE)]
    return []
