"""The stars of Saltmarsh, family by family."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from making.star import MARSH, Compact, Companion, Dust, Nucleus, Screen, Star

SPITZER = ("IRAC1", "IRAC2", "IRAC3", "IRAC4", "MIPS24")
AKARI = ("AKARI_S9W", "AKARI_L18W")


def all_stars(rng: np.random.Generator) -> list[Star]:
    """Every star, in the order in which the survey numbers them: shuffled, so that a number tells nothing."""
    families = (ordinary, instrument, wrong_matches, reddened, pairs, compact, galaxies, leaks, discs, giants, dips,
                screens, sparse)  # fmt: skip
    stars = [star for family in families for star in family(rng)]
    return [stars[place] for place in rng.permutation(len(stars))]


def ordinary(rng: np.random.Generator) -> Iterator[Star]:
    """Plain stars that the search should not have called odd."""
    for number in range(18):
        yield Star("plain dwarf", "star", rng.uniform(4200, 7500), rng.uniform(8.6, 11.5), control=number in (3, 11, 17))
    for _ in range(8):
        yield Star("plain M dwarf", "star", rng.uniform(2950, 3800), rng.uniform(9.0, 11.0))
    for _ in range(3):
        yield Star("plain hot star", "star", rng.uniform(9000, 14000), rng.uniform(8.4, 9.8))
    yield Star("plain dwarf with far-infrared limits", "star", 5900, 8.6, "too cold to see", further=(*SPITZER, "PACS100"))


def instrument(rng: np.random.Generator) -> Iterator[Star]:
    """Bad data: every cause a flag or a number of the catalogues tells of."""
    def dwarf(recipe: str, shows: str, **what) -> Star:
        what = {"ks_mag": rng.uniform(8.7, 10.0)} | what
        return Star(recipe, "instrument", rng.uniform(4800, 6600), what.pop("ks_mag"), shows, **what)

    for number, letter in enumerate("DHPd"):
        yield dwarf("spike or halo in W3 and W4", "contamination flag", offset_mag={"W3": -0.7, "W4": -2.6},
                    wise={"cc_flags": f"00{letter}{letter}"}, pictures=("W3", "W4") if number == 0 else (), control=number == 1)
    for _ in range(3):
        yield dwarf("saturated in W1 and W2", "saturation", ks_mag=rng.uniform(5.0, 5.7), offset_mag={"W1": 0.25, "W2": -0.40})
    yield dwarf("2MASS beside a bright star", "2MASS confusion flag", offset_mag={"Ks": -0.35}, twomass={"cc_flg": "00c"})
    yield dwarf("2MASS deblended badly", "2MASS blend flag", offset_mag={"J": 0.3}, twomass={"bl_flg": "211", "ph_qual": "EAA"})
    yield dwarf("2MASS profile fit failed", "2MASS read flag", offset_mag={"H": -0.4}, twomass={"rd_flg": "242"})
    for number in range(3):
        yield dwarf("BP holds a neighbour's light", "C*", offset_mag={"Gaia_BP": -0.25 - 0.1 * number},
                    gaia={"excess": 0.16 + 0.06 * number, "phot_bp_n_blended_transits": 14}, control=number == 2)
    for _ in range(2):
        yield dwarf("moonlit W3 and W4", "moonlight flag", offset_mag={"W3": -0.4, "W4": -2.2}, wise={"moon_lev": "0088"})
    for number in range(2):
        yield dwarf("W1 and W2 caught in a flare", "epochs", offset_mag={"W1": -0.45, "W2": -0.45},
                    epochs={"W1": (-0.5, 0.02, -0.3), "W2": (-0.45, 0.0, -0.35)}, control=number == 1)
    yield dwarf("variable while Gaia looked", "Gaia scatter", offset_mag={"Gaia_G": -0.5, "Gaia_BP": -0.5, "Gaia_RP": -0.5},
                gaia={"scatter": 12.0, "phot_variable_flag": "VARIABLE"})
    yield dwarf("nebula in W3 and W4", "aperture", offset_mag={"W3": -1.3, "W4": -3.0},
                wise={"w3mag_offset": -0.9, "w4mag_offset": -0.8, "ext_flg": 1, "w3rchi2": 4.2}, pictures=("W3",))
    yield dwarf("two detections joined by Gaia", "duplicated source", offset_mag={"Gaia_RP": -0.22}, gaia={"duplicated_source": True})
    for place in range(5):
        yield dwarf("on one strip of warm detector", "look-alikes", ks_mag=9.2 + 0.05 * place, offset_mag={"W3": -0.55, "W4": -2.4},
                    facts={"ra": 198.40 + 0.02 * place, "dec": 24.10 + 0.01 * place})


def wrong_matches(rng: np.random.Generator) -> Iterator[Star]:
    """Fast stars that the cross-match joined with somebody else."""
    for number in range(4):
        yield Star(
            "fast star matched to a galaxy", "blend", rng.uniform(3800, 5200), rng.uniform(10.5, 11.6), "wrong match",
            motion_mas_yr=(rng.uniform(600, 900), rng.uniform(-800, -500)), wise_offset_arcsec=(2.4, -1.9),
            parts=(Nucleus(1.4, 0.8),), control=number == 0,
        )  # fmt: skip


def reddened(rng: np.random.Generator) -> Iterator[Star]:
    """Stars behind dust of the plane."""
    def behind(recipe: str, low_k: float, high_k: float, av_mag: float, av_max: float, **what) -> Star:
        return Star(recipe, "extinction", rng.uniform(low_k, high_k), rng.uniform(8.9, 10.5), av_mag=av_mag, place=MARSH,
                    facts={"av_max": av_max}, **what)

    for number in range(7):
        yield behind("reddened dwarf", 6500, 10000, rng.uniform(0.8, 1.9), 4.0, further=("B", "V"), control=number in (1, 5))
    for _ in range(6):
        yield behind("much reddened star", 9000, 15000, rng.uniform(2.2, 4.0), 8.0, shows="laws differ", further=("V",))
    yield behind("reddened beyond its line of sight", 9000, 9500, 2.6, 0.9, shows="line of sight", further=("B", "V"))
    yield behind("deep in a cloud", 9500, 10500, 6.5, 12.0, shows="laws differ")
    for _ in range(2):
        yield behind("reddened by large grains", 8500, 9200, 1.8, 5.0, r_v=4.6, further=("B", "V"))


def pairs(rng: np.random.Generator) -> Iterator[Star]:
    """Bound pairs: only the parallax gives equal ones away."""
    for number in range(5):
        teff = rng.uniform(4600, 6400)
        ruwe = {"ruwe": 3.1, "ipd_frac_multi_peak": 31} if number == 0 else {"non_single_star": 2} if number == 1 else {}
        yield Star("equal pair", "blend", teff, rng.uniform(9.0, 10.2), ("RUWE", "non-single flag")[number] if number < 2 else "over-luminosity",
                   parts=(Companion(teff * 0.99),), gaia=ruwe)
    for number in range(6):
        yield Star("hot subdwarf with a cool star", "blend", rng.uniform(15000, 21000), rng.uniform(12.6, 13.2), "two temperatures",
                   radius=0.06, parts=(Companion(rng.uniform(3900, 4500)),), control=number in (2, 5),
                   gaia={"ruwe": 1.9} if number == 4 else {})


def compact(rng: np.random.Generator) -> Iterator[Star]:
    """Red dwarfs with a white dwarf beside them."""
    for number in range(5):
        yield Star("M dwarf with white dwarf", "blend", rng.uniform(2950, 3350), rng.uniform(12.2, 12.8), "hot companion",
                   parts=(Compact(rng.uniform(12000, 25000), 0.012),), sdss=True, control=number == 4,
                   further=("GALEX_NUV",) if number == 0 else ())


def galaxies(rng: np.random.Generator) -> Iterator[Star]:
    """Galaxies and active nuclei in the beam."""
    for number in range(8):
        yield Star("galaxy in the beam", "blend", rng.uniform(4300, 6000), rng.uniform(11.6, 12.6), "chance alignment",
                   parts=(Nucleus(rng.uniform(0.9, 1.7), rng.uniform(0.15, 0.4)),), further=SPITZER[:2] if number < 3 else (),
                   control=number == 6, pictures=("W1", "W3") if number == 0 else (), later=number == 1,
                   facts={"density_galaxy": 0.0016, "density_galaxy_band": "W2", "density_galaxy_mag": 16.0, "density_galaxy_slope": 0.4})


def leaks(rng: np.random.Generator) -> Iterator[Star]:
    """A star near by that WISE does not tell apart."""
    for number in range(4):
        yield Star("neighbour in the WISE beam", "blend", rng.uniform(5200, 6400), rng.uniform(9.8, 10.8), "neighbour leak",
                   neighbours=((rng.uniform(3.6, 4.4), rng.uniform(0, 360), 3300.0, 0.1), (17.0, 80.0, 5000.0, 1.5)),
                   pictures=("W1", "W2") if number == 0 else ())


def discs(rng: np.random.Generator) -> Iterator[Star]:
    """Warm, cold, hot, double and extreme discs."""
    for number in range(9):
        yield Star("warm disc", "dust", rng.uniform(5600, 9000), rng.uniform(8.4, 9.2), parts=(Dust(rng.uniform(180, 380), rng.uniform(8e-4, 3e-3)),),
                   further=(*SPITZER, *AKARI) if number < 3 else (), control=number in (4, 7), later=number == 5)
    for _ in range(4):
        yield Star("cold disc", "dust", rng.uniform(6000, 8500), rng.uniform(8.3, 8.9), parts=(Dust(rng.uniform(55, 90), rng.uniform(3e-4, 9e-4)),),
                   further=("MIPS24", "PACS70", "PACS100", "PACS160"))
    for number in range(5):
        yield Star("hot dust", "dust", rng.uniform(5600, 7500), rng.uniform(8.6, 9.6), parts=(Dust(rng.uniform(800, 1300), rng.uniform(0.02, 0.05)),),
                   control=number == 3, later=number == 0)
    for _ in range(4):
        yield Star("two belts", "dust", rng.uniform(6200, 8800), rng.uniform(8.3, 8.8), "second temperature",
                   parts=(Dust(rng.uniform(500, 700), 4e-3), Dust(rng.uniform(90, 120), 4e-3)), further=(*SPITZER, *AKARI, "PACS70", "PACS100"))
    yield Star("old star with much warm dust", "dust", 5900, 8.8, "steady-state ceiling", parts=(Dust(420, 0.012),), facts={"age_myr": 2500.0})
    yield Star("young star with a disc", "dust", 4700, 9.2, "natural class", parts=(Dust(900, 0.06), Dust(200, 0.05)), further=SPITZER,
               facts={"age_myr": 4.0, "otype": "TT*", "sp_type": "K4Ve"})
    yield Star("dust that takes a third of the light", "dust", 6100, 9.3, "shell test", parts=(Dust(350, 0.33),))


def giants(rng: np.random.Generator) -> Iterator[Star]:
    """Giants, which the dwarf sequence does not hold for."""
    for number in range(4):
        yield Star("giant", "star", rng.uniform(3700, 4500), rng.uniform(6.2, 7.2), "log g", radius=rng.uniform(18, 40),
                   offset_mag={"Gaia_BP": 0.12, "H": -0.05, "W2": 0.10}, gaia={"logg_gspphot": rng.uniform(1.0, 2.2)}, place=MARSH,
                   facts={"sp_type": f"K{number + 1}III", "av_max": 0.3})


def dips(rng: np.random.Generator) -> Iterator[Star]:
    """Stars that dimmed: behind fine dust, or behind something opaque."""
    for number in range(3):
        yield Star("coloured dip", "dust", rng.uniform(5600, 7000), rng.uniform(9.0, 10.0), "coloured dip", dip=("coloured", rng.uniform(0.2, 0.5)),
                   parts=(Dust(320, 1.5e-3),) if number == 0 else ())
    for _ in range(3):
        yield Star("grey dip", "blend", rng.uniform(5400, 6500), rng.uniform(9.0, 10.0), "grey dip", dip=("grey", rng.uniform(0.06, 0.2)))


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
        star = Star(f"screen: {words}", "none", rng.uniform(5500, 6100), rng.uniform(13.0, 13.5), "mixture bound", screen=screen, sdss=True)
        yield replace(star, control=number in (1, 4), spectrum=number in (0, 5))


def sparse(rng: np.random.Generator) -> Iterator[Star]:
    """Stars of which too little is known."""
    all_wise, optical = ("W1", "W2", "W3", "W4"), ("Gaia_G", "Gaia_BP", "Gaia_RP")
    yield Star("plain dwarf with a spectrum", "star", 5600, 11.0, "spectrum", spectrum=True)
    for _ in range(2):
        yield Star("faint, with limits", "star", rng.uniform(4500, 5500), 15.6, "limits")
    yield Star("three bands only", "dust", 5500, 9.9, "untestable", absent=(*optical, "J", "H", "W3", "W4"), parts=(Dust(1100, 0.05),))
    yield Star("two bands only", "extinction", 5600, 10.2, "untestable", absent=("Gaia_BP", "Gaia_RP", "J", "H", *all_wise), av_mag=1.5)
    yield Star("no flags loaded", "extinction", 7600, 9.4, "no quality column", absent=(*optical, "J", "H", "Ks", *all_wise), av_mag=1.3,
               further=("B", "V", "Rc", "Ic", "IRAC1", "IRAC2"), place=MARSH)
