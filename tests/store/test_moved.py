"""A queue file taken from under an open connection: nothing is acknowledged that nobody would find again."""

from __future__ import annotations

import os
import shutil

import pytest

from tests.store.making import rule
from tui.errors import StoreError
from tui.store.connect import immediate, open_queue, refuse_moved
from tui.store.drafts import save_draft
from tui.store.rulings import ruling_log


def delete(path, tmp_path):
    for name in (path, f"{path}-wal", f"{path}-shm"):
        if os.path.exists(name):
            os.unlink(name)


def replace(path, tmp_path):
    shutil.copy(path, tmp_path / "other.db")
    os.replace(tmp_path / "other.db", path)


def move(path, tmp_path):
    os.rename(path, tmp_path / "elsewhere.db")


TAKEN = pytest.mark.parametrize("take", [delete, replace, move])


@TAKEN
def test_a_ruling_is_refused_once_the_file_is_gone(filled, team, path, tmp_path, take):
    rule(filled, team[0], "SM-0001", "star", "short")
    take(path, tmp_path)
    with pytest.raises(StoreError, match="moved, deleted or replaced while open; nothing was recorded; your note"):
        rule(filled, team[0], "SM-0001", "dust", "explains")
    assert [one.check for one in ruling_log(filled)] == ["star"]


@TAKEN
def test_so_is_every_other_write(filled, team, path, tmp_path, take):
    take(path, tmp_path)
    with pytest.raises(StoreError, match="moved, deleted or replaced"):
        save_draft(filled, team[0].id, "SM-0001", "dust", "begun")
    assert not filled.in_transaction


def test_a_file_put_in_place_of_another_is_not_called_damaged(filled, path, tmp_path):
    replace(path, tmp_path)
    with pytest.raises(StoreError) as refused:
        filled.execute("SELECT nothing FROM nowhere")  # any complaint of SQLite's stands for those of a mixed-up log
    assert "replaced while open" in str(refused.value)
    assert "damaged" not in str(refused.value)


def test_an_untouched_file_is_written(filled, path):
    refuse_moved(filled)
    with immediate(filled):
        filled.execute("CREATE TEMP TABLE mine (x)")


def test_closing_a_queue_cut_short_says_nothing(filled, team, path):
    rule(filled, team[0], "SM-0001", "star", "short")
    other = open_queue(path)
    os.truncate(path, os.path.getsize(path) // 2)
    filled.close()
    other.close()
