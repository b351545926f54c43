"""Where faults of the program are written down."""

from __future__ import annotations

import pytest

from tui.workflow import fault_log


@pytest.fixture
def folder(monkeypatch, tmp_path):
    """The user's log folder."""
    monkeypatch.setattr("platformdirs.user_log_path", lambda *args, **kwargs: tmp_path)
    return tmp_path


def fault(text: str) -> Exception:
    try:
        raise ValueError(text)
    except ValueError as error:
        return error


def test_faults_are_added_with_their_place_and_the_program_that_had_them(folder):
    paths = {fault_log.keep_fault(fault(text), "spectrum plot") for text in ("first", "second\udc80")}
    assert paths == {folder / "desk-faults.txt"}
    text = paths.pop().read_text(encoding="utf-8")
    assert text.count("spectrum plot\nTraceback") == 2 and text.count("in fault\n") == 2
    assert text.index("ValueError: first") < text.index("ValueError: second?") and text.count("Plainlight ") == 2


def test_a_file_that_grew_long_makes_way_and_only_one_is_kept(folder, monkeypatch):
    monkeypatch.setattr(fault_log, "LONGEST", 100)
    for number in range(4):
        fault_log.keep_fault(fault(f"number {number}"), "queue")
    assert sorted(path.name for path in folder.iterdir()) == ["desk-faults.old.txt", "desk-faults.txt"]
    assert "number 3" in (folder / "desk-faults.txt").read_text()
    assert "number 2" in (folder / "desk-faults.old.txt").read_text()
