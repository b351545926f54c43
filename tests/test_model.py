"""The shared records' JSON: one text for one value."""

from __future__ import annotations

import numpy as np

from tui.model import canonical_json, digest


def test_a_zero_has_no_sign():
    assert canonical_json({"pm": [-0.0, np.float64(-0.0), np.array([-0.0, 1.0])]}) == '{"pm":[0.0,0.0,[0.0,1.0]]}'
    assert digest([-0.0]) == digest([0.0])


def test_what_json_has_not_becomes_null():
    assert canonical_json([float("nan"), float("inf"), np.float64("-inf")]) == "[null,null,null]"
