"""Stars of Saltmarsh with something else in the beam: pairs, white dwarfs, galaxies, neighbours, wrong matches."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from making.star import Compact, Companion, Nucleus, Star

SPITZER_WARM = ("IRAC1", "IRAC2")


def wrong_matches(rng: np.random.Generator) -> Iterator[Star]:
    """Fast stars that the cross-match joined with somebody else."""
    for number in range(4):
        yield Star(
            "fast star matched to a galaxy",
            "blend",
            rng.uniform(3800, 5200),
            rng.uniform(10.5, 11.6),
            "wrong match",
            motion_mas_yr=(rng.uniform(600, 900), rng.uniform(-800, -500)),
            wise_offset_arcsec=(2.4, -1.9),
            parts=(Nucleus(1.4, 0.8),),
            control=number == 0,
        )


def pairs(rng: np.random.Generator) -> Iterator[Star]:
    """Bound pairs: only the parallax gives equal ones away."""
    for number in range(5):
        teff = rng.uniform(4600, 6400)
        ruwe = (
            {"ruwe": 3.1, "ipd_frac_multi_peak": 31} if number == 0 else {"non_single_star": 2} if number == 1 else {}
        )
        yield Star(
            "equal pair",
            "blend",
            teff,
            rng.uniform(9.0, 10.2),
            ("RUWE", "non-single flag")[number] if number < 2 else "over-luminosity",
            parts=(Companion(teff * 0.99),),
            gaia=ruwe,
        )
    for number in range(6):
        yield Star(
            "hot subdwarf with a cool star",
            "blend",
            rng.uniform(15000, 21000),
            rng.uniform(12.6, 13.2),
            "two temperatures",
            radius=0.06,
            parts=(Companion(rng.uniform(3900, 4500)),),
            control=number in (2, 5),
            gaia={"ruwe": 1.9} if number == 4 else {},
        )


def compact(rng: np.random.Generator) -> Iterator[Star]:
    """Red dwarfs with a white dwarf beside them."""
    for number in range(5):
        yield Star(
            "M dwarf with white dwarf",
            "blend",
            rng.uniform(2950, 3350),
            rng.uniform(12.2, 12.8),
            "hot companion",
            parts=(Compact(rng.uniform(12000, 25000), 0.012),),
            sdss=True,
            control=number == 4,
            further=("GALEX_NUV",) if number == 0 else (),
        )


def galaxies(rng: np.random.Generator) -> Iterator[Star]:
    """Galaxies and active nuclei in the beam."""
    for number in range(8):
        yield Star(
            "galaxy in the beam",
            "blend",
            rng.uniform(4300, 6000),
            rng.uniform(11.6, 12.6),
            "chance alignment",
            parts=(Nucleus(rng.uniform(0.9, 1.7), rng.uniform(0.15, 0.4)),),
            further=SPITZER_WARM if number < 3 else (),
            control=number == 6,
            pictures=("W1", "W3") if number == 0 else (),
            later=number == 1,
            facts={
                "density_galaxy": 0.0016,
                "density_galaxy_band": "W2",
                "density_galaxy_mag": 16.0,
                "density_galaxy_slope": 0.4,
            },
        )


def leaks(rng: np.random.Generator) -> Iterator[Star]:
    """A star near by that WISE does not tell apart."""
    for number in range(4):
        yield Star(
            "neighbour in the WISE beam",
            "blend",
            rng.uniform(5200, 6400),
            rng.uniform(9.8, 10.8),
            "neighbour leak",
            neighbours=((rng.uniform(3.6, 4.4), rng.uniform(0, 360), 3300.0, 0.1), (17.0, 80.0, 5000.0, 1.5)),
            pictures=("W1", "W2") if number == 0 else (),
        )
