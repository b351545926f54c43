"""The disk cache of grids: kept by content, rebuilt when damaged, safe under two processes."""

from __future__ import annotations

import os
import subprocess
import sys
from dataclasses import replace

import numpy as np
import pytest

from tui.errors import SettingError
from tui.model import Settings
from tui.workflow import templates


@pytest.fixture
def cache(tmp_path, monkeypatch):
    monkeypatch.setenv("PLAINLIGHT_CACHE", str(tmp_path / "cache"))
    templates._memory.clear()
    return tmp_path / "cache"


def same(left, right):
    return left.digest == right.digest and np.array_equal(left.star.ln_flux, right.star.ln_flux, equal_nan=True)


def test_grids_are_built_once_and_read_back_equal(cache, monkeypatch):
    first = templates.templates_for(Settings())
    templates._memory.clear()
    monkeypatch.setattr(templates, "build", lambda *args: pytest.fail("built twice"))
    again = templates.templates_for(Settings())
    assert same(first, again) and again.names == first.names and again.spread.shape == first.spread.shape
    assert len(list(cache.iterdir())) == 1


def test_a_damaged_cache_is_built_again(cache):
    first = templates.templates_for(Settings())
    (path,) = cache.iterdir()
    path.write_bytes(path.read_bytes()[:-100] + b"x" * 100)
    templates._memory.clear()
    assert same(first, templates.templates_for(Settings()))
    templates._memory.clear()
    assert templates.read_cached(templates.cache_key(Settings(), {})) is not None


def test_a_cache_that_cannot_be_written_costs_only_time(tmp_path, monkeypatch):
    (tmp_path / "file").write_text("")
    monkeypatch.setenv("PLAINLIGHT_CACHE", str(tmp_path / "file" / "below"))
    templates._memory.clear()
    assert templates.templates_for(Settings()).names


@pytest.mark.parametrize(
    "change",
    [{"law": "f99"}, {"photosphere": "planck"}, {"r_v": "free"}, {"source_floor": 0.1}, {"floors": {"J": 0.2}}],
)
def test_whatever_grids_depend_on_changes_their_digest(change):
    assert templates.templates_digest(Settings()) != templates.templates_digest(replace(Settings(), **change))


def test_what_grids_do_not_depend_on_leaves_their_digest():
    others = replace(Settings(), quorum=3, p_min=0.1)
    assert templates.templates_digest(Settings()) == templates.templates_digest(others)


def test_a_senseless_r_v_is_refused():
    with pytest.raises(SettingError, match="free"):
        templates.fixed_r_v(replace(Settings(), r_v="steep"))


def test_two_processes_at_once_leave_one_good_file(cache):
    code = (
        "from tui.workflow.templates import templates_for; from tui.model import Settings; "
        "print(templates_for(Settings()).digest)"
    )
    both = [subprocess.Popen([sys.executable, "-c", code], stdout=subprocess.PIPE, text=True) for _ in range(2)]
    answers = {process.communicate(timeout=120)[0] for process in both}
    assert len(answers) == 1 and all(process.returncode == 0 for process in both)
    (path,) = cache.iterdir()
    assert path.name.startswith("grids-")


def test_old_grids_make_room(cache, monkeypatch):
    monkeypatch.setattr(templates, "KEPT_ON_DISK", 3)
    cache.mkdir()
    for number in range(5):
        (cache / f"grids-{number}.bin").write_bytes(b"")
        os.utime(cache / f"grids-{number}.bin", (number, number))
    templates.keep("new", templates.templates_for(Settings()))
    assert {path.name for path in cache.iterdir()} >= {"grids-new.bin"} and len(list(cache.iterdir())) == 3
