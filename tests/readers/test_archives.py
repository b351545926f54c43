"""The packaged archive tables, and what each catalogue's own columns give."""

from __future__ import annotations

import math

import pytest

from tui.data.archives import archive_texts
from tui.data.load import bands
from tui.errors import InputError
from tui.readers.archives import parse_archive

GOOD = archive_texts()["tycho2.csv"]


def test_every_table_names_bands_and_facts_that_exist(archives, facts):
    for archive in archives:
        for entry in archive.entries:
            known = facts if entry.role == "fact" else bands()
            assert set(entry.targets) <= set(known), (archive.label, entry)
    assert [archive.order for archive in archives] == list(range(1, len(archives) + 1))


def test_the_error_of_a_declination_is_known_and_of_no_use(one):
    text = "designation,ra,dec,sigra,sigdec,w1mpro,w1sigmpro\nJ000000.00+000000.0,0,0,0.04,0.04,10,0.02\n"
    candidate, found, contents = one(text)
    assert set(found) == {"W1"} and contents.unknown_columns == [] and candidate.facts["wise_position_error"] == 0.04


def test_a_table_of_facts_alone_is_no_cause_for_a_caution(read, write):
    facts = read(write("name,age_myr,sp_type\nA,12,K4V\n"))
    assert facts.candidates[0].facts == {"age_myr": 12.0, "sp_type": "K4V"} and facts.cautions == []
    missed = read(write("name,age_myr,jmagg\nA,12,10.2\n"))
    assert any("no column of any band" in said for said in missed.cautions)


@pytest.mark.parametrize("text", archive_texts().values(), ids=archive_texts())
def test_every_table_states_where_it_comes_from(text):
    assert [line.split(":")[0] for line in text.splitlines()[:4]] == ["# source", "# from", "# changed", "# units"]


@pytest.mark.parametrize(
    ("old", "new", "word"),
    [
        ("# label: Tycho-2\n", "", "label"),
        ("role,target", "rolle,target", "columns must be"),
        ("mag,BT", "magg,BT", "none of"),
        ("# mark: bt_mag", "# mark: xt_mag", "mark xt_mag"),
        ("# null error: detection", "# null error: perhaps", "null error"),
    ],
)
def test_a_faulty_table_says_what_is_wrong(old, new, word):
    assert old in GOOD
    with pytest.raises(InputError, match=word):
        parse_archive("tycho2.csv", GOOD.replace(old, new))


def test_gaia_errors_come_from_flux_over_error(one):
    # sigma_F = F / (flux over error); as a magnitude 2.5/ln 10 divided by it.
    head = "source_id,ra,dec,phot_g_mean_mag,phot_g_mean_flux_over_error,ruwe\n"
    candidate, band, contents = one(head + "5853498713190525696,217.4,-62.7,8.98,1000,1.05\n")
    assert candidate.name == "Gaia DR3 5853498713190525696"
    assert band["Gaia_G"].error_jy == pytest.approx(band["Gaia_G"].flux_jy / 1000)
    assert band["Gaia_G"].value_error == pytest.approx(2.5 / math.log(10) / 1000)
    assert band["Gaia_G"].source == "Gaia DR3"
    assert candidate.facts["source_id"] == "5853498713190525696" and candidate.facts["ruwe"] == 1.05
    assert contents.unknown_columns == []


def test_2mass_limits_and_flags(one):
    text = (
        "name,j_m,j_msigcom,h_m,h_msigcom,k_m,k_msigcom,ph_qual,rd_flg,cc_flg\nA,15.1,0.05,14.8,9.5,14.9,,AFU,220,0c0\n"
    )
    _, band, _ = one(text)
    # Explanatory Supplement II.2.a: U is the 95 % limit (one-sided 1.645 sigma); the errors of F are flags above 8.
    assert band["Ks"].limit and band["Ks"].nsigma == 1.645 and math.isnan(band["Ks"].error_jy)
    assert band["Ks"].flux_jy == pytest.approx(666.7 * 10 ** (-0.4 * 14.9))
    assert not band["H"].limit and math.isnan(band["H"].error_jy) and "floor" in band["H"].note
    assert band["H"].flags == {"ph_qual": "F", "rd_flg": "2", "cc_flg": "c"}
    assert band["J"].error_jy == pytest.approx(0.4 * math.log(10) * 0.05 * band["J"].flux_jy)


def test_allwise_limits_rest_on_the_flux_where_there_is_one(one):
    # physics of this program: F = ZP 10^(-0.4 z) w?flux with z = 13.0 in W4, also when negative.
    _, band, _ = one("name,w4mpro,w4sigmpro,w4snr,w4flux,w4sigflux\nA,8.9,,-0.4,-12.5,40\n")
    count_jy = 8.363 * 10 ** (-0.4 * 13.0)
    assert not band["W4"].limit
    assert band["W4"].flux_jy == pytest.approx(-12.5 * count_jy, rel=1e-4)
    assert band["W4"].error_jy == pytest.approx(40 * count_jy, rel=1e-4)
    assert (band["W4"].value, band["W4"].value_error) == (-12.5, 40)


def test_allwise_limits_rest_on_the_snr_where_there_is_no_flux(one):
    _, band, _ = one("name,w3mpro,w3sigmpro,w3snr,w4mpro,w4sigmpro,w4snr\nA,12.0,,1.2,8.9,,-0.7\n")
    # sigma = F_lim / (max(snr, 0) + 2), F = snr sigma: the catalogue's limit is the flux, if above zero, plus 2 sigma.
    limit = 31.674 * 10 ** (-0.4 * 12.0)
    assert band["W3"].error_jy == pytest.approx(limit / 3.2, rel=1e-4)
    assert band["W3"].flux_jy + 2 * band["W3"].error_jy == pytest.approx(limit, rel=1e-4)
    assert band["W4"].flux_jy < 0 and band["W4"].flux_jy == pytest.approx(-0.7 * band["W4"].error_jy)


def test_allwise_limits_without_flux_and_snr_are_limits_at_two_sigma(one):
    _, band, _ = one("name,w4mpro,w4sigmpro,w4snr\nA,8.9,,\n")
    assert (
        band["W4"].limit
        and band["W4"].nsigma == 2
        and band["W4"].flux_jy == pytest.approx(8.363 * 10 ** (-0.4 * 8.9), rel=1e-4)
    )


def test_allwise_z_is_a_flux_of_unknown_error_and_no_limit(one):
    # VizieR II/328, note 8: where ph_qual is Z a magnitude without error is the true flux, not the 95 % limit.
    _, band, _ = one("name,w3mpro,w3sigmpro,w4mpro,w4sigmpro,ph_qual\nA,10.1,,8.9,,AAZU\n")
    assert not band["W3"].limit and "floor" in band["W3"].note and math.isnan(band["W3"].error_jy)
    assert band["W4"].limit and band["W4"].nsigma == 2


def test_allwise_vizier_names_of_saturation_and_moonlight(one):
    # II/328: sat1 is w1sat, mW1 w1m, nW1 w1nm, covW1 w1cov, fmoon moon_lev
    head = "name,W1mag,e_W1mag,sat1,nW1,mW1,covW1,W2mag,e_W2mag,W3mag,e_W3mag,W4mag,e_W4mag,fmoon\n"
    _, band, contents = one(head + "A,6.1,0.04,0.12,11,12,12.3,6.2,0.02,6.2,0.02,6.1,0.05,0058\n")
    assert band["W1"].flags == {"w1sat": "0.12", "w1nm": "11", "w1m": "12", "w1cov": "12.3", "moon_lev": "0"}
    assert band["W4"].flags["moon_lev"] == "8" and contents.unknown_columns == []


def test_spitzer_limits_stand_where_there_is_no_detection(one):
    # Notes 6 and 11 of the source list: three-sigma limits in a column of their own, null where a flux is given.
    head = "name,i1_f_ap1,i1_df_ap1,i1_f_ap1_3siglim,i1_fluxtype,m1_f_psf,m1_df_psf,m1_snr,m1_f_psf_3siglim\n"
    _, band, contents = one(head + "A,,,41.5,3,2000,2,40,\n")
    assert band["IRAC1"].limit and band["IRAC1"].nsigma == 3 and band["IRAC1"].flux_jy == pytest.approx(41.5e-6)
    assert (band["IRAC1"].value, band["IRAC1"].unit) == (41.5, "uJy")
    # Note 7: the formal error is too small, flux over signal-to-noise is to be taken.
    assert band["MIPS24"].error_jy == pytest.approx(2000e-6 / 40) and not band["MIPS24"].limit
    assert contents.unknown_columns == [] and contents.refused == []


@pytest.mark.parametrize("cell", ["-3", "0", "nan", "", "-9999"])
def test_a_limit_that_is_none_is_not_taken(one, cell):
    _, band, _ = one(f"name,i1_f_ap1,i1_df_ap1,i1_f_ap1_3siglim,i2_f_ap1,i2_df_ap1\nA,,,{cell},50,1\n")
    assert set(band) == {"IRAC2"}


def test_a_bad_flux_is_not_replaced_by_a_limit(read, write):
    contents = read(write("name,i1_f_ap1,i1_df_ap1,i1_f_ap1_3siglim\nA,four,1,40\n"))
    assert contents.candidates[0].measurements == () and contents.refused[0].column == "i1_f_ap1"


def test_tycho_original_names_and_close_pairs(one):
    # format.txt of the CD-ROM: BT, e_BT, VT, e_VT, prox in 0.1 arcsec, posflg D for a pair.
    candidate, band, _ = one("name,BT,e_BT,VT,e_VT,prox,posflg\nA,9.3,0.02,8.8,0.015,12,D\n")
    assert set(band) == {"BT", "VT"} and band["BT"].flags == {"posflg": "D"} and band["BT"].source == "Tycho-2"
    assert candidate.facts["tycho_prox"] == pytest.approx(1.2)


def test_iras_flags_reach_their_bands(one):
    head = "name,Fnu_12,e_Fnu_12,q_Fnu_12,CC_12,SES2_12,Fnu_25,e_Fnu_25,q_Fnu_25,Confuse,Disc,Var,Cirr3\n"
    _, band, contents = one(head + "A,2.1,6,3,B,0,0.6,9,3,3,0,12,8.5\n")
    assert band["IRAS12"].flags == {
        "fqual_12": "3", "cc_12": "B", "ses2_12": "0", "confuse": "3", "disc": "0", "var": "12", "cirr3": "8.5",
    }  # fmt: skip
    assert contents.unknown_columns == []


def test_iras_faint_source_names(one):
    # II/156A writes Fnu12 for what II/125 calls Fnu_12.
    _, band, _ = one("name,Fnu12,e_Fnu12,q_Fnu12,Fnu60,e_Fnu60,q_Fnu60\nA,0.15,15,3,0.2,10,1\n")
    assert band["IRAS12"].error_jy == pytest.approx(0.0225) and band["IRAS60"].limit


def test_without_a_column_of_errors_nothing_is_called_a_limit(one):
    _, band, contents = one("name,w1mpro,w2mpro\nA,8.9,9.0\n")
    assert not band["W1"].limit and "floor" in band["W1"].note
    assert any(caution.startswith("W1: 1 detection has no error") for caution in contents.cautions)


def test_allwise_flags_by_band(one):
    head = "name,w1mpro,w1sigmpro,w2mpro,w2sigmpro,w1sat,w2sat,w1nm,na,nb,cc_flags,ext_flg,ph_qual,var_flg,w1mjdmean\n"
    candidate, band, _ = one(head + "A,6.1,0.04,6.2,0.02,0.12,0.0,12,0,2,dD0h,1,AABC,11nn,55386.31\n")
    assert band["W1"].flags == {
        "w1sat": "0.12",
        "w1nm": "12",
        "na": "0",
        "nb": "2",
        "cc_flags": "d",
        "ext_flg": "1",
        "ph_qual": "A",
        "var_flg": "1",
    }
    assert band["W2"].flags["cc_flags"] == "D"
    assert band["W1"].epoch == "MJD 55386.31"
    # Julian year of MJD 55386.31: 2000 + (55386.31 - 51544.5)/365.25
    assert candidate.facts["wise_epoch"] == pytest.approx(2010.518, abs=5e-4)


def test_sdss_is_read_as_asinh(one):
    # Stoughton et al. 2002, Table 21: u = 24.63 is zero flux to the print's half digit.
    _, band, _ = one("name,psfMag_u,psfMagErr_u,psfMag_g,psfMagErr_g\nA,24.63,0.9,-9999,-9999\n")
    assert set(band) == {"SDSS_u"} and band["SDSS_u"].unit == "mag(asinh)"
    assert abs(band["SDSS_u"].flux_jy) < 0.01 * band["SDSS_u"].error_jy


def test_pan_starrs_galex_tycho(one):
    head = (
        "name,gMeanPSFMag,gMeanPSFMagErr,yMeanPSFMag,yMeanPSFMagErr,"
        "fuv_mag,fuv_magerr,nuv_mag,nuv_magerr,BTmag,e_BTmag,VTmag,e_VTmag\n"
    )
    _, band, contents = one(head + "A,14.5,0.01,14.1,0.02,-999,-999,18.2,0.05,8.163,0.016,7.992,0.011\n")
    assert set(band) == {"PS1_g", "PS1_y", "GALEX_NUV", "BT", "VT"} and contents.unknown_columns == []
    assert band["PS1_g"].flux_jy == pytest.approx(3631 * 10 ** (-0.4 * 14.5))
    assert {m.source for m in band.values()} == {"Pan-STARRS", "GALEX", "Tycho-2"}


def test_spitzer_akari_iras(one):
    head = (
        "name,i1_f_ap1,i1_df_ap1,m1_f_psf,m1_df_psf,S09,e_S09,q_S09,S18,e_S18,"
        "Fnu_12,e_Fnu_12,q_Fnu_12,Fnu_60,e_Fnu_60,q_Fnu_60\n"
    )
    _, band, _ = one(head + "A,50000,500,2000,20,0.0653,0.0158,3,-999.9,-1000,0.27,11,3,0.40,,1\n")
    assert set(band) == {"IRAC1", "MIPS24", "AKARI_S9W", "IRAS12", "IRAS60"}
    assert band["IRAC1"].flux_jy == pytest.approx(0.05)
    assert band["IRAS12"].error_jy == pytest.approx(0.27 * 0.11)
    assert band["IRAS60"].limit and band["IRAS60"].nsigma == 3 and band["IRAS60"].flux_jy == 0.40
    assert band["AKARI_S9W"].flags == {"fqual09": "3"}


def test_vizier_names(one):
    head = (
        "name,RA_ICRS,DE_ICRS,Plx,e_Plx,Gmag,e_Gmag,BPmag,RPmag,"
        "Jmag,e_Jmag,Hmag,e_Hmag,Kmag,e_Kmag,Qfl,W1mag,e_W1mag,W2mag,e_W2mag,qph,ccf\n"
    )
    row = "A,10.5,-3.25,12.5,0.02,9.1,0.003,9.5,8.6,8.1,0.02,7.9,0.03,7.8,0.02,AAA,7.7,0.03,7.75,0.02,AABU,0000\n"
    candidate, band, contents = one(head + row)
    assert {"Gaia_G", "Gaia_BP", "J", "H", "Ks", "W1", "W2"} <= set(band)
    assert candidate.facts["parallax"] == 12.5 and candidate.facts["ra"] == 10.5
    assert band["W1"].flags == {"ph_qual": "A", "cc_flags": "0"} and contents.unknown_columns == []


def test_gaia_errors_from_the_fluxes_where_nothing_else_gives_them(one):
    head = "name,phot_g_mean_mag,phot_g_mean_flux,phot_g_mean_flux_error,phot_bp_mean_mag,phot_bp_mean_flux,"
    _, band, _ = one(head + "phot_bp_mean_flux_error\nA,9.0,4000000,2000,,13000,130\n")
    assert band["Gaia_G"].value == 9.0 and band["Gaia_G"].error_jy == pytest.approx(band["Gaia_G"].flux_jy / 2000)
    # Riello et al. 2021, A&A 649, A3: one photo-electron a second in BP is 25.3385 mag.
    expected = 13000 * bands()["Gaia_BP"].zero_point_jy * 10 ** (-0.4 * 25.3385422158)
    assert band["Gaia_BP"].flux_jy == pytest.approx(expected)
    assert band["Gaia_BP"].error_jy == pytest.approx(expected / 100) and "phot_bp_mean_flux" in band["Gaia_BP"].note


def test_long_identifiers_that_lost_digits_are_no_names(read, write):
    from tui.errors import TableError

    with pytest.raises(TableError, match="last digits"):
        read(write("source_id,phot_g_mean_mag\n5.853498713190526E+18,9\n"))


def test_two_measurements_of_a_band_under_one_label_stay_two(one):
    candidate, _, _ = one("name,J_mag,J_err,j_m,j_msigcom\nA,8.0,0.02,8.1,0.03\n", source="mine")
    assert {m.source: m.value for m in candidate.measurements} == {"mine": 8.0, "mine j_m": 8.1}
