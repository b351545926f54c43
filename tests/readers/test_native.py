"""The program's own columns: magnitudes, fluxes, limits, flags, facts, and what is refused of them."""

from __future__ import annotations

import math

import pytest


def test_magnitudes_fluxes_limits_and_epochs(one):
    text = (
        "name,J_mag,J_err,W3_flux[mJy],W3_err[%],W4_flux[mJy],W4_err,W4_limit,W4_nsigma,"
        "MIPS24_flux[Jy],MIPS24_limit,J_flag,J_epoch,Ks_mag,Ks_exclude\n"
        "A,8.0,0.02,12.5,4,30,,true,3,0.5,1,ok,2001-05-03,7.9,yes\n"
    )
    _, band, contents = one(text)
    assert band["J"].flux_jy == pytest.approx(1594 * 10**-3.2) and band["J"].value_error == 0.02
    assert band["J"].flags == {"flag": "ok"} and band["J"].epoch == "2001-05-03" and band["J"].source == "t"
    assert (band["W3"].flux_jy, band["W3"].error_jy) == (pytest.approx(0.0125), pytest.approx(0.0005))
    assert (band["W3"].value, band["W3"].value_error, band["W3"].unit) == (12.5, pytest.approx(0.5), "mJy")
    assert band["W4"].limit and band["W4"].nsigma == 3 and math.isnan(band["W4"].error_jy)
    assert band["MIPS24"].limit and band["MIPS24"].nsigma == 2  # the default level
    assert band["Ks"].exclude and math.isnan(band["Ks"].error_jy) and "floor" in band["Ks"].note
    assert contents.refused == []


def test_a_flux_without_unit_is_refused_with_the_mend_and_the_rest_is_loaded(one):
    _, band, contents = one("name,J_mag,W4_flux\nA,8.0,0.012\n")
    assert set(band) == {"J"}
    (refused,) = contents.refused
    assert (refused.row, refused.column) == (0, "W4_flux") and "[units]" in refused.reason


def test_a_magnitude_and_a_flux_of_one_band(one):
    _, band, contents = one("name,J_mag,J_flux[Jy]\nA,8.0,1.0\n")
    assert band["J"].unit == "mag" and contents.refused[0].column == "J_flux"


def test_aliases_and_case(one):
    _, band, contents = one("name,G_mag,g_mag,K_mag,S9W_flux[Jy],ks_mag,R_mag,w1_mag\nA,9,9.5,8,0.1,8.1,9.2,7.7\n")
    assert set(band) == {"Gaia_G", "SDSS_g", "Ks", "AKARI_S9W", "Rc", "W1"}
    assert len(contents.candidates[0].measurements) == 7  # Ks twice


def test_griz_are_pan_starrs_when_that_is_said(one):
    assert set(one("name,g_mag,y_mag\nA,9,9\n", source="PS1 DR2")[1]) >= {"PS1_g"}
    assert "SDSS_g" in one("name,g_mag\nA,9\n")[1]


def test_a_lower_case_letter_is_not_a_capital_band(one):
    _, band, contents = one("name,j_mag,J_err,V_mag\nA,8.0,0.02,9\n")
    assert set(band) == {"V"} and {"j_mag", "J_err"} <= set(contents.unknown_columns)
    assert any("J_mag would be" in caution for caution in contents.cautions)


def test_facts_with_units(one):
    head = (
        "name,ra[hourangle],dec[arcmin],parallax[arcsec],pmra,av_max,age_myr[Gyr],"
        "sp_type,duplicated_source,phot_g_n_obs,ruwe\n"
    )
    candidate, _, contents = one(head + "A,2.0,-90,0.0125,-3.5,0.8,4.6,M2V,False,212,1.02\n")
    expected = {
        "ra": 30.0,
        "dec": -1.5,
        "parallax": 12.5,
        "pmra": -3.5,
        "av_max": 0.8,
        "age_myr": 4600.0,
        "sp_type": "M2V",
        "duplicated_source": False,
        "phot_g_n_obs": 212,
        "ruwe": 1.02,
    }
    assert dict(candidate.facts) == pytest.approx(expected) and contents.refused == []


def test_positions_written_by_hours(one):
    # Sirius in the Bright Star Catalogue, 5th edition: 06:45:08.9 -16:42:58.
    candidate, _, _ = one("name,ra,dec\nSirius,06:45:08.9,-16:42:58\n")
    assert candidate.facts["ra"] == pytest.approx(101.28708, abs=1e-5)
    assert candidate.facts["dec"] == pytest.approx(-16.71611, abs=1e-5)


@pytest.mark.parametrize(
    ("column", "cell"),
    [
        ("ra", "400"),
        ("dec", "-91"),
        ("phot_g_n_obs", "2.5"),
        ("parallax", "inf"),
        ("duplicated_source", "maybe"),
        ("phot_g_n_obs", "1" + "0" * 400),
        ("sp_type", "M" * 600),
        ("parallax", "ten"),
    ],
)
def test_a_fact_that_cannot_be_is_refused_alone(one, column, cell):
    candidate, band, contents = one(f"name,J_mag,{column}\nA,8.0,{cell}\n")
    assert column not in candidate.facts and "J" in band
    assert [(entry.row, entry.column) for entry in contents.refused] == [(1, column)]


def test_a_fact_in_a_unit_of_another_kind(one):
    candidate, _, contents = one("name,parallax[K]\nA,8.0\n")
    assert candidate.facts == {} and contents.refused[0].row == 0 and "mas" in contents.refused[0].reason


@pytest.mark.parametrize(
    ("columns", "cells", "column"),
    [
        ("J_mag", "bright", "J_mag"),
        ("J_mag", "inf", "J_mag"),
        ("J_mag", "-800", "J_mag"),
        ("J_mag", "1e300", "J_mag"),
        ("W4_flux[Jy]", "1e40", "W4_flux"),
        ("W4_flux[Jy],W4_limit", "-1,true", "W4_flux"),
        ("W4_flux[Jy],W4_limit", "1,perhaps", "W4_limit"),
        ("W4_flux[Jy],W4_limit,W4_nsigma", "1,true,-3", "W4_nsigma"),
    ],
)
def test_cells_that_are_no_measurement(one, columns, cells, column):
    candidate, _, contents = one(f"name,H_mag,{columns}\nA,8.0,{cells}\n")
    assert [m.band for m in candidate.measurements] == ["H"]
    assert [(entry.row, entry.column) for entry in contents.refused] == [(1, column)]


@pytest.mark.parametrize("error", ["0", "nan", "", "-9999", "-999", "9.999", "99", "99.999"])
def test_errors_that_are_none(one, error):
    _, band, contents = one(f"name,J_mag,J_err\nA,8.0,{error}\n")
    assert math.isnan(band["J"].error_jy) and "floor" in band["J"].note and contents.refused == []


@pytest.mark.parametrize("error", ["inf", "-inf", "1e400", "abc", "-0.02", "-1"])
@pytest.mark.parametrize("column", ["J_mag", "J_flux[mJy]"])
def test_a_detection_whose_error_is_wrong_is_refused_and_not_made_a_precise_point(one, column, error):
    candidate, _, contents = one(f"name,H_mag,{column},J_err\nA,8.0,8.0,{error}\n")
    assert [m.band for m in candidate.measurements] == ["H"]
    assert [(entry.row, entry.column) for entry in contents.refused] == [(1, "J_err")]
    assert contents.refused[0].reason.endswith("the measurement is left out")
    assert not any("J:" in caution for caution in contents.cautions)


@pytest.mark.parametrize("error", [1.2, 12.0])
def test_a_huge_error_stays_the_error_that_it_is(one, error):
    # d ln F = 0.4 ln(10) dm: an error of more than 1.0857 mag is a signal-to-noise ratio below 1
    _, band, contents = one(f"name,J_mag,J_err\nA,8.0,{error}\n")
    assert band["J"].error_jy == pytest.approx(0.4 * math.log(10) * error * band["J"].flux_jy)
    assert band["J"].error_jy > band["J"].flux_jy and contents.refused == []


def test_the_error_of_a_flux_may_be_any_number_above_zero(one):
    _, band, contents = one("name,J_flux[mJy],J_err,H_flux[mJy],H_err\nA,8.0,99.0,8.0,-999\n")
    assert band["J"].error_jy == pytest.approx(0.099)
    assert math.isnan(band["H"].error_jy) and contents.refused == []


def test_the_error_of_a_flux_beyond_any_star_is_refused(one):
    candidate, _, contents = one("name,J_flux[Jy],J_err\nA,8.0,1e30\n")
    assert candidate.measurements == () and [entry.column for entry in contents.refused] == ["J_err"]


@pytest.mark.parametrize("error", ["-0.02", "99.999", ""])
def test_a_limit_needs_no_error(one, error):
    _, band, contents = one(f"name,J_mag,J_err,J_limit\nA,8.0,{error},true\n")
    assert band["J"].limit and contents.refused == []


def test_negative_fluxes_are_measurements(one):
    _, band, _ = one("name,W4_flux[mJy],W4_err\nA,-1.5,2.0\n")
    assert band["W4"].flux_jy == pytest.approx(-0.0015) and band["W4"].error_jy == pytest.approx(0.002)


def test_names_are_unique_and_rows_without_one_refused(read, write):
    contents = read(write("name,J_mag\nA,8\n A ,9\n,8\n\x01,7\n" + "B" * 201 + ",7\nC,x\n"))
    assert [c.name for c in contents.candidates] == ["A", "C"]
    assert [(entry.row, entry.column) for entry in contents.refused if entry.column == "name"] == [
        (n, "name") for n in (2, 3, 4, 5)
    ]
    assert "row 1 has the same name" in contents.refused[0].reason
    assert str(contents.refused[0]).startswith(contents.refused[0].file + ", row 2, column name:")


def test_rows_of_another_length_are_refused_alone(read, write):
    contents = read(write("name,J_mag\nA,8\nB\nC,8,9\nD,8,\nE,8\n"))
    assert [c.name for c in contents.candidates] == ["A", "D", "E"]
    assert [entry.row for entry in contents.refused] == [2, 3]


def test_no_name_and_no_band(read, write):
    from tui.errors import TableError

    with pytest.raises(TableError, match="column map"):
        read(write("star,J_mag\nA,8\n"))
    contents = read(write("name,colour\nA,red\n"))
    assert contents.unknown_columns == ["colour"] and any(
        "no column of any band" in caution for caution in contents.cautions
    )
