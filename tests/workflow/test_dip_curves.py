"""Curves through the depths of a dip: one a model, named without its event, through what was fitted."""

from __future__ import annotations

import numpy as np
import pytest

from tui.checks.dips import assess
from tui.data.load import bands
from tui.model import Candidate, Dip, Settings
from tui.workflow.dip_curves import dip_curves

NAMES = ("SDSS_g", "SDSS_r", "SDSS_i", "J")


@pytest.mark.parametrize("events", [("June",), ("June", "July (late)")])
def test_every_fit_has_a_curve_of_its_event(events):
    dips = tuple(
        Dip(event, band, 0.05 * (1 + place), 0.001) for place, event in enumerate(events) for band in NAMES
    )
    star = Candidate("one", dips=dips)
    (evidence,) = assess([star], bands(), Settings())
    curves = dip_curves(star, evidence, "g23", bands())
    assert len(curves) == 3 * len(events)
    assert {curve.model for curve in curves} == {"grey", "A(lambda), R_V", "lambda^-alpha"}
    for place, event in enumerate(events):
        grey = next(curve for curve in curves if (curve.event, curve.model) == (event, "grey"))
        assert grey.depth == pytest.approx(0.05 * (1 + place), rel=0.01) and np.all(np.diff(grey.wave_um) > 0)


def test_no_dips_no_curves():
    assert dip_curves(Candidate("one"), None, "g23", bands()) == []
