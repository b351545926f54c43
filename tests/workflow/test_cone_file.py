"""The disk cache of the mixture bound's columns: band by band, rebuilt when damaged, safe under two processes."""

from __future__ import annotations

import hashlib
import os
import subprocess
import sys
from dataclasses import replace

import numpy as np
import pytest

from tui.model import Band, Settings
from tui.physics.photometry import AB_ZERO_JY
from tui.workflow import cone_file, templates
from tui.workflow.cache_file import make_room
from tui.workflow.cone_file import KeptCone, cone_path

NAMES = ("Gaia_G", "J", "W1")


@pytest.fixture(scope="module")
def base():
    return templates.build(Settings(), {}).take(("Gaia_BP", "Gaia_G", "J", "H", "W1"))


@pytest.fixture
def cache(tmp_path, monkeypatch):
    monkeypatch.setenv("PLAINLIGHT_CACHE", str(tmp_path / "cache"))
    return tmp_path / "cache"


@pytest.fixture
def never_built(monkeypatch):
    """From the call on, building columns fails the test."""
    return lambda: monkeypatch.setattr(cone_file, "generators_of", lambda *args: pytest.fail("built"))


def test_columns_are_built_once_and_some_bands_read_back_equal(cache, base, never_built):
    first = KeptCone("key", base, {})(base, NAMES)
    never_built()
    again = KeptCone("key", base, {})(base, NAMES)
    whole = KeptCone("key", base, {})(base, base.names).through([1, 2, 4])
    for left, right, third in zip(first.rows, again.rows, whole.rows, strict=True):
        assert np.array_equal(left, right) and np.array_equal(left, third)
    assert np.array_equal(first.middle.index, again.middle.index)
    assert first.describe(200_000) == again.describe(200_000)
    assert [path.name for path in cache.iterdir()] == ["cone-key.bin"]


@pytest.mark.parametrize(
    "spoil",
    [
        lambda raw: raw[:-5],  # the last row, W1, cut short
        lambda raw: raw[:-400] + b"x" * 400,
        lambda raw: raw[:100] + b"x" + raw[101:],
        lambda raw: b"other" + raw[5:],
        lambda raw: raw[:30],
        lambda raw: b"",
    ],
)
def test_a_damaged_file_is_built_again(cache, base, spoil, never_built):
    first = KeptCone("key", base, {})(base, NAMES)
    path = cone_path("key")
    path.write_bytes(spoil(path.read_bytes()))
    again = KeptCone("key", base, {})(base, NAMES)
    never_built()
    mended = KeptCone("key", base, {})(base, NAMES)
    assert all(np.array_equal(one, other) for one, other in zip(first.rows, again.rows, strict=True))
    assert all(np.array_equal(one, other) for one, other in zip(first.rows, mended.rows, strict=True))


def test_a_band_that_is_not_asked_for_is_not_read(cache, base, never_built):
    KeptCone("key", base, {})(base, NAMES)
    path = cone_path("key")
    path.write_bytes(path.read_bytes()[:-400] + b"x" * 400)  # W1 is the last row
    never_built()
    assert len(KeptCone("key", base, {})(base, ("J", "H")).rows) == 2


def test_a_cache_that_cannot_be_written_costs_only_time(tmp_path, monkeypatch, base):
    (tmp_path / "file").write_text("")
    monkeypatch.setenv("PLAINLIGHT_CACHE", str(tmp_path / "file" / "below"))
    assert len(KeptCone("key", base, {})(base, NAMES).rows) == 3


def test_bands_that_the_file_does_not_hold_are_built_beside_it(cache, base):
    point = Band("spectrum:1.6", 1.6, "AB", AB_ZERO_JY, 0.01, "spectrum", np.array([1.6]), np.ones(1))
    wider = templates.build(Settings(), {"point": replace(point, name="point")}).take(("J", "point"))
    found = KeptCone("key", base, {})(wider, ("point",))
    assert len(found.rows) == 1 and not cone_path("key").exists()


def test_grids_of_a_queue_know_where_their_columns_are_kept(cache):
    templates._memory.clear()
    found = templates.templates_for(Settings())
    assert found.cone is not None and found.cone.added == ()
    assert len(found.cone(found, NAMES).rows) == 3
    assert found.take(NAMES).cone is found.cone
    assert sorted(path.name.partition("-")[0] for path in cache.iterdir()) == ["cone", "grids"]


@pytest.mark.parametrize("change", [{"law": "f99"}, {"photosphere": "planck"}, {"templates": "templates:0123456789abcdef"}])
def test_whatever_columns_depend_on_changes_their_file(change):
    assert templates.cone_key(Settings(), {}) != templates.cone_key(replace(Settings(), **change), {})


def test_what_columns_do_not_depend_on_leaves_their_file():
    others = replace(Settings(), r_v="free", floors={"J": 0.2}, source_floor=0.1, p_min=0.1)
    assert templates.cone_key(Settings(), {}) == templates.cone_key(others, {})


def test_two_processes_at_once_leave_one_good_file(cache):
    templates.templates_for(Settings())
    code = (
        "from tui.workflow.templates import templates_for; from tui.model import Settings; import hashlib; "
        "t = templates_for(Settings()); print(hashlib.sha256(t.cone(t, ('J', 'W1')).rows[1]).hexdigest())"
    )
    both = [subprocess.Popen([sys.executable, "-c", code], stdout=subprocess.PIPE, text=True) for _ in range(2)]
    answers = {process.communicate(timeout=120)[0].strip() for process in both}
    assert all(process.returncode == 0 for process in both)
    found = templates.templates_for(Settings())
    assert answers == {hashlib.sha256(found.cone(found, ("W1",)).rows[0]).hexdigest()}
    assert len(list(cache.glob("cone-*"))) == 1 and not list(cache.glob(".cone-*"))


def test_the_oldest_make_room(tmp_path):
    for number in range(5):
        (tmp_path / f"cone-{number}.bin").write_bytes(b"")
        os.utime(tmp_path / f"cone-{number}.bin", (number, number))
    (tmp_path / "grids-0.bin").write_bytes(b"")
    make_room(tmp_path, "cone", 2)
    assert sorted(path.name for path in tmp_path.iterdir()) == ["cone-3.bin", "cone-4.bin", "grids-0.bin"]
