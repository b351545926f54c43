"""Settings by command: what is refused, and what is said to follow from a change."""

from __future__ import annotations

from contextlib import closing

import pytest
from click.testing import CliRunner

from tui.cli.group import cli
from tui.errors import SettingError
from tui.store.connect import open_queue
from tui.store.settings import read_settings
from tui.workflow import setting


@pytest.mark.parametrize("name", ["foo", "quorun", "floor.", "floor", "n_serched"])
def test_the_past_of_no_setting_is_refused(queue, name):
    with pytest.raises(SettingError, match="no such setting"):
        setting.history(queue, name)


def test_near_names_are_offered(queue):
    with pytest.raises(SettingError, match="near it is quorum"):
        setting.history(queue, "quorun")


@pytest.mark.parametrize(
    ("name", "value", "words"),
    [
        ("floor.XX", "0.1", "no band 'XX'"),
        ("floor.w3", "0.1", "near it: W3"),
        ("n_searched", "2", "give at least 3"),
    ],
)
def test_what_cannot_be_meant_is_refused_and_not_written(queue, name, value, words):
    with pytest.raises(SettingError, match=words):
        setting.write(queue, name, value, None)
    with closing(open_queue(queue)) as connection:
        assert read_settings(connection).floors == {} and read_settings(connection).n_searched is None


@pytest.mark.parametrize(
    ("name", "value", "words"),
    [
        ("quorum", "3", "States and outcomes follow it."),
        ("n_searched", "100000", "Evidence on blend is outdated until"),
        ("law", "f99", "All evidence is outdated until"),
        ("floor.W3", "0.1", "All evidence is outdated until"),
        ("quorum", "2", "It was so before."),
    ],
)
def test_only_what_rests_on_a_setting_is_said_to_be_outdated(queue, name, value, words):
    assert words in setting.write(queue, name, value, None)


def test_a_negative_value_is_refused_as_a_value_and_not_as_an_option(queue):
    result = CliRunner().invoke(cli, ["set", queue, "quorum", "-1"])
    assert result.exit_code == 2 and "'-1' is not a whole number from 1 on" in result.stderr


def test_a_setting_that_nobody_set_says_so(queue):
    result = CliRunner().invoke(cli, ["set", queue, "quorum"])
    assert (result.exit_code, result.stdout) == (0, "quorum was never set: the default holds.\n")
