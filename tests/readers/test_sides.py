"""Side tables: dips, neighbours, spectra."""

from __future__ import annotations

import math

import numpy as np
import pytest
from astropy import units as u

from tui.data.load import band_aliases, bands
from tui.errors import TableError
from tui.readers import read_dips, read_spectra, read_windows


def dips(path, **options):
    return read_dips(path, bands(), band_aliases(), **options)


def test_dips(write):
    contents = dips(
        write("name,event,band,depth[%],error[%],epoch\nA,e1,g,2.0,0.1,2017\nA,e1,i,1.0,,2017\nB,e1,J,-0.5,0.2,\n")
    )
    first, second = contents.rows["A"]
    assert (first.event, first.band, first.epoch) == ("e1", "SDSS_g", "2017")
    assert (first.depth, first.depth_error) == (pytest.approx(0.02), pytest.approx(0.001))
    assert math.isnan(second.depth_error) and contents.rows["B"][0].depth == pytest.approx(-0.005)


def test_dips_in_magnitudes(write):
    (dip,) = dips(write("name,band,depth[mag],depth_error[mag]\nA,J,0.7526,0.01\n")).rows["A"]
    assert dip.depth == pytest.approx(0.5, abs=1e-4)  # 2.5 log10 2 = 0.7526
    assert dip.depth_error == pytest.approx(0.4 * math.log(10) * 0.01 * 0.5, rel=1e-3)


def test_dips_that_cannot_be_taken(write):
    contents = dips(write("name,band,depth\nA,Q,0.1\nA,J,1.5\nA,J,x\n,J,0.1\nA,J,0.1\nA,J,0.2\n"))
    assert [dip.depth for dip in contents.rows["A"]] == [0.1]
    assert sorted(entry.row for entry in contents.refused) == [1, 2, 3, 4, 6]
    with pytest.raises(TableError, match="depth"):
        dips(write("name,band\nA,J\n"))


def test_light_curves_with_event_windows(write):
    generator = np.random.default_rng(3)
    rows = ["name,band,time,flux,error,event"]
    for band, depth in (("g", 0.04), ("i", 0.01)):
        for time in range(400):
            event = "e1" if 100 <= time < 120 else ""
            flux = 50.0 * (1 - (depth if event else 0)) + generator.normal(0, 0.25)
            rows.append(f"A,{band},{time},{flux:.5f},0.25,{event}")
    contents = dips(write("\n".join(rows) + "\n"))
    g, i = contents.rows["A"]
    # Errors of 0.5 % in each point: 20 points inside give 0.112 %, 380 outside 0.026 %, together 0.115 %.
    assert g.depth_error == pytest.approx(0.00112, rel=0.05) and g.band == "SDSS_g" and g.event == "e1"
    assert abs(g.depth - 0.04) < 3 * g.depth_error and abs(i.depth - 0.01) < 3 * i.depth_error
    assert contents.refused == [] and contents.unknown_columns == []


def test_light_curves_in_magnitudes_and_too_short(write):
    rows = (
        "".join(f"A,J,{10 + 0.001 * (i % 2)},\n" for i in range(10))
        + "A,J,10.7531,e\nA,H,9,e\nA,H,9,\nA,Q,9,\nA,J,,e\n"
    )
    contents = dips(write("name,band,mag,event\n" + rows))
    (dip,) = contents.rows["A"]
    assert dip.depth == pytest.approx(0.5, abs=1e-3) and 0 < dip.depth_error < 1e-3
    assert sorted(entry.row for entry in contents.refused) == [12, 14, 15]


def test_neighbours(read_near, write):
    head = "name,separation[arcmin],position_angle,source,G_mag,j_m,j_msigcom,W1_flux[mJy],other\n"
    contents = read_near(
        write(head + "A,0.1,30,Gaia DR3,18.0,15,0.1,2,x\nA,0.05,,,17,,,,\nB,-1,0,,9,,,,\nC,,0,,9,,,,\n")
    )
    near, far = contents.rows["A"]
    assert (near.separation_arcsec, far.separation_arcsec, far.position_angle_deg) == (
        pytest.approx(3),
        pytest.approx(6),
        30,
    )
    assert (
        far.source == "Gaia DR3"
        and set(far.fluxes_jy) == {"Gaia_G", "J", "W1"}
        and far.fluxes_jy["W1"] == pytest.approx(0.002)
    )
    assert math.isnan(near.position_angle_deg) and set(near.fluxes_jy) == {"Gaia_G"}
    assert [entry.row for entry in contents.refused] == [3, 4] and contents.unknown_columns == ["other"]
    with pytest.raises(TableError, match="separation"):
        read_near(write("name,G_mag\nA,9\n"))
    with pytest.raises(TableError, match="no angle"):
        read_near(write("name,separation[kpc]\nA,9\n"))


def test_neighbours_with_a_column_map(read_near, write):
    column_map = write('[columns]\nseparation = "d"\nG_mag = "gg"\n[units]\nd = "mas"\n', "m.toml")
    contents = read_near(write("name,d,gg\nA,1500,18\n"), columns=column_map)
    assert contents.rows["A"][0].separation_arcsec == pytest.approx(1.5) and set(contents.rows["A"][0].fluxes_jy) == {
        "Gaia_G"
    }


def test_spectra(write):
    head = "name,wavelength[nm],flux[erg/s/cm2/AA],error[erg/s/cm2/AA]\n"
    contents = read_spectra(write(head + "A,1000,2e-15,1e-16\nA,900,1e-15,1e-16\nB,500,1e-15,1e-16\n"))
    spectrum = contents.rows["A"]
    assert spectrum.wave_um.tolist() == pytest.approx([0.9, 1.0])
    unit = u.erg / u.s / u.cm**2 / u.AA
    expected = [(f * unit).to_value(u.Jy, u.spectral_density(w * u.um)) for f, w in ((1e-15, 0.9), (2e-15, 1.0))]
    assert spectrum.flux_jy == pytest.approx(expected) and spectrum.error_jy[0] == pytest.approx(expected[0] / 10)
    assert contents.rows["B"].wave_um.shape == (1,)


def test_spectra_by_frequency_and_with_bad_points(write):
    head = "name,wavelength[GHz],flux[mJy],error[mJy]\n"
    contents = read_spectra(write(head + "A,300000,2,1\nA,300000,3,1\nA,200000,-1,1\nA,1,x,1\nA,-5,1,1\nA,9,1,0\n"))
    assert contents.rows["A"].wave_um == pytest.approx(np.array([0.999308, 1.498962]), rel=1e-6)  # c / nu
    assert contents.rows["A"].flux_jy == pytest.approx([0.002, -0.001])
    assert sorted(entry.row for entry in contents.refused) == [2, 4, 5, 6]


@pytest.mark.parametrize(
    "text",
    [
        "name,wavelength,flux[Jy],error\nA,1,1,1\n",
        "name,wavelength[um],flux,error\nA,1,1,1\n",
        "name,wavelength[K],flux[Jy],error\nA,1,1,1\n",
        "name,wavelength[um],flux[mag],error\nA,1,1,1\n",
        "name,wavelength[um],flux[Jy]\nA,1,1\n",
    ],
)
def test_spectra_need_units(write, text):
    with pytest.raises(TableError):
        read_spectra(write(text))


def test_a_column_map_gives_units(write):
    column_map = write('[units]\nwavelength = "um"\nflux = "mJy"\n', "m.toml")
    assert read_spectra(write("name,wavelength,flux,error\nA,1,2,1\n"), columns=column_map).rows["A"].flux_jy[
        0
    ] == pytest.approx(0.002)


def light_curve(depths, event=False):
    """A CSV text of 400 points in each band, dimmed from time 100 to 119, noise of half a percent."""
    generator = np.random.default_rng(3)
    rows = ["name,band,time,flux,error" + (",event" if event else "")]
    for band, depth in depths.items():
        for time in range(400):
            inside = 100 <= time < 120
            flux = 50.0 * (1 - (depth if inside else 0)) + generator.normal(0, 0.25)
            rows.append(f"A,{band},{time},{flux:.5f},0.25" + ((",e1" if inside else ",") if event else ""))
    return "\n".join(rows) + "\n"


def windows_of(*paths):
    return read_windows(paths, bands(), band_aliases())


def test_windows_of_their_own_give_what_the_column_gives(write):
    curves = write(light_curve({"g": 0.04, "i": 0.01}), "curves.csv")
    table = write("name,event,start,end\nA,e1,100,119\n", "windows.csv")
    windows, others = windows_of(curves, table)  # in either order
    assert others == [str(curves)] and windows.refused == []
    given = dips(write(light_curve({"g": 0.04, "i": 0.01}, event=True), "events.csv")).rows["A"]
    assert dips(curves, windows=windows).rows["A"] == given and windows.unreached() == []


def test_a_window_of_one_band_leaves_the_others_alone(write):
    table = write("name,event,start,end,band\nA,,100,109,g\nA,,110,119,g\n")
    found = dips(write(light_curve({"g": 0.04, "i": 0.01}), "c.csv"), windows=windows_of(table)[0]).rows["A"]
    assert [(dip.event, dip.band) for dip in found] == [("1", "SDSS_g"), ("2", "SDSS_g")]


def test_windows_that_cannot_be_taken(write):
    text = "name,event,start,end,band\nA,e,119,100,\nA,e,x,3,\nA,e,,3,\nA,e,1,2,Q\n,e,1,2,\nA,late,900,901,\nB,e,1,2,\n"
    windows, _ = windows_of(write(text))
    assert sorted(entry.row for entry in windows.refused) == [1, 2, 3, 4, 5]
    assert dips(write(light_curve({"g": 0.04}), "c.csv"), windows=windows).rows == {}
    assert [entry.row for entry in windows.unreached()] == [6, 7]
    assert "no light curve" in windows.unreached()[0].reason


def test_light_curves_say_what_they_lack(write):
    curves = write(light_curve({"g": 0.04}), "c.csv")
    with pytest.raises(TableError, match="start, end"):
        dips(curves)
    windows, _ = windows_of(write("name,start[d],end[d]\nA,100,119\n", "w.csv"))
    with pytest.raises(TableError, match="time"):
        dips(write("name,band,flux\nA,g,1\n", "no_time.csv"), windows=windows)
    with pytest.raises(TableError, match="one unit"):
        dips(write("name,band,time[yr],flux\nA,g,1,1\n", "years.csv"), windows=windows)
    contents = dips(write("name,band,time,flux\nA,g,,1\nA,g,x,1\nA,g,1,1\n", "gaps.csv"), windows=windows)
    assert sorted((entry.row, entry.column) for entry in contents.refused) == [(1, "time"), (2, "time")]
