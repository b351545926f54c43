"""The stars of Saltmarsh, family by family; here the plain ones and the giants."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import replace

import numpy as np
from making.beams import compact, galaxies, leaks, pairs, wrong_matches
from making.dusty import SPITZER, dips, discs, reddened, screens
from making.records import instrument, sparse
from making.signs import further_signs
from making.star import MARSH, Star


def all_stars(state: int) -> list[Star]:
    """Every star, in the order in which the survey numbers them: shuffled, so that a number tells nothing.

    The stars that came later are shuffled among themselves and follow: the earlier ones keep their numbers.
    """
    return [*shuffled(state, 0, FIRST), *shuffled(state, len(FIRST), LATER)]


def shuffled(state: int, before: int, families: Sequence[Family]) -> list[Star]:
    """The stars of some families, `before` of which came earlier, each with its own random states."""
    stars = [
        replace(star, stream=(family, place))
        for family, make in enumerate(families, before)
        for place, star in enumerate(make(np.random.default_rng([state, family])))
    ]
    return [stars[place] for place in np.random.default_rng(state + before).permutation(len(stars))]


def ordinary(rng: np.random.Generator) -> Iterator[Star]:
    """Plain stars that the search should not have called odd."""
    for number in range(18):
        yield Star(
            "plain dwarf", "star", rng.uniform(4200, 7500), rng.uniform(8.6, 11.5), control=number in (3, 11, 17)
        )
    for _ in range(8):
        yield Star("plain M dwarf", "star", rng.uniform(2950, 3800), rng.uniform(9.0, 11.0))
    for _ in range(3):
        yield Star("plain hot star", "star", rng.uniform(9000, 14000), rng.uniform(8.4, 9.8))
    yield Star(
        "plain dwarf with far-infrared limits", "star", 5900, 8.6, "too cold to see", further=(*SPITZER, "PACS100")
    )


def giants(rng: np.random.Generator) -> Iterator[Star]:
    """Giants, which the dwarf sequence does not hold for."""
    for number in range(4):
        yield Star(
            "giant",
            "star",
            rng.uniform(3700, 4500),
            rng.uniform(6.2, 7.2),
            "log g",
            radius=rng.uniform(18, 40),
            offset_mag={"Gaia_BP": 0.12, "H": -0.05, "W2": 0.10},
            gaia={"logg_gspphot": rng.uniform(1.0, 2.2)},
            place=MARSH,
            facts={"sp_type": f"K{number + 1}III", "av_max": 0.3},
        )


Family = Callable[[np.random.Generator], Iterator[Star]]
FIRST: tuple[Family, ...] = (
    ordinary, instrument, wrong_matches, reddened, pairs, compact, galaxies, leaks, discs, giants, dips, screens,
    sparse,
)  # fmt: skip
LATER: tuple[Family, ...] = (further_signs,)
