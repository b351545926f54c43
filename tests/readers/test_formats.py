"""Every file form, written by astropy and read back the same."""

from __future__ import annotations

import math

import numpy as np
import pytest
from astropy import units as u
from astropy.table import MaskedColumn, Table

FORMS = {
    "t.ecsv": "ascii.ecsv",
    "comma.ecsv": "ascii.ecsv",
    "t.fits": "fits",
    "t.vot": "votable",
    "t.csv": "ascii.csv",
    "t.tsv": "ascii.tab",
}


def table():
    star = Table()
    star["name"] = ["HD 1", 'étoile, "two"', "=1+1", "x y z"]
    star["ra"] = np.array([10.0, 20.0, 30.0, 359.5]) * u.deg
    star["source_id"] = np.array([5853498713190525696, 2, 3, 4], dtype=np.int64)
    star["J_mag"] = MaskedColumn([8.0, 9.0, 10.0, 11.0], mask=[False, False, True, False], unit="mag")
    star["J_err"] = MaskedColumn(np.array([0.02, 0.03, 0.04, 0.05], dtype=np.float32), mask=[False, True, True, False])
    star["W4_mag"] = MaskedColumn([-999.0, 99.0, 5.0, -99.99])
    star["W4_limit"] = MaskedColumn([False, False, True, False], mask=[False, True, False, False])
    star["J_flag"] = MaskedColumn(["A", "U", "", "B"], mask=[False, False, True, False])
    star["phot_g_n_obs"] = MaskedColumn([200, 300, 0, 7], mask=[False, False, True, False])
    star["duplicated_source"] = [False, True, False, True]
    return star


def written(tmp_path, name):
    path = tmp_path / name
    star = table()
    options = {"t.fits": {}, "t.vot": {"table_id": "t"}, "comma.ecsv": {"delimiter": ","}}.get(name, {})
    if name in ("t.fits",):
        star["name"] = [text.replace("é", "e") for text in star["name"]]  # FITS text is ASCII
    star.write(path, format=FORMS[name], **options)
    return path


@pytest.mark.parametrize("name", FORMS)
def test_round_trip(read, tmp_path, name):
    contents = read(written(tmp_path, name))
    assert contents.refused == [] and contents.unknown_columns == []
    names = [c.name for c in contents.candidates]
    assert names == ["HD 1", 'etoile, "two"' if name == "t.fits" else 'étoile, "two"', "=1+1", "x y z"]
    first, second, third, fourth = ({m.band: m for m in c.measurements} for c in contents.candidates)
    assert first["J"].flux_jy == pytest.approx(1594 * 10**-3.2) and first["J"].value_error == pytest.approx(
        0.02, rel=1e-6
    )
    assert math.isnan(second["J"].error_jy) and second["J"].flags == {"flag": "U"}
    assert "J" not in third and third["W4"].limit
    assert all("W4" not in band for band in (first, second, fourth))
    facts = contents.candidates[0].facts
    assert (
        facts["source_id"] == "5853498713190525696"
        and facts["phot_g_n_obs"] == 200
        and facts["duplicated_source"] is False
    )
    assert "phot_g_n_obs" not in contents.candidates[2].facts and contents.candidates[3].facts["ra"] == 359.5


@pytest.mark.parametrize("tabledata", ["tabledata", "binary", "binary2"])
def test_votable_serialisations(read, tmp_path, tabledata):
    from astropy.io.votable import from_table, writeto

    path = tmp_path / "t.vot"
    star = table()
    for name in ("W4_limit", "phot_g_n_obs"):  # binary cells of truth values and integers cannot be masked
        star[name] = star[name].filled(0)
    writeto(from_table(star), str(path), tabledata_format=tabledata)
    contents = read(path)
    assert [c.name for c in contents.candidates][1:] == ['étoile, "two"', "=1+1", "x y z"]
    assert contents.candidates[0].facts["source_id"] == "5853498713190525696"


def test_units_come_from_the_file(read, tmp_path):
    star = Table({"name": ["A"]})
    star["W4_flux"] = [12.0] * u.mJy
    star["W3_flux"] = [1e-16] * u.W / u.m**2 / u.um
    star["J_mag"] = [8.0] * u.ABmag
    for name in ("u.ecsv", "u.fits", "u.vot"):
        path = tmp_path / name
        kept = star if name == "u.ecsv" else star["name", "W4_flux", "W3_flux"]
        kept.write(path, format="votable" if name == "u.vot" else None)
        band = {m.band: m for m in read(path).candidates[0].measurements}
        assert band["W4"].flux_jy == pytest.approx(0.012), name
        assert band["W3"].flux_jy == pytest.approx(
            (1e-16 * u.W / u.m**2 / u.um).to_value(u.Jy, u.spectral_density(12.0728 * u.um)), rel=1e-4
        )
        if name == "u.ecsv":
            assert band["J"].flux_jy == pytest.approx(3631 * 10**-3.2)


def test_endings_do_not_matter_and_text_details(read, write):
    text = '# a comment\r\n# another, with commas\r\nname;J_mag\r\n"A;1";8,0\r\n\r\nB;9.0\r\n'
    contents = read(write("\ufeff" + text, "oddly.named"))
    assert [c.name for c in contents.candidates] == ["A;1", "B"]
    assert [(entry.row, entry.column) for entry in contents.refused] == [(1, "J_mag")]


def test_masks_written_as_columns_of_their_own(read, tmp_path):
    star = table()
    for column in ("J_mag", "J_err", "W4_limit", "J_flag", "phot_g_n_obs"):
        star[column].info.serialize_method["ecsv"] = "data_mask"
    path = tmp_path / "masks.ecsv"
    star.write(path)
    contents = read(path)
    assert contents.unknown_columns == [] and contents.refused == []
    first, second, third, _ = ({m.band: m for m in c.measurements} for c in contents.candidates)
    assert "J" in first and math.isnan(second["J"].error_jy) and "J" not in third and third["W4"].limit
    assert "phot_g_n_obs" not in contents.candidates[2].facts


def test_ecsv_aligned_by_hand(read, write):
    text = (
        "# %ECSV 1.0\n# ---\n# datatype:\n# - {name: name, datatype: string}\n"
        "# - {name: W4_flux, unit: mJy, datatype: float64}\n# schema: astropy-2.0\n"
    )
    contents = read(write(text + 'name     W4_flux\n"HD 1"   12.0\nB        ""\n', "t.ecsv"))
    assert [len(c.measurements) for c in contents.candidates] == [1, 0] and contents.refused == []


def test_the_first_of_several_tables(read, tmp_path):
    from astropy.io import fits

    hdus = [fits.PrimaryHDU(np.zeros((3, 3)))] + [
        fits.table_to_hdu(Table({"name": [name], "J_mag": [8.0]})) for name in "AB"
    ]
    path = tmp_path / "two.fits"
    fits.HDUList(hdus).writeto(path)
    contents = read(path)
    assert [c.name for c in contents.candidates] == ["A"] and any(
        "first of 2 tables" in caution for caution in contents.cautions
    )


def test_arrays_in_cells_are_passed_over(read, tmp_path):
    star = Table({"name": ["A", "B"], "J_mag": [8.0, 9.0], "image": np.zeros((2, 4))})
    for name in ("a.fits", "a.vot"):
        star.write(tmp_path / name, format="votable" if name == "a.vot" else "fits")
        assert len(read(tmp_path / name).candidates) == 2


def test_parts_give_what_the_whole_gives(read, write, facts, archives):
    from tui.data.load import band_aliases, bands
    from tui.readers import read_parts

    path = write(
        "name,J_mag,J_err\n" + "".join(f"S{i % 45},{8 + i / 100:.2f},{'x' if i == 7 else 0.02}\n" for i in range(50))
    )
    whole = read(path)
    parts = list(read_parts(path, bands(), band_aliases(), facts, archives, size=7))
    assert [c.name for part in parts for c in part.candidates] == [c.name for c in whole.candidates] and len(parts) == 9
    assert [entry for part in parts for entry in part.refused] == whole.refused and len(whole.refused) == 6
