"""Axes of the spectrum plot: round values, short texts, units."""

from __future__ import annotations

import math

import pytest

from tui.desk.widgets.plot_scale import Scale, flux_unit, tick_text, ticks


def test_scale_maps_ends_to_first_and_last_dot():
    scale = Scale(-1.0, 2.0, 61)
    assert scale.dot([-1.0, 2.0]).tolist() == [0.0, 60.0]
    assert Scale(-1.0, 2.0, 61, flip=True).dot(2.0) == 0.0


@pytest.mark.parametrize("room", [2, 3, 5, 8, 13])
@pytest.mark.parametrize(("low", "high"), [(-0.4, 1.4), (-3.2, -2.9), (-8.0, 3.0), (0.30, 0.44), (1.0, 1.2)])
def test_ticks_lie_inside_increase_and_fit(low, high, room):
    values = ticks(low, high, room)
    assert values == sorted(set(values))
    assert all(low - 1e-6 <= math.log10(value) <= high + 1e-6 for value in values)
    assert len(values) <= max(room, 5)


def test_ticks_of_several_decades_are_decades():
    assert ticks(-5.5, 0.5, 6) == [1e-5, 1e-4, 1e-3, 1e-2, 1e-1, 1.0]


def test_ticks_inside_one_decade_are_even_steps():
    values = ticks(math.log10(3.1), math.log10(3.9), 4)
    steps = {round(b - a, 9) for a, b in zip(values, values[1:], strict=False)}
    assert len(values) >= 2 and len(steps) == 1


def test_tick_texts_are_at_most_five_columns():
    values = [value for low in range(-16, 5) for value in ticks(low, low + 2.5, 6)]
    assert all(len(tick_text(value)) <= 5 for value in values)


@pytest.mark.parametrize(("high", "unit"), [(1.5, "Jy"), (-0.2, "mJy"), (-3.5, "uJy"), (-12.0, "nJy")])
def test_flux_unit_keeps_the_top_between_one_and_a_thousand(high, unit):
    assert flux_unit(high)[1] == unit
