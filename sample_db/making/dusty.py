"""Stars of Saltmarsh with dust: around them, in front of them, or passing by; and screens that no dust makes."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np
from making.star import MARSH, Dust, Screen, Star

SPITZER = ("IRAC1", "IRAC2", "IRAC3", "IRAC4", "MIPS24")
AKARI = ("AKARI_S9W", "AKARI_L18W")


def reddened(rng: np.random.Generator) -> Iterator[Star]:
    """Stars behind dust of the plane."""

    def behind(recipe: str, low_k: float, high_k: float, av_mag: float, av_max: float, **what) -> Star:
        return Star(
            recipe,
            "extinction",
            rng.uniform(low_k, high_k),
            rng.uniform(8.9, 10.5),
            av_mag=av_mag,
            place=MARSH,
            facts={"av_max": av_max},
            **what,
        )

    for number in range(7):
        yield behind(
            "reddened dwarf", 6500, 10000, rng.uniform(0.8, 1.9), 4.0, further=("B", "V"), control=number in (1, 5)
        )
    for _ in range(6):
        yield behind("much reddened star", 9000, 15000, rng.uniform(2.2, 4.0), 8.0, shows="laws differ", further=("V",))
    yield behind("reddened beyond its line of sight", 9000, 9500, 2.6, 0.9, shows="line of sight", further=("B", "V"))
    yield behind("deep in a cloud", 9500, 10500, 6.5, 12.0, shows="laws differ")
    for _ in range(2):
        yield behind("reddened by large grains", 8500, 9200, 1.8, 5.0, r_v=4.6, further=("B", "V"))


def discs(rng: np.random.Generator) -> Iterator[Star]:
    """Warm, cold, hot, double and extreme discs."""
    for number in range(9):
        yield Star(
            "warm disc",
            "dust",
            rng.uniform(5600, 9000),
            rng.uniform(8.4, 9.2),
            parts=(Dust(rng.uniform(180, 380), rng.uniform(8e-4, 3e-3)),),
            further=(*SPITZER, *AKARI) if number < 3 else (),
            control=number in (4, 7),
            later=number == 5,
        )
    for _ in range(4):
        yield Star(
            "cold disc",
            "dust",
            rng.uniform(6000, 8500),
            rng.uniform(8.3, 8.9),
            parts=(Dust(rng.uniform(55, 90), rng.uniform(3e-4, 9e-4)),),
            further=("MIPS24", "PACS70", "PACS100", "PACS160"),
        )
    for number in range(5):
        yield Star(
            "hot dust",
            "dust",
            rng.uniform(5600, 7500),
            rng.uniform(8.6, 9.6),
            parts=(Dust(rng.uniform(800, 1300), rng.uniform(0.02, 0.05)),),
            control=number == 3,
            later=number == 0,
        )
    for _ in range(4):
        yield Star(
            "two belts",
            "dust",
            rng.uniform(6200, 8800),
            rng.uniform(8.3, 8.8),
            "second temperature",
            parts=(Dust(rng.uniform(500, 700), 4e-3), Dust(rng.uniform(90, 120), 4e-3)),
            further=(*SPITZER, *AKARI, "PACS70", "PACS100"),
        )
    yield Star(
        "old star with much warm dust",
        "dust",
        5900,
        8.8,
        "steady-state ceiling",
        parts=(Dust(420, 0.012),),
        facts={"age_myr": 2500.0},
    )
    yield Star(
        "young star with a disc",
        "dust",
        4700,
        9.2,
        "natural class",
        parts=(Dust(900, 0.06), Dust(200, 0.05)),
        further=SPITZER,
        facts={"age_myr": 4.0, "otype": "TT*", "sp_type": "K4Ve"},
    )
    yield Star(
        "dust that takes a third of the light",
        "dust",
        6100,
        9.3,
        "shell test",
        parts=(Dust(350, 0.33),),
        facts={"av_max": 0.05},
    )
    yield Star(
        "reddened star with a disc",
        "dust",
        9600,
        8.8,
        "another law",
        av_mag=3.2,
        place=MARSH,
        parts=(Dust(290, 4e-3),),
        facts={"av_max": 8.0},
        further=("V",),
    )


def dips(rng: np.random.Generator) -> Iterator[Star]:
    """Stars that dimmed: behind fine dust, or behind something opaque."""
    for number in range(3):
        yield Star(
            "coloured dip",
            "dust",
            rng.uniform(5600, 7000),
            rng.uniform(9.0, 10.0),
            "coloured dip",
            dip=("coloured", rng.uniform(0.2, 0.5)),
            parts=(Dust(320, 1.5e-3),) if number == 0 else (),
        )
    for _ in range(3):
        yield Star(
            "grey dip",
            "blend",
            rng.uniform(5400, 6500),
            rng.uniform(9.0, 10.0),
            "grey dip",
            dip=("grey", rng.uniform(0.06, 0.2)),
        )


def screens(rng: np.random.Generator) -> Iterator[Star]:
    """Spectra that no mixture of natural sources makes."""
    kinds = (
        ("lets through 10 % around 0.55 micron", Screen(0.5225, 0.5775, 0.9)),
        ("lets through 30 % around 0.55 micron", Screen(0.4675, 0.6325, 0.8)),
        ("lets through 30 % around 0.62 micron", Screen(0.527, 0.713, 0.75)),
        ("short-pass at 0.6 micron", Screen(0.0, 0.6, 0.85)),
        ("short-pass at 0.6 micron", Screen(0.0, 0.6, 0.75)),
        ("notch of 30 % around 0.65 micron", Screen(0.5525, 0.7475, 0.7, notch=True)),
        ("notch of 30 % around 1.25 micron", Screen(1.0625, 1.4375, 0.6, notch=True)),
    )
    for number, (words, screen) in enumerate(kinds):
        star = Star(
            f"screen: {words}",
            "none",
            rng.uniform(5500, 6100),
            rng.uniform(13.0, 13.5),
            "mixture bound",
            screen=screen,
            sdss=True,
        )
        yield replace(star, control=number in (1, 4), spectrum=number in (0, 5))
