"""Columns that hold no plain cells are named, in FITS and in VOTable."""

from __future__ import annotations

import numpy as np
import pytest
from astropy.table import Table

from tui.errors import TableError


def saved(path, table):
    table.write(path, format="fits" if path.suffix == ".fits" else "votable")
    return str(path)


def measured():
    return Table({"name": ["A", "B"], "H_mag": [8.0, 9.0]})


@pytest.mark.parametrize("ending", ["t.fits", "t.vot"])
def test_a_band_that_holds_arrays_is_refused_by_its_name(tmp_path, read, ending):
    table = measured()
    table["J_mag"] = np.ones((2, 3))
    contents = read(saved(tmp_path / ending, table))
    assert [(entry.row, entry.column) for entry in contents.refused] == [(0, "J_mag")]
    assert "holds arrays" in contents.refused[0].reason
    assert [m.band for m in contents.candidates[0].measurements] == ["H"]


@pytest.mark.parametrize("ending", ["t.fits", "t.vot"])
def test_complex_numbers_are_named_too(tmp_path, read, ending):
    table = measured()
    table["J_mag"] = np.array([1 + 2j, 3 + 4j])
    contents = read(saved(tmp_path / ending, table))
    assert [entry.column for entry in contents.refused] == ["J_mag"]
    assert "complex numbers" in contents.refused[0].reason


@pytest.mark.parametrize("ending", ["t.fits", "t.vot"])
def test_an_array_that_nothing_asks_for_is_a_remark(tmp_path, read, ending):
    table = measured()
    table["covariance"] = np.ones((2, 3))
    contents = read(saved(tmp_path / ending, table))
    assert contents.refused == []
    assert any("column covariance holds arrays and is not read" in caution for caution in contents.cautions)


def test_nothing_but_arrays_is_no_table(tmp_path, read):
    with pytest.raises(TableError, match="every column holds arrays"):
        read(saved(tmp_path / "t.fits", Table({"J_mag": np.ones((2, 3))})))
