"""Signs of a second star in Gaia's own columns: RUWE, double images, blended transits, binary solutions."""

from __future__ import annotations

import math
from typing import Any

from tui.checks.flags import blend_shares
from tui.checks.prepare import fact
from tui.model import Candidate, Settings

MULTI_PEAK_PERCENT = 10.0  # our choices: a few per cent are common among single stars
HARMONIC_AMPLITUDE = 0.1  # Fabricius et al. 2021, A&A 649, A5, take 0.1 and more for partly resolved pairs
BLENDED_SHARE = 0.1
NOISE_SIGNIFICANCE = 2.0  # Lindegren et al. 2012, A&A 538, A78: significant above 2
NSS_BITS = {1: "astrometric", 2: "spectroscopic", 4: "eclipsing"}


def multiplicity(candidate: Candidate, settings: Settings) -> tuple[dict[str, Any], tuple[str, ...]]:
    """Facts that were loaded, and cautions about those that point to more than one star."""
    facts = {name: fact(candidate, name) for name in ("ruwe", "ipd_frac_multi_peak", "ipd_gof_harmonic_amplitude")}
    facts = {name: value for name, value in facts.items() if math.isfinite(value)}
    facts.update({k: v for k, v in blend_shares(candidate.facts).items() if k.endswith("blended_share")})
    bits = fact(candidate, "non_single_star")
    if math.isfinite(bits):
        facts["non_single_star"] = int(bits)
    return facts, tuple(_cautions(candidate, facts, settings))


def _cautions(candidate: Candidate, facts: dict[str, Any], settings: Settings) -> list[str]:
    said = []
    if facts.get("ruwe", 0.0) > settings.ruwe_max:
        said.append(
            f"RUWE {facts['ruwe']:.2f} is above {settings.ruwe_max:g}: the star does not move as a single one "
            "(common practice; Lindegren 2018)."
        )
    if facts.get("ipd_frac_multi_peak", 0.0) > MULTI_PEAK_PERCENT:
        said.append(f"Gaia saw more than one peak in {facts['ipd_frac_multi_peak']:.0f} % of its windows.")
    if facts.get("ipd_gof_harmonic_amplitude", 0.0) > HARMONIC_AMPLITUDE:
        said.append("Gaia's image fits depend on the scan direction, as those of a close pair do.")
    shares = [value for name, value in facts.items() if name.endswith("blended_share")]
    if shares and max(shares) > BLENDED_SHARE:
        said.append(f"In {100 * max(shares):.0f} % of the BP or RP transits another source lay in the window.")
    kinds = [word for bit, word in NSS_BITS.items() if facts.get("non_single_star", 0) & bit]
    if kinds:
        said.append(f"Gaia lists a solution for more than one star: {', '.join(kinds)}.")
    significance = fact(candidate, "astrometric_excess_noise_sig")
    if significance > NOISE_SIGNIFICANCE and "ruwe" not in facts:
        noise = fact(candidate, "astrometric_excess_noise")
        said.append(f"Gaia's positions scatter by {noise:.2f} mas beyond a single star's motion.")
    return said
