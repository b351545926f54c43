"""The user's config file: absent is fine, wrong is said with its place."""

from __future__ import annotations

import pytest

from tui.errors import SettingError, TableError
from tui.workflow.config import Config, config_path, named_config, read_config


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


def test_a_refused_theme_names_the_file_that_asks_for_it(config):
    config.write_text('theme = "sepia"\n')
    with pytest.raises(TableError, match="theme: there is no 'sepia'") as refused, named_config():
        raise SettingError("theme", "there is no 'sepia'. They are dark, light.")
    assert str(refused.value).startswith(str(config))


def test_a_refusal_that_names_the_file_already_is_left_as_it_is(config):
    with pytest.raises(SettingError), named_config():
        raise SettingError("keys.x", f"there is no such action. Mend it in {config}.")


@pytest.mark.parametrize(("content", "words"), [(b"\xff", "not UTF-8 text"), (b"handle =\nx", "line 1")])
def test_a_file_that_cannot_be_read_is_refused_in_plain_words(config, content, words):
    config.write_bytes(content)
    with pytest.raises(TableError, match=words) as refused:
        read_config()
    assert "codec" not in str(refused.value)
