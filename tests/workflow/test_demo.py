"""The sample: found in a clone and in an installed package, copied before anyone opens it."""

from __future__ import annotations

import hashlib
from pathlib import Path

import pytest
from click.testing import CliRunner

from tui.cli.group import cli
from tui.errors import StoreError
from tui.workflow import demo
from tui.workflow.session import Session


def test_a_copy_is_joined_and_the_sample_stays_as_it_is(tmp_path):
    source = Path(str(demo.sample_folder())) / demo.SAMPLE
    before = hashlib.sha256(source.read_bytes()).hexdigest()
    path = demo.sample_copy(tmp_path)
    with Session.open(str(path), demo.VISITOR) as session:
        assert session.counts()["all"] >= 100 and session.next_for_me()
    assert hashlib.sha256(source.read_bytes()).hexdigest() == before


def test_a_clone_has_it_beside_the_package_and_a_wheel_within(tmp_path, monkeypatch):
    package = tmp_path / "site" / "tui"
    package.mkdir(parents=True)
    monkeypatch.setattr(demo, "files", lambda name: package)
    with pytest.raises(StoreError, match="install Plainlight again"):
        demo.sample_folder()
    for folder in (package / "sample_db", package.parent / "sample_db"):
        folder.mkdir()
        (folder / demo.SAMPLE).write_bytes(b"")
        assert demo.sample_folder() == folder


def test_without_a_terminal_it_prints_a_summary_and_leaves_nothing(tmp_path, monkeypatch):
    monkeypatch.setattr("tempfile.tempdir", str(tmp_path))
    result = CliRunner().invoke(cli, ["demo"])
    assert result.exit_code == 0 and result.stderr == ""
    for words in ("Saltmarsh", "heron", "SM-0", "settled of", "plainlight load"):
        assert words in result.stdout
    assert list(tmp_path.iterdir()) == []
