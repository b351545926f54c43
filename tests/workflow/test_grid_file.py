"""Grids as a file: what goes in comes out, and damage is noticed."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import pytest

from tui.workflow.grid_file import DamagedError, pack, unpack


@dataclass(frozen=True, slots=True, eq=False)
class Grid:
    name: str
    table: np.ndarray
    parts: tuple
    low: float


@pytest.fixture
def raw():
    inner = Grid("inner", np.array([True, False]), (), math.inf)
    return pack(Grid("outer", np.arange(6.0).reshape(2, 3), (inner, None, [1, "a"], {"k": np.arange(3)}), math.nan))


def test_a_tree_of_records_comes_back(raw):
    found = unpack(raw, {"Grid": Grid})
    assert found.table.tolist() == [[0.0, 1.0, 2.0], [3.0, 4.0, 5.0]] and math.isnan(found.low)
    inner, nothing, items, mapping = found.parts
    assert (inner.name, inner.table.tolist(), inner.low) == ("inner", [True, False], math.inf)
    assert (nothing, items, mapping["k"].tolist()) == (None, [1, "a"], [0, 1, 2])


def test_any_one_damaged_byte_is_noticed(raw):
    for place in range(0, len(raw), 7):
        hurt = bytearray(raw)
        hurt[place] ^= 0x40
        with pytest.raises(DamagedError):
            unpack(bytes(hurt), {"Grid": Grid})


def test_a_truncated_or_empty_file_is_noticed(raw):
    for length in (0, 5, 40, len(raw) - 1):
        with pytest.raises(DamagedError):
            unpack(raw[:length], {"Grid": Grid})


def test_records_of_another_program_are_refused(raw):
    with pytest.raises(DamagedError, match="version"):
        unpack(raw, {})


def test_what_cannot_be_held_is_refused():
    with pytest.raises(TypeError, match="hold"):
        pack({"f": object()})
