"""Every packaged table says where it comes from."""

from __future__ import annotations

from pathlib import Path

import pytest

import tui
from tui.data import load

TABLES = sorted((Path(tui.__file__).parent / "data").rglob("*.csv"))


@pytest.mark.parametrize("path", TABLES, ids=lambda path: path.name)
def test_table_opens_with_its_source(path):
    head = [line for line in path.read_text(encoding="utf-8").splitlines()[:12] if line.startswith("#")]
    for word in ("# source:", "# from:", "# changed:", "# units:"):
        stated = [line for line in head if line.startswith(word)]
        assert stated and len(stated[0]) > len(word) + 2, f"{path.name} lacks {word}"


def test_bands_are_complete_and_in_order():
    bands = load.bands()
    assert len(bands) == 44
    pivots = [band.pivot_um for band in bands.values()]
    assert pivots == sorted(pivots)
    assert all(band.zero_point_jy > 0 and 0 < band.floor < 0.2 for band in bands.values())
    assert set(load.band_aliases().values()) <= set(bands)


# pivot wavelengths, micron: SDSS Doi et al. 2010; 2MASS Cohen et al. 2003; WISE Wright et al. 2010; Gaia Riello et al. 2021
@pytest.mark.parametrize(
    ("band", "pivot_um"),
    [("SDSS_u", 0.3592), ("SDSS_z", 0.8904), ("J", 1.235), ("Ks", 2.160), ("W1", 3.368), ("W3", 12.07), ("Gaia_G", 0.6218)],
)
def test_pivot_wavelengths(band, pivot_um):
    assert load.bands()[band].pivot_um == pytest.approx(pivot_um, rel=6e-4)  # half the last digit printed


def test_mean_dwarf_of_the_sun():
    # Pecaut & Mamajek 2013, update 2022.04.16, row G2V: 5770 K, log L 0.01, M_V 4.80, V-Ks 1.564
    dwarfs = load.dwarfs()
    row = dwarfs.sp_type.index("G2V")
    assert dwarfs.teff_k[row] == 5770
    assert dwarfs.absolute_mag["V"][row] == pytest.approx(4.80)
    assert dwarfs.absolute_mag["V"][row] - dwarfs.absolute_mag["Ks"][row] == pytest.approx(1.564, abs=0.03)
