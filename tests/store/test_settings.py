"""Settings: typed, checked, and every past value kept."""

from __future__ import annotations

import pytest

from tests.store.making import utc
from tui.errors import SettingError
from tui.model import Settings
from tui.store.settings import parse_setting, read_settings, setting_history, write_setting


def test_a_new_queue_has_the_defaults(queue):
    assert read_settings(queue) == Settings()


@pytest.mark.parametrize(
    ("name", "text", "field", "value"),
    [
        ("quorum", "3", "quorum", 3),
        ("agree_share", "0.75", "agree_share", 0.75),
        ("walk_all", "yes", "walk_all", True),
        ("photosphere", "planck", "photosphere", "planck"),
        ("photosphere", "grid /data/spectra", "photosphere", "grid /data/spectra"),
        ("law", "f99", "law", "f99"),
        ("r_v", "free", "r_v", "free"),
        ("r_v", "2.75", "r_v", "2.75"),
        ("av_prior", "1.5", "av_prior", "1.5"),
        ("p_min", "0.05", "p_min", 0.05),
        ("source_floor", "0", "source_floor", 0.0),
        ("floor.W3", "0.05", "floors", {"W3": 0.05}),
        ("floor.BAND", "0.02", "floors", {"BAND": 0.02}),
        ("common.Gaia", "0.01", "common", {"Gaia": 0.01}),
        ("ruwe_max", "1.25", "ruwe_max", 1.25),
        ("n_searched", "0", "n_searched", 0),
    ],
)
def test_values_are_typed_and_default_brings_them_back(queue, name, text, field, value):
    write_setting(queue, name, f" {text} ", utc(1))
    assert getattr(read_settings(queue), field) == value
    write_setting(queue, name, "default", utc(2))
    assert read_settings(queue) == Settings()


@pytest.mark.parametrize(
    ("name", "text"),
    [
        ("colour", "blue"), ("quorum", "0"), ("quorum", "two"), ("quorum", "1.5"), ("quorum", "-1"), ("quorum", "²"),
        ("agree_share", "0.5"), ("agree_share", "1.1"), ("agree_share", "nan"), ("walk_all", "1"), ("law", "x"),
        ("photosphere", "grid"), ("r_v", "0"), ("r_v", "inf"), ("p_min", "0"), ("p_min", "1"), ("floor.", "0.1"),
        ("floor.a b", "0.1"), ("floor.W3", "2"), ("common.Gaia", "-0.1"), ("n_searched", "many"), ("quorum", ""),
        ("quorum.x", "2"), ("colour", "default"), ("ruwe_max", "-1"), ("n_searched", "9" * 19),
    ],
)  # fmt: skip
def test_what_is_no_setting_or_out_of_range_is_refused(queue, name, text):
    with pytest.raises(SettingError):
        write_setting(queue, name, text, utc())
    assert setting_history(queue) == []


def test_the_error_says_what_it_may_be():
    with pytest.raises(SettingError, match="above 0.5 up to 1"):
        parse_setting("agree_share", "0.3")


def test_every_past_value_is_kept(filled, team):
    for second, value in enumerate(("3", "2", "2", "4"), 10):
        write_setting(filled, "quorum", value, utc(second), team[0].id)
    write_setting(filled, "law", "f99", utc(20))
    assert [line.value for line in setting_history(filled, "quorum")] == ["3", "2", "4"]
    assert [(line.name, line.by) for line in setting_history(filled)][-2:] == [("quorum", "heron"), ("law", "")]


def test_the_last_write_holds_whatever_the_clock_says(queue):
    write_setting(queue, "quorum", "3", utc(100))
    write_setting(queue, "quorum", "4", utc(5))
    assert read_settings(queue).quorum == 4


def test_the_newest_of_gathered_values_is_the_latest_then_the_greater_id(queue):
    values = (("b", "3", 7), ("a", "5", 7), ("c", "2", 6))
    rows = [(letter * 32, "quorum", value, utc(second), "") for letter, value, second in values]
    queue.executemany("INSERT INTO setting VALUES (?, ?, ?, ?, ?)", rows)
    assert read_settings(queue).quorum == 3
