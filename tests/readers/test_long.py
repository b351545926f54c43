"""Long tables, with rows copied from published photometry."""

from __future__ import annotations

import math

import pytest

# Tycho-2, AllWISE, AKARI and Spitzer photometry of HD 110058 and HD 115820; Mann et al. 2015, ApJ 804, 64 for Gl 673.
PUBLISHED = """\
name,band,value,error,unit,limit,exclude,source,note
HD 110058,BT,8.163,0.016,mag,False,False,"Tycho-2, Hog et al. 2000, A&A 355, L27",
HD 110058,W4,3.913,0.022,mag,False,False,"AllWISE, Cutri et al. 2013",
HD 110058,MIPS24,222.9,0.139,mJy,False,False,Spitzer archival photometry,
HD 110058,AKARI_S9W,0.06533,0.0158,Jy,False,False,"AKARI/IRC, Ishihara et al. 2010, A&A 514, A1",
HD 115820,MIPS70,14.7,,mJy,True,False,Spitzer archival photometry,LIM
Gl 673,SDSS_g,8.306,0.02,mag(AB),False,False,Mann 2015,
Gl 673,Gaia_G,7.167,0.014,mag,False,True,Mann 2015,"synthetic, not on the DR2/DR3 system"
"""


def test_published_rows(read, write):
    contents = read(write(PUBLISHED))
    assert [(c.name, len(c.measurements)) for c in contents.candidates] == [
        ("HD 110058", 4),
        ("HD 115820", 1),
        ("Gl 673", 2),
    ]
    bt, w4, mips, akari = contents.candidates[0].measurements
    # Two surveys agree: AllWISE W4 and MIPS24 of this disc differ by less than 10 % of flux.
    assert w4.flux_jy == pytest.approx(mips.flux_jy, rel=0.10)
    assert bt.source == "Tycho-2, Hog et al. 2000, A&A 355, L27" and akari.flux_jy == 0.06533
    limit = contents.candidates[1].measurements[0]
    assert limit.limit and limit.nsigma == 2 and limit.flux_jy == pytest.approx(0.0147) and limit.note == "LIM"
    g, excluded = contents.candidates[2].measurements
    assert (
        g.flux_jy == pytest.approx(3631 * 10 ** (-0.4 * 8.306))
        and excluded.exclude
        and excluded.note == "synthetic, not on the DR2/DR3 system"
    )
    assert contents.refused == [] and contents.unknown_columns == []


@pytest.mark.parametrize("error", ["inf", "abc", "-0.02"])
def test_a_row_with_a_wrong_error_is_refused(read, write, error):
    contents = read(write(f"name,band,value,error,unit\nA,J,8.0,{error},mag\nA,H,8.0,9.999,mag\nA,Ks,8.0,12,mag\n"))
    found = {m.band: m for m in contents.candidates[0].measurements}
    assert set(found) == {"H", "Ks"}
    assert math.isnan(found["H"].error_jy) and found["Ks"].error_jy > 10 * found["Ks"].flux_jy
    assert [(entry.row, entry.column) for entry in contents.refused] == [(1, "error")]


def test_rows_that_cannot_be_taken(read, write):
    text = (
        "name,band,value,error,unit,epoch,ra\n"
        "A,J,8.0,0.02,mag,,10\nA,Q9,8,0.02,mag,,\nA,H,7.9,0.02,,,\n"
        "A,Ks,x,0.02,mag,,\n,J,8,0.02,mag,,\nA,W1,,0.02,mag,,\n"
        "A,W2,-99.99,0.02,mag,,\nA,W3,7,abc,mag,,\nA,J,8.1,0.02,mag,,\n"
        "A,J,8.0,0.02,mag,,\nA,J,8.2,0.02,mag,2020,\nB,W4,1,1,K,,x\n"
    )
    contents = read(write(text))
    candidates = {c.name: c for c in contents.candidates}
    assert [(m.band, m.value, m.epoch) for m in candidates["A"].measurements] == [
        ("J", 8.0, ""),
        ("J", 8.2, "2020"),
    ]
    assert candidates["A"].facts == {"ra": 10.0} and candidates["B"].measurements == ()
    rows = sorted((entry.row, entry.column) for entry in contents.refused)
    assert rows == [
        (2, "band"),
        (3, "unit"),
        (4, "value"),
        (5, "name"),
        (6, "value"),
        (7, "value"),
        (8, "error"),
        (9, "band"),
        (12, "ra"),
        (12, "unit"),
    ]
    assert "1 rows repeat earlier ones and add nothing" in contents.cautions


def test_labels(read, write):
    text = "name,band,value,unit,source\nA,g,9,mag,Pan-STARRS DR1\nA,g,9.1,mag,\nA,i,9.1,mag,SDSS\n"
    found = {(m.band, m.source) for m in read(write(text)).candidates[0].measurements}
    assert found == {("PS1_g", "Pan-STARRS DR1"), ("SDSS_g", "t"), ("SDSS_i", "SDSS")}
    found = {(m.band, m.source) for m in read(write(text), source="mine").candidates[0].measurements}
    assert ("SDSS_g", "mine") in found


def test_levels_flags_and_percent(read, write):
    text = "Name,Band,Value,Error,Unit,Limit,NSigma,Flag,error_unit\nA,W4,3,,mJy,yes,3,U,\nA,W3,3,10,mJy,no,,,%\n"
    w4, w3 = read(write(text)).candidates[0].measurements
    assert w4.limit and w4.nsigma == 3 and w4.flags == {"flag": "U"} and math.isnan(w4.error_jy)
    assert w3.error_jy == pytest.approx(0.0003)


def test_value_with_the_unit_of_its_column(read, write):
    (w4,) = read(write("name,band,value[mJy],error[uJy]\nA,W4,3,100\n")).candidates[0].measurements
    assert (w4.flux_jy, w4.error_jy) == (pytest.approx(0.003), pytest.approx(1e-4))
