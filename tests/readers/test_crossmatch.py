"""Columns of joined catalogues: suffixes, shared names, names that two catalogues could own."""

from __future__ import annotations

import numpy as np
import pytest
from astropy.table import Table, join


def joined(tmp_path):
    """Gaia, 2MASS and AllWISE as astropy joins them, with the columns that two or three of them share."""
    gaia = Table(
        {
            "key": [1],
            "source_id": [77],
            "designation": ["Gaia DR3 77"],
            "ra": [10.0],
            "dec": [-5.0],
            "phot_g_mean_mag": [9.0],
            "phot_g_mean_flux_over_error": [500.0],
            "pmra": [100.0],
            "pmdec": [-50.0],
        }
    )
    mass = Table(
        {
            "key": [1],
            "designation": ["00400000-0500000"],
            "ra": [10.1],
            "dec": [-5.1],
            "err_maj": [0.06],
            "j_m": [8.0],
            "j_msigcom": [0.02],
            "ph_qual": ["UAA"],
            "cc_flg": ["000"],
        }
    )
    wise = Table(
        {
            "key": [1],
            "designation": ["J004000.00-050000.0"],
            "ra": [10.2],
            "dec": [-5.2],
            "sigra": [0.03],
            "w1mpro": [7.5],
            "w1sigmpro": [0.03],
            "cc_flags": ["0000"],
            "ph_qual": ["ABCU"],
            "sigpmra": [9.0],
            "pmra": [1.0],
        }
    )
    first = join(gaia, mass, keys="key")
    both = join(first, wise, keys="key")
    both["name"] = ["A"]
    path = tmp_path / "joined.ecsv"
    both.write(path)
    return path, both.colnames


def test_three_catalogues_joined(read, tmp_path):
    path, names = joined(tmp_path)
    assert "designation_1" in names and "ph_qual_2" in names and "ra" in names
    contents = read(path)
    facts = contents.candidates[0].facts
    assert (facts["ra"], facts["twomass_ra"], facts["wise_ra"]) == (10.0, 10.1, 10.2)
    assert facts["twomass_designation"] == "00400000-0500000" and facts["wise_designation"] == "J004000.00-050000.0"
    assert (facts["pmra"], facts["wise_pmra"]) == (100.0, 1.0)
    band = {m.band: m for m in contents.candidates[0].measurements}
    assert band["J"].limit and band["J"].flags["ph_qual"] == "U" and band["W1"].flags["ph_qual"] == "A"


def test_a_flag_that_stands_once_goes_to_the_catalogue_whose_letters_it_has(one):
    _, band, _ = one("name,j_m,j_msigcom,w1mpro,w1sigmpro,ph_qual\nA,8.0,0.02,7.5,0.03,ABCU\n")
    assert band["W1"].flags["ph_qual"] == "A" and "ph_qual" not in band["J"].flags
    _, band, _ = one("name,j_m,j_msigcom,w1mpro,w1sigmpro,ph_qual\nA,8.0,0.02,7.5,0.03,ABC\n")
    assert band["J"].flags["ph_qual"] == "A" and "ph_qual" not in band["W1"].flags


def test_all_columns_numbered(one):
    _, band, _ = one("name,j_m_1,j_msigcom_1,ph_qual_1,w1mpro_2,w1sigmpro_2,ph_qual_2\nA,8.0,0.02,AAA,7.5,0.03,BBBB\n")
    assert band["J"].flags["ph_qual"] == "A" and band["W1"].flags["ph_qual"] == "B"


def test_one_column_that_may_be_two_catalogues_is_not_guessed(one):
    head = "name,umag,e_umag,gmag,e_gmag,rmag,e_rmag,ymag,e_ymag\n"
    _, band, contents = one(head + "A,15.2,0.02,14.1,0.02,13.9,0.02,13.8,0.02\n")
    assert set(band) == {"SDSS_u", "PS1_y"}
    assert any("gmag" in caution and "SDSS or Pan-STARRS" in caution for caution in contents.cautions)


def test_g_magnitudes_of_both_surveys_by_place(one):
    head = "name,umag,gmag_1,e_gmag_1,rmag_1,gmag_2,e_gmag_2,rmag_2,ymag\n"
    _, band, _ = one(head + "A,15.2,14.11,0.02,13.9,14.05,0.01,13.8,13.8\n")
    assert band["SDSS_g"].value == pytest.approx(14.11) and band["PS1_g"].value == pytest.approx(14.05)


def test_native_tables_joined(one):
    candidate, _, contents = one(
        "name_1,ra_1,J_mag_1,J_err_1,name_2,ra_2,J_mag_2,J_err_2\nA,10,8.0,0.02,B,11,8.1,0.03\n", source="mine"
    )
    assert candidate.name == "A" and candidate.facts["ra"] == 10
    assert {m.source: m.value for m in candidate.measurements} == {"mine 1": 8.0, "mine 2": 8.1}
    assert "name_2" in contents.unknown_columns and "ra_1: taken as ra" in contents.cautions


def test_position_of_the_first_catalogue_where_none_is_the_star_s_own(one):
    candidate, _, contents = one("name,w1mpro,w1sigmpro,sigra,ra,dec\nA,7.5,0.03,0.04,10,20\n")
    assert candidate.facts["ra"] == candidate.facts["wise_ra"] == 10 and candidate.facts["dec"] == 20
    assert any("ra and dec are those of" in caution for caution in contents.cautions)


def test_a_star_s_own_position_is_not_taken_for_the_catalogue_s(one):
    candidate, _, _ = one("name,w1mpro,w1sigmpro,ra,dec,pmra,pmdec\nA,7.5,0.03,10,20,300,5\n")
    assert candidate.facts["ra"] == 10 and "wise_ra" not in candidate.facts and candidate.facts["pmra"] == 300


def test_rows_of_a_large_join_keep_their_order(read, tmp_path):
    count = 500
    table = Table(
        {"name": [f"S{i}" for i in range(count)], "J_mag": np.linspace(5, 15, count), "J_err": np.full(count, 0.02)}
    )
    path = tmp_path / "many.fits"
    table.write(path)
    contents = read(path)
    assert [c.name for c in contents.candidates] == table["name"].tolist()
    assert [c.measurements[0].value for c in contents.candidates] == pytest.approx(table["J_mag"].tolist())
