"""The vetted list in its four formats, read back with astropy and the csv module."""

from __future__ import annotations

import csv
import os
import stat

import pytest
from astropy.io import fits
from astropy.io.votable import parse as parse_votable
from astropy.io.votable import validate
from astropy.io.votable.ucd import check_ucd
from astropy.table import Table

from tui.errors import InputError, TableError
from tui.model import Evidence, Fit, Param
from tui.workflow import export_files
from tui.workflow.export_columns import columns
from tui.workflow.export_row import INT_NULL, Cells, VettedRow
from tui.workflow.export_files import write_list

FORMULAS = ["=cmd|' /C calc'!A0", "+1", "-2", "@SUM(1)", "\tx"]
HOSTILE = [*FORMULAS, "plain", " =lead", "[/]", "SM ünï 星", "'quoted", 'a "b", c', "007"]


def fit(model, **params):
    return Fit(model, 12.5, 7, 0.085, 16.5, 18.25, {name: Param(*ends) for name, ends in params.items()}, {"W3": 8.25})


def vetted(name, evidence=None):
    states = dict.fromkeys(("star", "instrument", "extinction", "blend", "dust"), "open")
    counts = {"dust": {"explains": 1, "short": 2, "unclear": 0}}
    facts = {"ra": 10.123456789012345, "dec": -0.1}
    return VettedRow(name, facts, "pending", "open:star", states, counts, {"dust": 1}, {}, evidence or {})


def cells_of(rows):
    cells = Cells(columns())
    for row in rows:
        cells.add(row)
    return cells


@pytest.fixture
def cells():
    best = fit("star", teff=(5772.0, 5700.1, 5850.3, "K"))
    star = Evidence("star", 1, False, (best,), cautions=("one",), bands=("G", "J"))
    rows = [vetted(name) for name in HOSTILE[:-1]] + [vetted(HOSTILE[-1], {"star": star})]
    return cells_of(rows)


META = {"program": "plainlight 0", "settings": {"quorum": 2}, "caution": "It is no detection.", "who": "zoë\x1b"}


def written(tmp_path, ending, cells):
    path = tmp_path / f"list{ending}"
    write_list(str(path), cells, META, force=False)
    return path


def test_every_ucd_is_in_the_vocabulary_of_the_ivoa():
    wrong = [c.name for c in columns() if c.ucd and not check_ucd(c.ucd, check_controlled_vocabulary=True)]
    assert wrong == []


def test_every_column_says_what_it_is_and_has_a_name_of_its_own():
    names = [column.name for column in columns()]
    assert len(set(names)) == len(names)
    assert all(column.description for column in columns())


@pytest.mark.parametrize("ending", [".ecsv", ".fits", ".vot"])
def test_numbers_names_and_masks_read_back_unchanged(tmp_path, cells, ending):
    table = Table.read(written(tmp_path, ending, cells))
    expected = [name.replace("\t", "\ufffd") if ending == ".vot" else name for name in HOSTILE]
    assert [name.strip() for name in table["name"].tolist()] == [name.strip() for name in expected]
    assert table["ra"].tolist() == [10.123456789012345] * len(HOSTILE)
    assert table["star_teff"].mask.tolist() == [True] * (len(HOSTILE) - 1) + [False]
    assert table["star_teff_low"][-1] == 5700.1
    assert table["star_dof"][-1] == 7 and table["star_dof"].mask[0]
    assert table["dust_short"].tolist() == [2] * len(HOSTILE)
    assert table["star_teff"].unit == "K"
    assert table.colnames == [column.name for column in columns()]


def test_ecsv_carries_description_and_metadata(tmp_path, cells):
    table = Table.read(written(tmp_path, ".ecsv", cells))
    assert table.meta["settings"] == {"quorum": 2}
    assert "alone" in table["star_teff"].description


def test_votable_is_valid_and_carries_ucds_and_metadata(tmp_path, cells):
    path = written(tmp_path, ".vot", cells)
    with open(os.devnull, "w", encoding="utf-8") as nowhere:
        assert validate(str(path), output=nowhere, xmllint=False)
    document = parse_votable(path)
    field = next(f for f in document.get_first_table().fields if f.name == "star_teff")
    assert (field.ucd, str(field.unit)) == ("phys.temperature.effective", "K")
    infos = {info.name: info.value for info in document.resources[0].infos}
    assert infos["caution"] == "It is no detection." and infos["who"] == "zoë\ufffd"


def test_fits_carries_units_descriptions_and_metadata(tmp_path, cells):
    with fits.open(written(tmp_path, ".fits", cells)) as found:
        header = found["VETTED"].header
        number = next(n for n in range(1, 200) if header[f"TTYPE{n}"] == "star_dof")
        assert header[f"TNULL{number}"] == INT_NULL and "freedom" in header[f"TCOMM{number}"]
        assert "It is no detection." in "".join(header["HISTORY"])
        found.verify("exception")


def test_csv_makes_formula_cells_inert_says_so_and_keeps_the_rest(tmp_path, cells):
    text = written(tmp_path, ".csv", cells).read_text(encoding="utf-8")
    head = [line for line in text.splitlines() if line.startswith("#")]
    assert any("spreadsheet" in line for line in head)
    body = text[text.index("\nname,ra,") + 1 :]
    rows = list(csv.DictReader(body.splitlines(keepends=True)))
    assert [row["name"] for row in rows] == [f"'{name}" if name in FORMULAS else name for name in HOSTILE]
    assert float(rows[0]["dec"]) == -0.1 and rows[0]["dec"] == "-0.1"
    assert rows[0]["star_teff"] == "" and float(rows[-1]["star_teff_high"]) == 5850.3
    assert not any(line.startswith(("=", "+", "-", "@")) for line in text.splitlines())


def test_an_existing_file_is_refused_and_left_alone(tmp_path, cells):
    path = tmp_path / "list.csv"
    path.write_text("mine")
    with pytest.raises(InputError, match="--force"):
        write_list(str(path), cells, META, force=False)
    assert path.read_text() == "mine"
    write_list(str(path), cells, META, force=True)
    assert path.read_text().startswith("# program")
    assert os.listdir(tmp_path) == ["list.csv"]


def test_a_failed_write_leaves_nothing_behind(tmp_path, cells, monkeypatch):
    monkeypatch.setattr(export_files, "csv_cell", lambda value: 1 / 0)
    with pytest.raises(ZeroDivisionError):
        write_list(str(tmp_path / "list.csv"), cells, META, force=False)
    assert os.listdir(tmp_path) == []


@pytest.mark.parametrize(("name", "error"), [("list.txt", InputError), ("none/list.csv", TableError)])
def test_an_unknown_ending_or_folder_is_refused(tmp_path, cells, name, error):
    with pytest.raises(error, match="ending|folder"):
        write_list(str(tmp_path / name), cells, META, force=False)


def test_an_empty_list_is_written_with_its_columns(tmp_path):
    for ending in (".ecsv", ".fits", ".vot"):
        table = Table.read(written(tmp_path, ending, cells_of([])))
        assert (len(table), table.colnames[0]) == (0, "name")


def test_the_file_gets_the_permissions_of_a_new_file(tmp_path, cells):
    path = written(tmp_path, ".csv", cells)
    (tmp_path / "plain").write_text("")
    assert stat.S_IMODE(path.stat().st_mode) == stat.S_IMODE((tmp_path / "plain").stat().st_mode)
