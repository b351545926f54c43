"""Flag meanings against what the catalogues' documentation says of well-known codes."""

from __future__ import annotations

import pytest

from tui.checks.flags import blend_shares, candidate_flags, flag_table, generic_column, read_flag
from tui.data.archives import archive_texts
from tui.data.load import bands
from tui.data.load_flags import flag_rows
from tui.errors import InputError
from tui.model import Candidate, Measurement
from tui.readers import parse_archives

TABLE = flag_table(flag_rows())


def meaning(column, band, text):
    (reading,) = read_flag(column, band, text, TABLE)
    return reading


# AllWISE Explanatory Supplement II.1.a: cc_flags lower case is a real source that may be contaminated, upper case may
# be spurious; D spike, P persistence, H halo, O ghost. 2MASS supplement II.2.a: p, c, d, s, b.
@pytest.mark.parametrize(
    ("column", "band", "text", "word", "is_suspicion"),
    [
        ("cc_flags", "W3", "h", "scattered light", True),
        ("cc_flags", "W3", "H", "nothing but scattered light", True),
        ("cc_flags", "W4", "p", "latent", True),
        ("cc_flags", "W1", "D", "diffraction spike", True),
        ("cc_flags", "W1", "0", "no artifact", False),
        ("ph_qual", "W4", "U", "95 %", False),
        ("ph_qual", "W4", "A", "10 sigma", False),
        ("ph_qual", "Ks", "B", "7 to 10", False),  # the same letter is 3 to 10 sigma in AllWISE
        ("ph_qual", "W2", "B", "3 to 10", False),
        ("ph_qual", "J", "E", "fits the profile poorly", True),
        ("var_flg", "W1", "3", "constant", False),
        ("var_flg", "W1", "8", "variable", True),
        ("var_flg", "W1", "n", "too few", False),
        ("ext_flg", "W2", "5", "extended", True),
        ("rd_flg", "J", "3", "saturate", True),
        ("rd_flg", "H", "2", "usual", False),
        ("cc_flg", "Ks", "d", "diffraction spike", True),
        ("gal_contam", "Ks", "2", "extended source", True),
        ("phot_proc_mode", "Gaia_BP", "2", "bronze", True),
        ("phot_proc_mode", "Gaia_BP", 0, "gold", False),
        ("moon_lev", "W4", "7", "half or more", True),
        ("moon_lev", "W4", "2", "some", False),
        ("w4sat", "W4", "0.12", "saturated pixels", True),
        ("w4sat", "W4", "0", "no saturated", False),
        ("duplicated_source", "Gaia_G", "True", "two sources", True),
        ("phot_variable_flag", "Gaia_G", "VARIABLE", "variable", True),
    ],
)
def test_meaning(column, band, text, word, is_suspicion):
    reading = meaning(column, band, text)
    assert word in reading.meaning
    assert (reading.severity == "suspicion") is is_suspicion
    assert reading.source


def test_bits_are_said_one_by_one():
    assert len(read_flag("non_single_star", "Gaia_G", 3, TABLE)) == 2
    assert len(read_flag("w1flg", "W1", "17", TABLE)) == 2  # neighbour and saturated pixels in the aperture
    assert [r.cause for r in read_flag("nuv_artifact", "GALEX_NUV", "6", TABLE)] == ["reflection", "reflection"]


# II/125, note 6: one hexadecimal digit, 1 for 12 micron, 2 for 25, 4 for 60, 8 for 100; its example is A = 25 and 100.
def test_a_hexadecimal_digit_holds_a_bit_for_each_iras_band():
    said = {n: [r.cause for r in read_flag("confuse", f"IRAS{n}", "A", TABLE)] for n in (12, 25, 60, 100)}
    assert said == {12: [], 25: ["confusion"], 60: [], 100: ["confusion"]}
    assert read_flag("disc", "IRAS12", "1", TABLE)[0].cause == "flux differs between scans"
    assert read_flag("disc", "IRAS12", "f", TABLE)[0].severity == "suspicion"
    assert meaning("hsdflag", "IRAS60", "0").cause == ""
    assert read_flag("confuse", "IRAS12", "G", TABLE) == () == read_flag("confuse", "IRAS12", "11", TABLE)


# GLIMPSEII.notes: a flag of 16385 is a poor pixel in the dark (1) and a corrected column (2^14).
def test_glimpse_quality_is_a_sum_of_bits():
    assert [r.cause for r in read_flag("sqf_4_5", "IRAC2", "16385", TABLE)] == ["bad pixels", "column pulldown"]


def test_every_flag_column_of_an_archive_with_meanings_can_be_met():
    """Rows about columns that no archive table reads would never speak: SEIP has no m1_softsatflag, for one."""
    entries = [entry for archive in parse_archives(archive_texts()) for entry in archive.entries]
    met = {name for entry in entries if entry.role == "fact" for name in entry.targets}
    flags = [entry for entry in entries if entry.role == "flag"]
    met |= {generic_column(entry.columns[0], band) for entry in flags for band in entry.targets}
    made = {"flag", *(f"{letter}_{word}_share" for letter in ("bp", "rp") for word in ("blended", "contaminated"))}
    assert [row["column"] for row in flag_rows() if not set(row["column"].split()) & (met | made)] == []


def test_long_words_keep_their_bits():
    # SDSS flags are 64 bits: EDGE is bit 2 and a double would lose it beside bit 62
    (reading,) = read_flag("flags_r", "SDSS_r", str(2**62 + 4), TABLE)
    assert reading.cause == "edge"
    assert read_flag("flags_r", "SDSS_r", str(2**18), TABLE)[0].cause == "saturation"
    assert read_flag("flags_r", "SDSS_r", "9" * 400, TABLE) == ()


@pytest.mark.parametrize(
    ("column", "band", "text", "cause"),
    [
        ("gQfPerfect", "PS1_g", "0.5", "masked pixels"),
        ("cirr1", "IRAS60", "7", "cirrus"),
        ("fqual18", "AKARI_L18W", "0", "not detected"),  # II/297: 3 valid, 0 none; 1 and 2 are of the FIS catalogue
        ("flags09", "AKARI_S9W", "1", "unconfirmed"),  # II/297, note 4: one hexadecimal digit
        ("flags18", "AKARI_L18W", "8", "edge"),
        ("posflg", "BT", "D", "close companion"),  # I/259, notes 2, 8, 11
        ("posflg", "VT", "P", "close companion"),
        ("pflag", "VT", "X", "position uncertain"),
        ("tycho_prox", "BT", "1.9", "close companion"),
        ("tycho_prox", "BT", "99.9", ""),
        ("csf", "IRAC2", "6", "close neighbour"),  # GLIMPSEII.notes: 6 is within 0.5 arcsec, 0 none within 3
        ("csf", "IRAC3", "0", ""),
        ("sqf_3_6", "IRAC1", "4", "persistence"),  # there bit n counts 2^(n-1): 3 latent image, 20 wings
        ("sqf_8_0", "IRAC4", str(2**19), "bright neighbour"),
        ("i2_fluxflag", "IRAC2", "2", "bright neighbour"),  # column notes 2 and 3 of the SEIP source list
        ("m1_fluxtype", "MIPS24", "3", "not detected"),
        ("cc_12", "IRAS12", "A", ""),  # II/125, note 8: A is 100 %, N is 87 %
        ("cc_12", "IRAS12", "N", "poor profile fit"),
        ("ses2_60", "IRAS60", "1", "extended"),  # note 7
        ("cirr3", "IRAS100", "55", "cirrus"),
        ("qualityFlag", "PS1_i", "128", "poor stack"),
        ("flags", "SDSS_g", str(0x40000), "saturation"),
        ("i1_softsatflag", "IRAC1", "1", "saturation"),
        ("fov_radius", "GALEX_NUV", "0.58", "detector rim"),
        ("type_z", "SDSS_z", "3", "extended"),
    ],
)
def test_other_archives(column, band, text, cause):
    assert meaning(column, band, text).cause == cause


def test_a_bare_flag_is_read_as_the_catalogue_would():
    assert meaning("flag", "W3", "h").cause == "scattered light" and meaning("flag", "W3", "U").cause == "not detected"
    assert meaning("flag", "Ks", "d").cause == "diffraction spike"
    assert meaning("flag", "V", "Saturated").cause == "saturation" and meaning("flag", "W4", "blended").cause == "blend"
    assert "does not list" in meaning("flag", "V", "q7").meaning


def test_a_code_nobody_documented_is_shown_and_raises_nothing():
    reading = meaning("cc_flags", "W1", "x")
    assert "does not list" in reading.meaning and reading.severity == "informative"


@pytest.mark.parametrize("text", ["", " ", "nan", "--", None])
def test_nothing_is_said_of_a_missing_flag(text):
    assert read_flag("cc_flags", "W1", text, TABLE) == ()


def test_other_columns_say_nothing():
    assert read_flag("w1mpro", "W1", "8.2", TABLE) == ()
    assert read_flag("cc_flags", "J", "h", TABLE) == ()


def test_candidate_flags_join_measurements_and_facts():
    candidate = Candidate(
        "one",
        (
            Measurement("W3", 0.1, 0.01, flags={"cc_flags": "h", "ext_flg": "0"}),
            Measurement("Gaia_BP", 1.0, 0.01),
            Measurement("J", 1.0, 0.02),
        ),
        {"phot_bp_n_obs": 40, "phot_bp_n_blended_transits": 20, "twomass_gal_contam": 1, "ruwe": 1.1},
    )
    said = {(r.band, r.column): r for r in candidate_flags(candidate, TABLE)}
    assert said["W3", "cc_flags"].cause == "scattered light"
    assert said["Gaia_BP", "bp_blended_share"].text == "0.5"
    assert said["J", "twomass_gal_contam"].cause == "extended"
    assert ("W3", "twomass_gal_contam") not in said


def test_a_flag_given_twice_is_said_once():
    candidate = Candidate("one", (Measurement("W1", 1.0, 0.1, flags={"nb": "2"}),), {"wise_nb": 2})
    assert len(candidate_flags(candidate, TABLE)) == 1


def test_blend_shares():
    assert blend_shares({"phot_rp_n_obs": 50, "phot_rp_n_contaminated_transits": 5}) == {"rp_contaminated_share": 0.1}
    assert blend_shares({"phot_rp_n_obs": 0, "phot_rp_n_blended_transits": 5}) == {}


def test_every_row_is_whole():
    for row in flag_rows():
        assert row["meaning"] and row["source"] and row["catalogue"]
        assert set(row["bands"].split()) <= {*bands(), "*"}
        assert row["severity"] == "informative" or row["cause"]


def test_a_faulty_table_is_refused():
    with pytest.raises(InputError, match="severity"):
        flag_table([{**flag_rows()[0], "severity": "bad"}])
