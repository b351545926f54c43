"""Stars of Saltmarsh that the catalogues have wrong, or of which they know too little."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from making.star import MARSH, Dust, Star


def instrument(rng: np.random.Generator) -> Iterator[Star]:
    """Bad data: every cause a flag or a number of the catalogues tells of."""

    def dwarf(recipe: str, shows: str, **what) -> Star:
        what = {"ks_mag": rng.uniform(8.7, 10.0)} | what
        return Star(recipe, "instrument", rng.uniform(4800, 6600), what.pop("ks_mag"), shows, **what)

    for number, letter in enumerate("DHPd"):
        yield dwarf(
            "spike or halo in W3 and W4",
            "contamination flag",
            offset_mag={"W3": -0.7, "W4": -2.6},
            wise={"cc_flags": f"00{letter}{letter}"},
            pictures=("W3", "W4") if number == 0 else (),
            control=number == 1,
        )
    for _ in range(3):
        yield dwarf(
            "saturated in W1 and W2", "saturation", ks_mag=rng.uniform(5.0, 5.7), offset_mag={"W1": 0.25, "W2": -0.40}
        )
    yield dwarf(
        "2MASS beside a bright star", "2MASS confusion flag", offset_mag={"Ks": -0.35}, twomass={"cc_flg": "00c"}
    )
    yield dwarf(
        "2MASS deblended badly", "2MASS blend flag", offset_mag={"J": 0.3}, twomass={"bl_flg": "211", "ph_qual": "EAA"}
    )
    yield dwarf("2MASS profile fit failed", "2MASS read flag", offset_mag={"H": -0.4}, twomass={"rd_flg": "242"})
    for number in range(3):
        yield dwarf(
            "BP holds a neighbour's light",
            "C*",
            offset_mag={"Gaia_BP": -0.25 - 0.1 * number},
            gaia={"excess": 0.16 + 0.06 * number, "phot_bp_n_blended_transits": 14},
            control=number == 2,
        )
    for _ in range(2):
        yield dwarf(
            "moonlit W3 and W4", "moonlight flag", offset_mag={"W3": -0.4, "W4": -2.2}, wise={"moon_lev": "0088"}
        )
    for number in range(2):
        yield dwarf(
            "W1 and W2 caught in a flare",
            "epochs",
            offset_mag={"W1": -0.45, "W2": -0.45},
            epochs={"W1": (-0.5, 0.02, -0.3), "W2": (-0.45, 0.0, -0.35)},
            control=number == 1,
        )
    yield dwarf(
        "variable while Gaia looked",
        "Gaia scatter",
        offset_mag={"Gaia_G": -0.5, "Gaia_BP": -0.5, "Gaia_RP": -0.5},
        gaia={"scatter": 12.0, "phot_variable_flag": "VARIABLE"},
    )
    yield dwarf(
        "nebula in W3 and W4",
        "aperture",
        offset_mag={"W3": -1.3, "W4": -3.0},
        wise={"w3mag_offset": -0.9, "w4mag_offset": -0.8, "ext_flg": 1, "w3rchi2": 4.2},
        pictures=("W3",),
    )
    yield dwarf(
        "two detections joined by Gaia",
        "duplicated source",
        offset_mag={"Gaia_RP": -0.22},
        gaia={"duplicated_source": True},
    )
    for place in range(5):
        yield dwarf(
            "on one strip of warm detector",
            "look-alikes",
            ks_mag=9.2 + 0.05 * place,
            offset_mag={"W3": -0.55, "W4": -2.4},
            facts={"ra": 198.40 + 0.02 * place, "dec": 24.10 + 0.01 * place},
        )


def sparse(rng: np.random.Generator) -> Iterator[Star]:
    """Stars of which too little is known."""
    all_wise, optical = ("W1", "W2", "W3", "W4"), ("Gaia_G", "Gaia_BP", "Gaia_RP")
    yield Star("plain dwarf with a spectrum", "star", 5600, 11.0, "spectrum", spectrum=True)
    for _ in range(2):
        yield Star("faint, with limits", "star", rng.uniform(4500, 5500), 15.6, "limits")
    yield Star(
        "three bands only",
        "dust",
        5500,
        9.9,
        "untestable",
        absent=(*optical, "J", "H", "W3", "W4"),
        parts=(Dust(1100, 0.05),),
    )
    yield Star(
        "two bands only",
        "extinction",
        5600,
        10.2,
        "untestable",
        absent=("Gaia_BP", "Gaia_RP", "J", "H", *all_wise),
        av_mag=1.5,
    )
    yield Star(
        "no flags loaded",
        "extinction",
        7600,
        9.4,
        "no quality column",
        absent=(*optical, "J", "H", "Ks", *all_wise),
        av_mag=1.3,
        further=("B", "V", "Rc", "Ic", "IRAC1", "IRAC2"),
        place=MARSH,
    )
