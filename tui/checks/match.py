"""Is it the right star in the other catalogue: positions brought to its epoch by proper motion."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from tui.checks.prepare import fact
from tui.model import Candidate
from tui.physics.context import match_probability, offset_arcsec, propagate

P_MATCH = 0.01  # below it a match is called in doubt; 1 in 100 right matches is
GAIA_EPOCH_YR = 2016.0  # of Gaia DR3 positions, where ref_epoch is not given
MAS = 1e-3


@dataclass(frozen=True, slots=True)
class Catalogue:
    """A catalogue whose position is compared with the candidate's own."""

    prefix: str  # of its facts: PREFIX_ra, PREFIX_dec ...
    title: str
    epoch_yr: float  # mean epoch, where PREFIX_epoch is not given
    sigma_arcsec: float  # 1-sigma position error in each axis, where PREFIX_position_error is not given
    instruments: tuple[str, ...]  # of the bands that the position was measured in


# Epochs and typical position errors: Skrutskie et al. 2006, AJ 131, 1163; Cutri et al. 2013 (AllWISE, II.5);
# Chambers et al. 2016, arXiv:1612.05560; Pier et al. 2003, AJ 125, 1559; Morrissey et al. 2007, ApJS 173, 682;
# Ishihara et al. 2010, A&A 514, A1; Spitzer's pointing as the handbooks give it; IRAS ellipses vary from source to
# source, so that without its own error an IRAS position is taken to be good to 10 arcsec.
CATALOGUES = (
    Catalogue("twomass", "2MASS", 2000.0, 0.08, ("2MASS",)),
    Catalogue("wise", "AllWISE", 2010.5589, 0.10, ("WISE",)),
    Catalogue("sdss", "SDSS", 2003.0, 0.06, ("SDSS",)),
    Catalogue("ps1", "Pan-STARRS", 2012.5, 0.03, ("PS1",)),
    Catalogue("galex", "GALEX", 2007.0, 0.6, ("GALEX",)),
    Catalogue("spitzer", "Spitzer", 2006.0, 0.3, ("IRAC", "MIPS")),
    Catalogue("akari", "AKARI", 2006.9, 1.0, ("AKARI",)),
    Catalogue("iras", "IRAS", 1983.5, 10.0, ("IRAS",)),
)
ASSUMED_MOTION_ERROR_MAS_YR = 0.5  # where the candidate's proper motion has no error


@dataclass(frozen=True, slots=True)
class Match:
    """One catalogue's source against where the candidate was at that catalogue's epoch."""

    catalogue: str
    separation_arcsec: float
    sigma_arcsec: float
    d2: float  # squared separation in units of its error
    p: float  # share of right matches that lie farther off
    moved_arcsec: float  # by proper motion between the epochs; NaN where no proper motion was given
    nearest_other_arcsec: float  # second-nearest source, NaN where unknown

    def as_dict(self) -> dict[str, float | str]:
        """As the evidence stores it."""
        return {
            "catalogue": self.catalogue, "separation": self.separation_arcsec, "sigma": self.sigma_arcsec,
            "d2": self.d2, "p": self.p, "moved": self.moved_arcsec, "nearest_other": self.nearest_other_arcsec,
        }  # fmt: skip

    def sentence(self) -> str:
        """What it means, for a match in doubt."""
        start = (
            f"{self.catalogue}: its source lies {self.separation_arcsec:.2f} arcsec from where the star was at that "
            f"epoch, {math.sqrt(self.d2):.1f} sigma (p {self.p:.1g})"
        )
        if math.isnan(self.moved_arcsec):
            return f"{start}; no proper motion was given, which may be the reason."
        return f"{start}: another source, or the light of two mixed."


def catalogue_matches(candidate: Candidate) -> list[Match]:
    """Matches of every catalogue whose position was loaded; none where the candidate has no position itself."""
    if not math.isfinite(fact(candidate, "ra") + fact(candidate, "dec")):
        return []
    matches = []
    for catalogue in CATALOGUES:
        found = _match(candidate, catalogue)
        if found is not None:
            matches.append(found)
    return matches


def _match(candidate: Candidate, catalogue: Catalogue) -> Match | None:
    ra, dec = (fact(candidate, f"{catalogue.prefix}_{axis}") for axis in ("ra", "dec"))
    if not math.isfinite(ra + dec):
        return None
    years = _or(fact(candidate, f"{catalogue.prefix}_epoch"), catalogue.epoch_yr) - _or(
        fact(candidate, "ref_epoch"), GAIA_EPOCH_YR
    )
    moved = propagate(_or(fact(candidate, "pmra"), 0.0), _or(fact(candidate, "pmdec"), 0.0), 0.0, years)
    seen = offset_arcsec(fact(candidate, "ra"), fact(candidate, "dec"), ra, dec)
    east, north = float(seen[0] - moved[0]), float(seen[1] - moved[1])
    sigma = _sigma(candidate, catalogue, years)
    separation = math.hypot(east, north)
    has_motion = math.isfinite(fact(candidate, "pmra") + fact(candidate, "pmdec"))
    return Match(
        catalogue=catalogue.title,
        separation_arcsec=separation,
        sigma_arcsec=sigma,
        d2=(separation / sigma) ** 2,
        p=float(match_probability(east, north, sigma)),
        moved_arcsec=float(np.hypot(*moved)) if has_motion else math.nan,
        nearest_other_arcsec=fact(candidate, f"{catalogue.prefix}_prox"),
    )


def _sigma(candidate: Candidate, catalogue: Catalogue, years: float) -> float:
    """Error of the offset in one axis: both positions and the proper motion over the years between."""
    own = MAS * _or(max(fact(candidate, "ra_error"), fact(candidate, "dec_error")), 0.0)
    motion = max(fact(candidate, "pmra_error"), fact(candidate, "pmdec_error"))
    drift = MAS * abs(years) * _or(motion, ASSUMED_MOTION_ERROR_MAS_YR)
    other = _or(fact(candidate, f"{catalogue.prefix}_position_error"), catalogue.sigma_arcsec)
    return math.sqrt(own**2 + drift**2 + max(other, 0.01) ** 2)


def _or(value: float, otherwise: float) -> float:
    return value if math.isfinite(value) else otherwise


def match_sentences(matches: list[Match]) -> tuple[str, ...]:
    """Cautions for matches in doubt."""
    return tuple(match.sentence() for match in matches if match.p < P_MATCH)


def worst_match(matches: list[Match]) -> Mapping[str, Any]:
    """The match with the smallest p as facts; empty where there is none."""
    if not matches:
        return {}
    worst = min(matches, key=lambda match: match.p)
    return {"match_catalogue": worst.catalogue, "match_separation": worst.separation_arcsec, "match_p": worst.p}


def nearest_source(candidate: Candidate, matches: list[Match]) -> float:
    """Separation of the nearest other source known, arcsec: of the neighbour table or a catalogue's own column."""
    known = [n.separation_arcsec for n in candidate.neighbours] + [m.nearest_other_arcsec for m in matches]
    known += [fact(candidate, "twomass_prox"), fact(candidate, "tycho_prox")]
    return min((x for x in known if math.isfinite(x)), default=math.nan)
