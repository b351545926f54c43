"""Stars of Saltmarsh that came later, each to show one more item: archives' flags, centroids, light curves."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from making.star import Nucleus, Star

BAD_NIGHT_JD = 2451012.7  # on which 2MASS was out of focus, in this invented survey
SATURATED, ASIDE = 262144, 8192 + 524288  # bits: SDSS photo flags; GLIMPSE source quality


def further_signs(rng: np.random.Generator) -> Iterator[Star]:
    """All of them."""
    yield from archives(rng)
    yield from bad_night(rng)
    yield from second_sources(rng)
    yield from dimmed(rng)


def archives(rng: np.random.Generator) -> Iterator[Star]:
    """One star a catalogue whose own flag tells of the fault."""

    def wrong(recipe: str, shows: str, ks_mag: float, offset_mag: dict[str, float], **what) -> Star:
        return Star(
            recipe, "instrument", rng.uniform(5200, 6400), ks_mag, shows, offset_mag=offset_mag, **what
        )

    yield wrong("SDSS saturated in g", "SDSS flag", 12.9, {"SDSS_g": -0.5}, sdss=True, sdss_odd={"flags_g": SATURATED})
    yield wrong(
        "Pan-STARRS masked in r", "Pan-STARRS flag", 14.0, {"PS1_r": 0.6},
        archives={"Pan-STARRS": {"rQfPerfect": 0.31}},
    )  # fmt: skip
    yield wrong(
        "GALEX beside a ghost", "GALEX flag", 11.0, {"GALEX_NUV": -1.5}, archives={"GALEX": {"nuv_artifact": 4}}
    )
    yield wrong(
        "Tycho-2 star with a companion", "Tycho-2 flag", 8.6, {"BT": -0.5, "VT": -0.45},
        archives={"Tycho-2": {"posflg": "D", "prox": 9}},
    )  # fmt: skip
    yield wrong(
        "Spitzer beyond its linear range", "Spitzer flag", 8.8, {"IRAC1": 0.4, "IRAC2": 0.35},
        archives={"Spitzer": {"i1_softsatflag": 1, "i2_softsatflag": 1}},
    )  # fmt: skip
    yield wrong(
        "GLIMPSE in the wings of a bright star", "GLIMPSE flag", 9.4, {"IRAC3": -0.5, "IRAC4": -0.6},
        archives={"GLIMPSE": {"csf": 5, "sqf_5_8": ASIDE, "sqf_8_0": ASIDE}},
    )  # fmt: skip
    yield wrong(
        "AKARI at the edge of its strip", "AKARI flag", 6.9, {"AKARI_S9W": 0.9},
        archives={"AKARI": {"f09": "8"}}, absent=("W1", "W2", "W3", "W4"),
    )  # fmt: skip
    yield wrong(
        "IRAS confused at 12 micron", "IRAS flag", 4.9, {"IRAS12": -1.2}, archives={"IRAS": {"Confuse": "1"}},
        absent=("W1", "W2", "W3", "W4"),
    )  # fmt: skip


def bad_night(rng: np.random.Generator) -> Iterator[Star]:
    """Stars of one field that 2MASS saw on one bad night, of which it left the same pattern in all."""
    for place in range(5):
        yield Star(
            "on a bad night of 2MASS", "instrument", rng.uniform(5000, 6400), rng.uniform(8.6, 11.2),
            "look-alikes in epoch and place", offset_mag={"J": 0.30, "H": -0.28, "Ks": 0.24}, twomass={"jdate": BAD_NIGHT_JD},
            facts={"ra": 197.15 + 0.03 * place, "dec": 25.2 - 0.02 * place},
        )  # fmt: skip


def second_sources(rng: np.random.Generator) -> Iterator[Star]:
    """A galaxy beside the star that pulls its centroid, and a star that only 2MASS tells of."""
    yield Star(
        "galaxy beside the star", "blend", 5300, 11.7, "centroid shift",
        parts=(Nucleus(1.1, 0.35),), wise_offset_arcsec=(0.42, 0.26),
    )  # fmt: skip
    yield Star(
        "star with an untold neighbour", "blend", rng.uniform(5400, 6200), 10.3, "second-nearest source",
        neighbours=((3.9, 140.0, 3300.0, 0.2),), neighbours_told=False,
    )  # fmt: skip


def dimmed(rng: np.random.Generator) -> Iterator[Star]:
    """A star whose dimming is there as light curves."""
    yield Star(
        "coloured dip in its light curves", "dust", rng.uniform(5600, 6400), 9.6, "light curves",
        dip=("coloured", 0.42), curves=True,
    )  # fmt: skip
