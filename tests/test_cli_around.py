"""What the commands say around a candidate: look-alikes in text and JSON, and the practice stars as text."""

from __future__ import annotations

import json
import shutil
from pathlib import Path

import pytest
from click.testing import CliRunner

from tui.cli.group import cli
from tui.workflow.practice import practice_stars

SAMPLE = Path(__file__).parent.parent / "sample_db" / "saltmarsh.db"


@pytest.fixture
def queue(tmp_path, monkeypatch):
    monkeypatch.setenv("PLAINLIGHT_CONFIG", str(tmp_path / "none.toml"))
    return shutil.copyfile(SAMPLE, tmp_path / "q.db").as_posix()


def run(*arguments):
    return CliRunner().invoke(cli, arguments)


def test_show_lists_look_alikes_in_text_and_in_json(queue):
    text = run("show", queue, "SM-0049")
    assert text.exit_code == 0 and "look-alikes among" in text.stdout and "chance alone gives" in text.stdout
    found = json.loads(run("show", queue, "SM-0049", "--json").stdout)["look_alikes"]
    assert {"band", "count", "expected", "p", "shared", "sentence", "points_to_calibration", "candidates"} <= set(found)
    assert found["count"] >= len(found["candidates"]) > 0
    names = {one["name"] for one in found["candidates"]}
    assert "SM-0049" not in names and found["candidates"][0]["name"] in text.stdout


def test_a_long_queue_is_not_searched_by_show(queue, monkeypatch):
    monkeypatch.setattr("tui.workflow.lookalikes.LONG_QUEUE", 10)
    assert json.loads(run("show", queue, "SM-0049", "--json").stdout)["look_alikes"] is None


def test_practice_without_a_terminal_tells_stars_and_answers():
    said = " ".join(run("demo", "--practice").stdout.split())
    for star in practice_stars():
        assert star.title in said and star.told in said
        assert all(answer.why in said for answer in star.answers.values())
