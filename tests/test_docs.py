"""The documents say what is there: every command and option, every setting, every room, and links that exist."""

from __future__ import annotations

import re
from dataclasses import fields
from pathlib import Path

import click

import tui
from tui.cli.group import cli
from tui.data import load
from tui.model import CHECKS, OUTCOMES, RULINGS, STATES, Settings

ROOT = Path(tui.__file__).parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")
DEVELOPERS = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")


def commands():
    context = click.Context(cli)
    return {name: cli.get_command(context, name) for name in cli.list_commands(context)}


def test_readme_opens_with_the_job():
    lines = README.split("\n\n")
    assert lines[0] == "# Plainlight"
    assert "explain every one of them away" in lines[1].replace("\n", " ")


def test_readme_names_every_command_and_option():
    for name, command in commands().items():
        assert f"`plainlight {name}" in README, name
        for option in command.params:
            for flag in getattr(option, "opts", ()):
                if flag.startswith("--") and flag != "--help":
                    assert flag in README, f"{name} {flag}"


def test_readme_names_no_command_that_is_not_there():
    named = set(re.findall(r"plainlight ([a-z]+) ", README))
    assert named <= set(commands()) | {"stands"}


def test_readme_names_every_word_and_setting():
    for word in (*CHECKS, *RULINGS, *STATES, *OUTCOMES):
        assert f"`{word}`" in README, word
    for setting in fields(Settings):
        name = {"floors": "floor.BAND", "common": "common.INSTRUMENT"}.get(setting.name, setting.name)
        assert name in README, name


def test_readme_names_every_instrument_of_the_band_table():
    for band in load.bands().values():
        stem = re.sub(r"[_\d].*$", "", band.name)
        assert stem in README, band.name


def test_ci_runs_the_readmes_test_command():
    command = next(line for line in README.splitlines() if line.endswith("-m pytest"))
    assert command in (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    assert command in DEVELOPERS


def test_developers_maps_every_room():
    rooms = {path.name for path in (ROOT / "tui").iterdir() if path.is_dir() and (path / "__init__.py").exists()}
    for room in rooms:
        assert f"`tui/{room}/`" in DEVELOPERS, room
    for name in re.findall(r"tests/bench/\w+\.py", DEVELOPERS):
        assert (ROOT / name).exists(), name
