"""How likely an unrelated star or galaxy, bright enough to make the excess, lies in the beam by chance."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tui.checks.prepare import fact
from tui.model import Band, Candidate
from tui.physics.context import chance_alignment, density_at
from tui.physics.sky_counts import (
    ARCSEC2_PER_DEG2,
    V_MINUS_INFRARED,
    GalaxyAnchor,
    galaxies_per_deg2,
    stars_per_deg2,
)

FLAT_SLOPE = 0.6  # of counts in flat unclustered space: an upper bound where a density has no slope of its own
LEAST_EXCESS_SIGMA = 3.0  # a band left over by less has no excess to explain
INFRARED_UM = 1.0
# Sources whose leak into the fit, F exp(-2 ln 2 (s/FWHM)^2), reaches the excess: with counts N(> F) ~ F^-1.5 there are
# as many of them as sources of at least the excess within FWHM/sqrt(3 ln 2).
RADIUS_PER_FWHM = 1.0 / math.sqrt(3.0 * math.log(2.0))
NEAREST_BAND = 0.35  # |ln wavelength ratio| up to which a count in another band serves
LARGE_BEAM_ARCSEC = 5.0  # wider than this counts as large, and
FAINT_MAG = 3.0  # an excess within so much of the survey's depth as faint: our choices
LIKELY = 0.01  # above it a caution is given; our choice


@dataclass(frozen=True, slots=True)
class Chance:
    """Chance alignment with the excess in one band."""

    band: str
    mag: float  # of the excess, in the band's system
    radius_arcsec: float  # within which a source of this brightness would make the excess
    p_star: float  # NaN where no count is known
    p_galaxy: float
    star_source: str  # where the count comes from
    galaxy_source: str
    beam_arcsec: float
    is_faint: bool  # the excess is within 3 mag of the survey's depth

    @property
    def p(self) -> float:
        """Of either: 1 - (1 - p_star)(1 - p_galaxy), unknown ones left out; NaN where both are."""
        known = [p for p in (self.p_star, self.p_galaxy) if math.isfinite(p)]
        return 1.0 - math.prod(1.0 - p for p in known) if known else math.nan

    def as_facts(self) -> dict[str, float | str]:
        """As the evidence stores it; `chance_alignment` is of either."""
        return {
            "chance_alignment": self.p, "chance_star": self.p_star, "chance_galaxy": self.p_galaxy,
            "chance_band": self.band, "chance_mag": self.mag, "chance_radius": self.radius_arcsec,
            "chance_star_source": self.star_source, "chance_galaxy_source": self.galaxy_source,
        }  # fmt: skip


def excess_band(anomaly_jy: Mapping[str, float], pulls: Mapping[str, float]) -> str:
    """The band of the largest positive pull of the star-only fit; empty where none reaches 3 sigma."""
    bright = {band: pull for band, pull in pulls.items() if pull >= LEAST_EXCESS_SIGMA}
    positive = {band: pull for band, pull in bright.items() if anomaly_jy.get(band, 0.0) > 0}
    return max(positive, key=positive.__getitem__, default="")


def chance_of(
    candidate: Candidate,
    anomaly_jy: Mapping[str, float],
    pulls: Mapping[str, float],
    bands: Mapping[str, Band],
    anchors: Sequence[GalaxyAnchor],
) -> Chance | None:
    """Chance alignment for the excess that stands out most; None where there is no excess or no beam.

    Args:
        anomaly_jy: band -> measured minus star-only model, Jy.
        pulls: band -> star-only pull.
        anchors: galaxy counts, used where the candidate carries no count of its own.
    """
    name = excess_band(anomaly_jy, pulls)
    band = bands.get(name)
    if band is None or not band.beam_fwhm_arcsec > 0:
        return None
    mag = -2.5 * math.log10(anomaly_jy[name] / band.zero_point_jy)
    radius = RADIUS_PER_FWHM * band.beam_fwhm_arcsec
    stars, star_source = star_density(candidate, band, mag)
    galaxies, galaxy_source = galaxy_density(candidate, band, mag, anchors)
    return Chance(
        name, mag, radius, float(chance_alignment(radius, stars)), float(chance_alignment(radius, galaxies)),
        star_source, galaxy_source, band.beam_fwhm_arcsec, mag > band.limit_mag - FAINT_MAG,
    )  # fmt: skip


def own_density(candidate: Candidate, kind: str, band: Band, mag: float) -> float:
    """Density per square arcsec from the candidate's own count of `star` or `galaxy` in this band; else NaN."""
    if candidate.facts.get(f"density_{kind}_band") not in (band.name, None):
        return math.nan
    slope = fact(candidate, f"density_{kind}_slope")
    slope = slope if math.isfinite(slope) else FLAT_SLOPE
    return float(density_at(fact(candidate, f"density_{kind}"), fact(candidate, f"density_{kind}_mag"), mag, slope))


def star_density(candidate: Candidate, band: Band, mag: float) -> tuple[float, str]:
    """Stars per square arcsec brighter than `mag`, and the source of the number."""
    own = own_density(candidate, "star", band, mag)
    if math.isfinite(own):
        return own, "the candidate's own count"
    glon, glat = galactic(candidate)
    if not math.isfinite(glat):
        return math.nan, "unknown: no position and no count"
    v_mag = mag + (V_MINUS_INFRARED if band.pivot_um > INFRARED_UM else 0.0)
    return stars_per_deg2(v_mag, glon, glat) / ARCSEC2_PER_DEG2, "Bahcall & Soneira 1980, good to a factor of 3"


def galaxy_density(
    candidate: Candidate, band: Band, mag: float, anchors: Sequence[GalaxyAnchor]
) -> tuple[float, str]:
    """Galaxies per square arcsec brighter than `mag`, and the source of the number."""
    own = own_density(candidate, "galaxy", band, mag)
    if math.isfinite(own):
        return own, "the candidate's own count"
    far = {anchor.band: abs(math.log(anchor.wave_um / band.pivot_um)) for anchor in anchors}
    nearest = min(anchors, key=lambda anchor: far[anchor.band], default=None)
    if nearest is None or far[nearest.band] > NEAREST_BAND:
        return math.nan, "unknown: no count near this band"
    source = f"whole-sky counts in {nearest.band}, good to a factor of 3"
    return galaxies_per_deg2(mag, nearest) / ARCSEC2_PER_DEG2, source


# J2000 north galactic pole and ascending longitude: ESA 1997, Hipparcos catalogue, vol. 1, section 1.5.3
POLE_RA, POLE_DEC, LON_NCP = np.radians([192.85948, 27.12825, 122.93192])


def galactic(candidate: Candidate) -> tuple[float, float]:
    """Galactic longitude and latitude, degrees, given or from ra and dec; NaN where neither is known."""
    given = fact(candidate, "glon"), fact(candidate, "glat")
    if math.isfinite(sum(given)):
        return given
    ra, dec = np.radians(fact(candidate, "ra")), np.radians(fact(candidate, "dec"))
    sine = np.sin(dec) * np.sin(POLE_DEC) + np.cos(dec) * np.cos(POLE_DEC) * np.cos(ra - POLE_RA)
    y = np.cos(dec) * np.sin(ra - POLE_RA)
    x = np.sin(dec) * np.cos(POLE_DEC) - np.cos(dec) * np.sin(POLE_DEC) * np.cos(ra - POLE_RA)
    return float(np.degrees(LON_NCP - np.arctan2(y, x)) % 360.0), float(np.degrees(np.arcsin(np.clip(sine, -1, 1))))


def chance_sentences(chance: Chance | None, n_searched: int | None) -> tuple[str, ...]:
    """Cautions: the beam is large and the excess faint, or the search is wide enough to meet such a source."""
    if chance is None:
        return ()
    said = []
    if chance.is_faint and chance.beam_arcsec > LARGE_BEAM_ARCSEC:
        said.append(
            f"{chance.band}: beam {chance.beam_arcsec:.1f} arcsec and a faint excess: confusion is common "
            "(8 of 22 white dwarfs with an excess; Dennihy et al. 2020)."
        )
    if not math.isfinite(chance.p):
        return tuple(said)
    if chance.p > LIKELY:
        said.append(
            f"{chance.band}: an unrelated source as bright as the excess ({chance.mag:.1f} mag) lies within "
            f"{chance.radius_arcsec:.1f} arcsec of {100 * chance.p:.1g} % of stars."
        )
    if n_searched and n_searched * chance.p >= 1.0:
        met = round(n_searched * chance.p)
        who = "about one meets" if met == 1 else f"some {met} meet"
        said.append(f"Among the {n_searched} stars searched {who} such a source by chance.")
    return tuple(said)


