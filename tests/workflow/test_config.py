"""The user's config file: absent is fine, wrong is said with its place."""

from __future__ import annotations

import pytest

from tui.errors import TableError
from tui.workflow.config import Config, config_path, read_config


@pytest.fixture
def config(tmp_path, monkeypatch):
    path = tmp_path / "config.toml"
    monkeypatch.setenv("PLAINLIGHT_CONFIG", str(path))
    return path


def test_no_file_means_defaults(config):
    assert read_config() == Config()


def test_handle_theme_and_keys_are_read(config):
    config.write_text('handle = "heron"\ntheme = "light"\n[keys]\n"candidate.explains" = "y"\n')
    assert read_config() == Config("heron", "light", {"candidate.explains": "y"})


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("handle = 3", "quotes"),
        ("hande = 'x'", "hande"),
        ("[keys]\na = 1", "keys"),
        ("= broken", "cannot be read"),
        ("\xff", "cannot be read"),
    ],
)
def test_a_wrong_file_is_said_by_name(config, text, words):
    config.write_bytes(text.encode("latin-1"))
    with pytest.raises(TableError, match=words) as caught:
        read_config()
    assert "config.toml" in str(caught.value)


def test_without_the_variable_it_lies_in_the_users_folder(monkeypatch):
    monkeypatch.delenv("PLAINLIGHT_CONFIG", raising=False)
    assert config_path().parts[-2:] == ("plainlight", "config.toml")
