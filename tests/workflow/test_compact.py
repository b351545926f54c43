"""Evidence as it is kept: shorter, and the same to ten digits."""

from __future__ import annotations

import math

import pytest

from tui.model import Evidence, Fit, Param
from tui.store.codec import evidence_text
from tui.workflow.compact import compact

FIT = Fit("star", 1 / 3, 5, 2e-300 / 3, 10 / 3, 20 / 3, {"teff": Param(5772 / 0.999, math.nan, math.inf, "K")},
          {"J": -2 / 3, "H": -0.0}, 100 / 3)  # fmt: skip
WHOLE = Evidence("star", 3, True, (FIT,), ("a caution",), {"p": 1 / 7, "deep": [{"n": 2, "x": 1e9 / 3}]}, "d", ("J",))


def test_numbers_agree_to_ten_digits():
    found = compact(WHOLE)
    (fit,) = found.fits
    assert (found.kind, found.version, found.adequate, found.cautions, found.digest, found.bands) == (
        "star", 3, True, ("a caution",), "d", ("J",)
    )  # fmt: skip
    for name in ("chi2", "p", "aic", "bic", "minus2lnl"):
        assert getattr(fit, name) == pytest.approx(getattr(FIT, name), rel=1e-9)
    assert fit.dof == 5 and fit.pulls["J"] == pytest.approx(-2 / 3, rel=1e-9) and fit.params["teff"].unit == "K"
    assert math.isnan(fit.params["teff"].low) and fit.params["teff"].high == math.inf
    assert math.copysign(1, fit.pulls["H"]) == 1.0
    assert found.facts["deep"][0]["n"] == 2 and found.facts["p"] == pytest.approx(1 / 7, rel=1e-9)


def test_it_takes_less_room_and_twice_is_once():
    assert len(evidence_text(compact(WHOLE))) < 0.85 * len(evidence_text(WHOLE))
    assert compact(compact(WHOLE)).facts == compact(WHOLE).facts
