"""Tables into a queue: all that can be taken, twice the same adds nothing, refusals listed, bands carried."""

from __future__ import annotations

from contextlib import closing
from pathlib import Path

import pytest

from tui.errors import StoreError, TableError
from tui.store.candidates import get_candidate
from tui.store.connect import open_queue
from tui.workflow import loading
from tui.workflow.auditing import audit_queue
from tui.workflow.basis import band_from, band_text, read_basis
from tui.workflow.loading import Sidecars, holds_candidates, load, write_refused

TABLE = """name,ra,dec,J_mag,J_err,W3_mag,W3_err,W3_limit,hue
A 1,10.5,-3.25,6.9,0.02,6.45,0.02,false,red
B 2,11.5,-4.0,7.9,0.02,7.0,0.02,true,red
C,11.5,-4.0,nope,0.02,7.0,0.02,false,red
,1,1,7.9,0.02,7.0,0.02,false,red
"""


@pytest.fixture
def table(tmp_path):
    path = tmp_path / "survey.csv"
    path.write_text(TABLE)
    return str(path)


def test_what_can_be_taken_is_and_the_rest_is_listed(tmp_path, table):
    path = str(tmp_path / "q.db")
    done = load(path, [table])
    assert (done.counts["candidates"], done.counts["measurements"]) == (3, 5)
    assert {(one.row, one.column) for one in done.refused} == {(3, "J_mag"), (4, "name")}
    assert any("hue" in text for text in done.remarks)
    with closing(open_queue(path, write=False)) as connection:
        found = get_candidate(connection, "B 2")
    assert found.facts["dec"] == -4.0
    assert [(one.band, one.limit) for one in found.measurements] == [("J", False), ("W3", True)]
    assert {one.source for one in found.measurements} == {"survey"}


def test_the_same_table_again_adds_nothing(tmp_path, table):
    path = str(tmp_path / "q.db")
    load(path, [table])
    again = load(path, [table])
    assert again.sentence().endswith("nothing new; 5 measurements were known.")


def test_a_wrong_path_leaves_no_queue_behind(tmp_path, table):
    with pytest.raises(FileNotFoundError):
        load(str(tmp_path / "q.db"), [table, str(tmp_path / "none.csv")])
    assert not (tmp_path / "q.db").exists()


@pytest.mark.parametrize("content", ["name,J_mag\n", "name,J_mag\n,8\n"], ids=["head alone", "all refused"])
def test_a_load_that_takes_nothing_leaves_no_queue_behind(tmp_path, content):
    (tmp_path / "t.csv").write_text(content)
    done = load(str(tmp_path / "q.db"), [str(tmp_path / "t.csv")])
    assert done.sentence().endswith("q.db was not made: there is nothing to put into it.")
    assert [one.name for one in tmp_path.iterdir()] == ["t.csv"]


def test_a_table_that_cannot_be_read_leaves_no_queue_behind_but_keeps_what_came_before(tmp_path, table):
    (tmp_path / "bad.vot").write_text("<VOTABLE>")
    with pytest.raises(TableError):
        load(str(tmp_path / "q.db"), [str(tmp_path / "bad.vot")])
    assert not list(tmp_path.glob("q.db*"))
    with pytest.raises(TableError):
        load(str(tmp_path / "q.db"), [table, str(tmp_path / "bad.vot")])
    assert holds_candidates(str(tmp_path / "q.db"))


def test_a_full_disk_leaves_no_stub_behind(tmp_path, table, monkeypatch):
    def full(path, create=False, write=True):
        Path(path).write_bytes(b"")
        raise StoreError(f"{path}: the disk is full; nothing was written.")

    monkeypatch.setattr(loading, "open_queue", full)
    with pytest.raises(StoreError, match="full"):
        load(str(tmp_path / "q.db"), [table])
    assert not (tmp_path / "q.db").exists()


def test_a_queue_that_was_there_is_never_taken_away(tmp_path, table):
    path = str(tmp_path / "q.db")
    open_queue(path, create=True).close()
    (tmp_path / "t.csv").write_text("name,J_mag\n")
    done = load(path, [str(tmp_path / "t.csv")])
    assert (tmp_path / "q.db").exists() and done.sentence().endswith("nothing was found to load.")
    assert any("has no rows" in text for text in done.remarks)


def test_a_folder_without_pictures_is_said(tmp_path, table):
    path = str(tmp_path / "q.db")
    load(path, [table])
    (tmp_path / "folder").mkdir()
    done = load(path, [], sidecars=Sidecars(cutouts=str(tmp_path / "folder")))
    assert done.sentence().endswith("nothing was found to load.")
    assert any("no picture NAME_BAND.fits" in text for text in done.remarks)


def test_a_list_of_refusals_that_finds_no_room_is_named():
    with pytest.raises(OSError) as full:
        write_refused("/dev/full", ["row 1"])
    assert full.value.filename == "/dev/full"


def test_a_file_that_is_no_table_is_refused_by_name(tmp_path):
    path = tmp_path / "x.csv"
    path.write_bytes(b"PK\x03\x04 not a table")
    with pytest.raises(TableError, match="x.csv"):
        load(str(tmp_path / "q.db"), [str(path)])


def test_refusals_can_go_to_a_file(tmp_path, table):
    done = load(str(tmp_path / "q.db"), [table])
    write_refused(str(tmp_path / "refused.txt"), done.refused)
    assert (tmp_path / "refused.txt").read_text().count("survey.csv, row ") == 2


def test_a_band_of_ones_own_travels_in_the_queue(tmp_path):
    (tmp_path / "t.csv").write_text("name,myband\nA,3.5\nB,2.5\n")
    (tmp_path / "map.toml").write_text(
        '[columns]\nHcont_flux = "myband"\n[units]\nHcont_flux = "mJy"\n[bands.Hcont]\npivot_um = 1.57\n'
    )
    path = str(tmp_path / "q.db")
    load(path, [str(tmp_path / "t.csv")], columns=str(tmp_path / "map.toml"), source="mine")
    with closing(open_queue(path, write=False)) as connection:
        band = read_basis(connection).user_bands["Hcont"]
        assert (band.pivot_um, get_candidate(connection, "A").measurements[0].flux_jy) == (1.57, 0.0035)
    assert band_text(band_from(band_text(band))) == band_text(band)


def test_a_minus_zero_in_any_table_leaves_the_audit_content(tmp_path):
    path = str(tmp_path / "q.db")
    (tmp_path / "t.csv").write_text("name,ra,dec,pmra,J_mag,J_err\nA,-0.0,0.0,-0.0,-0.0,0.02\n")
    (tmp_path / "dips.csv").write_text("name,event,band,depth,error\nA,e1,J,-0.0,0.01\n")
    (tmp_path / "near.csv").write_text("name,separation,position_angle,J_mag,J_err\nA,-0.0,-0.0,-0.0,0.1\n")
    sidecars = Sidecars((str(tmp_path / "dips.csv"),), (str(tmp_path / "near.csv"),))
    done = load(path, [str(tmp_path / "t.csv")], sidecars=sidecars)
    assert done.counts["side_tables"] == 2
    assert audit_queue(path).faults == ()


def test_dips_neighbours_and_spectra_hang_on_candidates_of_the_queue(tmp_path, table):
    path = str(tmp_path / "q.db")
    load(path, [table])
    (tmp_path / "dips.csv").write_text("name,event,band,depth,error\nA 1,e1,J,0.1,0.01\nNobody,e1,J,0.1,0.01\n")
    (tmp_path / "near.csv").write_text("name,separation,J_mag,J_err\nA 1,3.5,12.0,0.1\n")
    (tmp_path / "spectra.ecsv").write_text(
        "# %ECSV 1.0\n# ---\n# datatype:\n# - {name: name, datatype: string}\n"
        "# - {name: wavelength, unit: um, datatype: float64}\n"
        "# - {name: flux, unit: mJy, datatype: float64}\n# - {name: error, unit: mJy, datatype: float64}\n"
        "name wavelength flux error\n\"A 1\" 0.5 10 1\n\"A 1\" 0.6 11 1\n"
    )
    sidecars = Sidecars(*((str(tmp_path / name),) for name in ("dips.csv", "near.csv", "spectra.ecsv")))
    done = load(path, [], sidecars=sidecars)
    assert done.counts["side_tables"] == 3 and [str(one) for one in done.refused if "Nobody" in str(one)]
    with closing(open_queue(path, write=False)) as connection:
        found = get_candidate(connection, "A 1")
    assert (found.dips[0].depth, found.neighbours[0].separation_arcsec) == (0.1, 3.5)
    assert found.spectrum.flux_jy.tolist() == [0.010, 0.011]
    assert "nothing new" in load(path, [], sidecars=sidecars).sentence()


def test_event_windows_may_be_a_table_of_their_own(tmp_path, table):
    path = str(tmp_path / "q.db")
    load(path, [table])
    points = "".join(f"A 1,J,{day},{0.9 if 3 <= day <= 5 else 1.0},0.01\n" for day in range(12))
    (tmp_path / "curves.csv").write_text("name,band,time,flux,error\n" + points)
    (tmp_path / "windows.csv").write_text("name,event,start,end\nA 1,June,3,5\nA 1,July,40,50\n")
    tables = tuple(str(tmp_path / name) for name in ("curves.csv", "windows.csv"))
    done = load(path, [], sidecars=Sidecars(dips=tables))
    assert [one.row for one in done.refused] == [2]  # no point in July
    with closing(open_queue(path, write=False)) as connection:
        (dip,) = get_candidate(connection, "A 1").dips
    assert (dip.event, dip.band) == ("June", "J") and dip.depth == pytest.approx(0.1)
