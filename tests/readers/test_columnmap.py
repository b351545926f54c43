"""Column maps and bands of one's own."""

from __future__ import annotations

import numpy as np
import pytest

from tui.errors import TableError


def test_columns_units_and_sources(one, write):
    column_map = write(
        '[columns]\nname = "star"\nJ_mag = "jay"\nJ_err = "ejay"\nparallax = "plx_as"\nW4_flux = "f22"\n'
        '[units]\nparallax = "arcsec"\nf22 = "mJy"\njay = "mag(AB)"\n[source]\nlabel = "mine"\nW4 = "deep"\n',
        "map.toml",
    )
    candidate, band, contents = one("star,jay,ejay,plx_as,f22,left\nA,9.0,0.02,0.01,12,7\n", columns=column_map)
    assert candidate.name == "A" and candidate.facts["parallax"] == pytest.approx(10)
    assert band["J"].flux_jy == pytest.approx(3631 * 10**-3.6) and band["J"].source == "mine"
    assert band["W4"].flux_jy == pytest.approx(0.012) and band["W4"].source == "deep"
    assert contents.unknown_columns == ["left"]


def test_an_archive_s_unit_can_be_overruled(one, write):
    _, band, _ = one(
        "name,i1_f_ap1,i1_df_ap1\nA,50,1\n", columns=write('[units]\ni1_f_ap1 = "mJy"\ni1_df_ap1 = "mJy"\n', "m.toml")
    )
    assert band["IRAC1"].flux_jy == pytest.approx(0.05) and band["IRAC1"].error_jy == pytest.approx(0.001)


def test_a_band_by_pivot_and_zero_point(one, write):
    column_map = write("[bands.Hcont]\npivot_um = 1.57\nzero_point_jy = 1050.0\nfloor = 0.02\n", "m.toml")
    _, band, contents = one("name,Hcont_mag,Hcont_err\nA,5.0,0.02\n", columns=column_map)
    assert band["Hcont"].flux_jy == pytest.approx(10.5)
    own = contents.user_bands["Hcont"]
    assert (own.pivot_um, own.mag_system, own.floor, len(own.wave_um)) == (1.57, "Vega", 0.02, 1)


def test_a_band_by_its_curve(one, write):
    # A box from 1 to 2 micron: pivot^2 = int(w dw) / int(dw/w) = 1.5 / ln 2 for photons,
    # int(dw) / int(dw/w^2) = 2 for energy.
    write("wavelength[nm],response\n" + "".join(f"{1000 + i * 10},1\n" for i in range(101)), "box.csv")
    text = '[bands.Box]\ncurve = "box.csv"\n[bands.Ebox]\ncurve = "box.csv"\nresponse = "energy"\n'
    _, band, contents = one("name,Box_mag,Ebox_flux[W m-2 um-1]\nA,10.0,1e-12\n", columns=write(text, "m.toml"))
    assert contents.user_bands["Box"].pivot_um == pytest.approx(np.sqrt(1.5 / np.log(2)), rel=1e-6)
    assert contents.user_bands["Ebox"].pivot_um == pytest.approx(np.sqrt(2), rel=1e-6)
    assert band["Box"].flux_jy == pytest.approx(0.3631)
    # F_nu = F_lambda w^2 / c with F_lambda = 1e-6 W m-2 m-1 and w^2 = 2e-12 m2, as exact as the pivot.
    assert band["Ebox"].flux_jy == pytest.approx(1e-6 * 2e-12 / 2.99792458e8 * 1e26, rel=2e-6)


@pytest.mark.parametrize(
    ("text", "word"),
    [
        ('[columns]\nJ_mag = "nope"\n', "no such column"),
        ('[columns]\nJay = "J_mag"\n', "neither name"),
        ("[columns\n", "cannot be read"),
        ("[colums]\n", "has the parts"),
        ("[columns]\nJ_mag = 3\n", "text in quotes"),
        ('[units]\nnope = "mJy"\n', "no such column"),
        ("[bands.X]\n", "either pivot_um or curve"),
        ("[bands.X]\npivot_um = -1\n", "above zero"),
        ("[bands.X]\npivot_um = nan\n", "a number"),
        ("[bands.X]\npivot_um = 1\ncolor = 3\n", "no part"),
        ('[bands.X]\ncurve = "none.csv"\n', "cannot be opened"),
        ("columns = 3\n", "has the parts"),
        ('[bands.X]\npivot_um = 1\nmag_system = "ST"\n', "mag_system"),
        ('[bands."a b"]\npivot_um = 1\n', "no band name"),
        ("[bands]\nX = 3\n", "must hold"),
    ],
)
def test_faulty_maps(read, write, text, word):
    with pytest.raises(TableError, match=word):
        read(write("name,J_mag\nA,9\n"), columns=write(text, "m.toml"))


@pytest.mark.parametrize(
    "curve",
    ["w,r\n1,1\n", "w,r\n1,1\n1,1\n2,1\n", "w,r\n1,x\n2,1\n3,1\n", "w,r\n1,0\n2,0\n3,0\n", "w[K],r\n1,1\n2,1\n3,1\n"],
)
def test_faulty_curves(read, write, curve):
    write(curve, "c.csv")
    with pytest.raises(TableError):
        read(write("name,J_mag\nA,9\n"), columns=write('[bands.X]\ncurve = "c.csv"\n', "m.toml"))


def test_a_vega_band_without_zero_point_takes_fluxes_only(one, write):
    column_map = write(
        '[bands.X]\npivot_um = 1.5\nmag_system = "Vega"\n[bands.Y]\npivot_um = 1.5\nmag_system = "Vega"\n', "m.toml"
    )
    _, band, contents = one("name,X_mag,Y_flux[Jy]\nA,9,2\n", columns=column_map)
    assert set(band) == {"Y"} and "zero point" in contents.refused[0].reason
