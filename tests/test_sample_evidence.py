"""Each nature of the sample is recovered plausibly, and each item of evidence shows where it was built to show."""

from __future__ import annotations

import csv
import shutil
from collections import defaultdict
from pathlib import Path

import numpy as np
import pytest

from tui.checks.lookalikes import look_alikes, pulls_table, ready
from tui.workflow.session import Session

SAMPLE = Path(__file__).parent.parent / "sample_db"


@pytest.fixture(scope="module")
def key():
    with (SAMPLE / "key.csv").open(encoding="utf-8") as stream:
        return list(csv.DictReader(stream))


@pytest.fixture(scope="module")
def copy(tmp_path_factory):
    """Path of a copy of the sample queue."""
    return shutil.copyfile(SAMPLE / "saltmarsh.db", tmp_path_factory.mktemp("sample") / "saltmarsh.db").as_posix()


@pytest.fixture(scope="module")
def evidence(copy, key):
    """Name -> stored evidence by kind."""
    with Session.open(copy, write=False) as session:
        return {row["name"]: session.stored_evidence(row["name"]) for row in key}


# recipe -> check -> what `adequate` must be for every star of it
RECOVERED = {
    "plain hot star": {"star": True},
    "plain M dwarf": {"star": True},
    "equal pair": {"star": True, "blend": True},
    "hot subdwarf with a cool star": {"star": False, "blend": True},
    "M dwarf with white dwarf": {"star": False, "blend": True, "extinction": False, "dust": False},
    "galaxy in the beam": {"star": False, "blend": True, "extinction": False},
    "fast star matched to a galaxy": {"star": False, "blend": True, "extinction": False},
    "neighbour in the WISE beam": {"star": False, "instrument": True},
    "warm disc": {"star": False, "dust": True, "extinction": False, "instrument": False},
    "cold disc": {"star": False, "dust": True, "extinction": False, "instrument": False},
    "hot dust": {"star": False, "dust": True, "instrument": False},
    "two belts": {"star": False, "dust": True, "extinction": False, "blend": False},
    "reddened star with a disc": {"star": False, "extinction": False, "dust": True},
    "old star with much warm dust": {"star": False, "dust": True},
    "spike or halo in W3 and W4": {"star": False, "instrument": True},
    "moonlit W3 and W4": {"star": False, "instrument": True},
    "saturated in W1 and W2": {"star": False, "instrument": True},
    "BP holds a neighbour's light": {"star": False, "instrument": True},
    "W1 and W2 caught in a flare": {"star": False, "instrument": True},
    "nebula in W3 and W4": {"star": False, "instrument": True},
    "variable while Gaia looked": {"star": False, "instrument": True},
    "two detections joined by Gaia": {"star": False, "instrument": True},
    "on one strip of warm detector": {"star": False, "instrument": False, "dust": True},
    "much reddened star": {"extinction": True},
    "reddened dwarf": {"extinction": True},
    "deep in a cloud": {"star": False, "extinction": True},
    "two bands only": {"star": None, "extinction": None, "dust": None},
    "no flags loaded": {"instrument": None, "extinction": True},
    "coloured dip": {"star": False, "instrument": False, "blend": False, "dust": True},
    "grey dip": {"star": False, "instrument": False, "extinction": False, "blend": True},
    "coloured dip in its light curves": {"star": False, "instrument": False, "blend": False, "extinction": True},
    "galaxy beside the star": {"star": False, "instrument": False, "extinction": False, "blend": True, "dust": False},
    "on a bad night of 2MASS": {"star": False, "instrument": False, "extinction": False, "blend": False},
    "SDSS saturated in g": {"star": False, "instrument": True},
    "Pan-STARRS masked in r": {"star": False, "instrument": True},
    "Tycho-2 star with a companion": {"star": False, "instrument": True},
    "Spitzer beyond its linear range": {"star": False, "instrument": True},
    "GLIMPSE in the wings of a bright star": {"star": False, "instrument": True},
    "AKARI at the edge of its strip": {"star": False, "instrument": True},
    "IRAS confused at 12 micron": {"star": False, "instrument": True},
}


@pytest.mark.parametrize("recipe", RECOVERED)
def test_a_recipe_is_recovered(recipe, key, evidence):
    names = [row["name"] for row in key if row["recipe"] == recipe]
    assert names
    for name in names:
        assert {check: evidence[name][check].adequate for check in RECOVERED[recipe]} == RECOVERED[recipe], name


def test_plain_dwarfs_are_refused_no_more_often_than_p_min_allows(key, evidence):
    """18 stars at p_min 0.01: two refused ones would be a chance of 1.4 %."""
    refused = [
        row["name"] for row in key if row["recipe"] == "plain dwarf" and not evidence[row["name"]]["star"].adequate
    ]
    assert len(refused) < 2


def test_screens_are_unexplained_by_every_check_and_by_any_mixture(key, evidence):
    for row in key:
        if row["nature"] == "none":
            found = evidence[row["name"]]
            assert [found[check].adequate for check in ("star", "instrument", "extinction", "blend", "dust")] == [
                False
            ] * 5
            assert found["mixture"].adequate is False and found["mixture"].facts["p"] < 1e-6, row["name"]


def test_no_ordinary_star_is_refused_by_the_mixture_bound(key, evidence):
    refused = [
        row["name"]
        for row in key
        if row["nature"] in ("star", "extinction", "dust", "blend")
        and evidence[row["name"]]["mixture"].adequate is False
    ]
    assert refused == []


# item of evidence -> the kind of evidence where it speaks, and words that a reviewer then reads
SPOKEN = {
    "contamination flag": ("instrument", "cc_flags"),
    "saturation": ("instrument", "saturation limit"),
    "2MASS confusion flag": ("instrument", "cc_flg c"),
    "2MASS blend flag": ("instrument", "bl_flg 2"),
    "2MASS read flag": ("instrument", "rd_flg 4"),
    "C*": ("instrument", "C* ="),
    "moonlight flag": ("instrument", "moon_lev"),
    "epochs": ("instrument", "epochs disagree"),
    "Gaia scatter": ("instrument", "times an ordinary star"),
    "aperture": ("instrument", "aperture minus profile"),
    "duplicated source": ("instrument", "duplicated_source"),
    "no quality column": ("instrument", "nothing could speak against a band"),
    "wrong match": ("blend", "from where the star was at that epoch"),
    "RUWE": ("blend", "RUWE 3.1"),
    "non-single flag": ("blend", "a solution for more than one star"),
    "chance alignment": ("blend", "confusion is common"),
    "neighbour leak": ("blend", "light leaking from neighbours makes"),
    "laws differ": ("extinction", "the laws themselves differ"),
    "another law": ("extinction", "survives the law"),
    "line of sight": ("extinction", "more than its line of sight allows"),
    "steady-state ceiling": ("dust", "keeps up: transient dust"),
    "natural class": ("dust", "Catalogued as young"),
    "log g": ("dust", "log g"),
    "coloured dip": ("dips", "refused are grey"),
    "grey dip": ("dips", "refused are A(lambda)"),
    "light curves": ("dips", "2015 May: refused are grey"),
    "shell test": ("dust", "A shell all round would dim the star"),
    "centroid shift": ("blend", "pulls it there, it lies 1."),
    "second-nearest source": ("blend", "Another source lies 3.9 arcsec away, inside the beam of W1, W2"),
    "SDSS flag": ("instrument", "SDSS_g: SDSS flags_g 262144: a pixel is saturated"),
    "Pan-STARRS flag": ("instrument", "PS1_r: Pan-STARRS rQfPerfect 0.31: more than 15 %"),
    "GALEX flag": ("instrument", "GALEX_NUV (not fitted): GALEX nuv_artifact 4: may hold a ghost"),
    "Tycho-2 flag": ("instrument", "BT, VT: Tycho-2 posflg D: treated as a double star"),
    "Spitzer flag": ("instrument", "IRAC1: Spitzer i1_softsatflag 1: pixels beyond the linear range"),
    "GLIMPSE flag": ("instrument", "IRAC3: Spitzer sqf_5_8 532480: in the wings of a saturated star"),
    "AKARI flag": ("instrument", "AKARI_S9W: AKARI flags09 8: measured at the edge of the strip"),
    "IRAS flag": ("instrument", "IRAS12: IRAS confuse 1: confused with another source"),
}
# further items that a star shows beside the one it was built for: shows -> kind, words
BESIDE = {
    "double images": ("RUWE", "blend", "Gaia saw more than one peak in 31 %"),
    "blended transits": ("C*", "blend", "of the BP or RP transits another source lay in the window"),
    "age": ("natural class", "dust", "4 Myr old: at this age gas-rich discs"),
    "spectral type": ("log g", "dust", "Catalogued as evolved (sp_type K"),
    "GLIMPSE close source": ("GLIMPSE flag", "instrument", "IRAC4: Spitzer csf 5: another source 0.5 to 1 arcsec"),
    "Tycho-2 proximity": ("Tycho-2 flag", "instrument", "tycho_prox 0.9: another Tycho-2 star lies within 2.4"),
    "large beam": ("IRAS flag", "blend", "inside the beam of IRAS12"),
    "W4 of red sources": ("centroid shift", "instrument", "W4 reads some 3 % high"),
    "extended": ("aperture", "instrument", "reduced chi-square above 3"),
    "variable": ("Gaia scatter", "instrument", "found variable from Gaia's own light curve"),
    "carrier": ("saturation", "instrument", "the anomaly ("),
    "parallax hygiene": ("RUWE", "blend", "No usable parallax"),
    "over-luminosity": ("over-luminosity", "blend", "Brighter than one dwarf by 0."),
}


@pytest.mark.parametrize("item", SPOKEN)
def test_an_item_changes_what_a_reviewer_reads(item, key, evidence):
    kind, words = SPOKEN[item]
    built = [row["name"] for row in key if row["shows"] == item and not row["late"]]  # late ones got further bands
    silent = [name for name in built if not any(words in said for said in evidence[name][kind].cautions)]
    assert built and len(silent) <= len(built) // 4, f"{kind} says nothing of {item} for {silent}"
    plain = [row["name"] for row in key if row["recipe"] == "plain dwarf"]
    spoken = [name for name in plain if any(words in said for said in evidence[name][kind].cautions)]
    assert not spoken


@pytest.mark.parametrize("item", BESIDE)
def test_what_a_star_shows_beside_its_own_item(item, key, evidence):
    shows, kind, words = BESIDE[item]
    built = [row["name"] for row in key if row["shows"] == shows and not row["late"]]
    assert any(words in said for name in built for said in evidence[name][kind].cautions), item


def test_the_key_names_no_item_that_no_test_speaks_of(key):
    told = {*SPOKEN, "", "limits", "too cold to see", "second temperature", "look-alikes", "hot companion", "spectrum"}
    told |= {"look-alikes in epoch and place", "over-luminosity", "mixture bound", "untestable", "two temperatures"}
    assert {row["shows"] for row in key} == told


def test_over_luminosity_tells_twins_from_single_stars(key, evidence):
    """An equal pair is 0.753 mag above the sequence, whose scatter is 0.25 mag; by mean over four and over 18 stars."""
    by_recipe = defaultdict(list)
    for row in key:
        value = evidence[row["name"]]["blend"].facts.get("over_luminosity")
        if row["recipe"] in ("equal pair", "plain dwarf") and value is not None:
            by_recipe[row["recipe"]].append(value)
    twins, single = (sum(by_recipe[name]) / len(by_recipe[name]) for name in ("equal pair", "plain dwarf"))
    assert twins - single == pytest.approx(0.753, abs=0.25)


def test_far_infrared_limits_say_how_much_cold_dust_could_hide(key, evidence):
    """The star with Spitzer and Herschel photometry, against plain dwarfs without: f at 80 K, 95 %."""
    limits = defaultdict(list)
    for row in key:
        told = evidence[row["name"]]["dust"].facts
        limits[row["recipe"]].append(told["limit_fractional_luminosity"][told["limit_temperature_k"].index(80.0)])
    (tight,) = limits["plain dwarf with far-infrared limits"]
    assert 0 < 3 * tight < np.median(limits["plain dwarf"])


def test_a_second_temperature_is_asked_for_where_there_are_two_belts(key, evidence):
    for row in key:
        if row["shows"] == "second temperature":
            assert evidence[row["name"]]["dust"].best.model == "star + two dusts, A_V"


def test_neighbours_that_leak_make_their_bands_suspect(key, evidence):
    for row in key:
        if row["shows"] == "neighbour leak":
            assert {"W1", "W2"} <= set(evidence[row["name"]]["instrument"].facts["suspect_bands"])


def test_stars_on_the_strip_look_alike_and_lie_together(key, evidence):
    """From one candidate: the strip's five share a pattern more often than chance gives, and a place on the sky."""
    names = [row["name"] for row in key]
    pulls = [dict(evidence[name]["star"].best.pulls) for name in names]
    bands = ("Gaia_BP", "Gaia_G", "Gaia_RP", "J", "H", "Ks", "W1", "W2", "W3", "W4")
    strip = {place for place, row in enumerate(key) if row["shows"] == "look-alikes"}
    place = min(strip)
    found = look_alikes(place, ready(pulls_table(pulls, bands)), np.random.default_rng(1))
    assert strip - {place} <= set(found.rows.tolist()) and found.p <= 0.05


def test_spectra_and_pictures_hang_on_their_stars(key, copy):
    with Session.open(copy, write=False) as session:
        carrying = {row["name"] for row in key if session.candidate(row["name"]).spectrum is not None}
    assert {row["recipe"] for row in key if row["shows"] == "spectrum"} == {"plain dwarf with a spectrum"}
    assert {row["name"] for row in key if row["shows"] == "spectrum"} < carrying and len(carrying) == 3
    pictures = {path.stem.partition("_")[0] for path in (SAMPLE / "cutouts").glob("*.fits")}
    assert len(pictures) >= 4 and pictures <= {row["name"] for row in key}
