"""From facts and settings to what the fits use."""

from __future__ import annotations

import numpy as np
import pytest

from tui.checks.prepare import av_ceiling, fact, parallaxes, prepare
from tui.model import Candidate, Measurement, Settings


def ceiling(facts, parallax=float("nan"), **settings):
    return float(av_ceiling([Candidate("x", facts=facts)], np.array([parallax]), Settings(**settings))[0])


def test_ceiling_of_extinction():
    # setting, else the candidate's own, else 1.8 mag a kpc (Whittet 2003), else 5 mag
    assert ceiling({"av_max": 0.4}, 10.0, av_prior="2.5") == 2.5
    assert ceiling({"av_max": 0.4}, 10.0) == 0.4
    assert ceiling({}, 2.0) == pytest.approx(0.9)
    assert ceiling({}) == 5.0
    assert ceiling({"av_max": 0.0}) == 0.05 and ceiling({"av_max": 90.0}) == 30.0  # never none, never beyond the grids


@pytest.mark.parametrize(("value", "number"), [(3, 3.0), (2.5, 2.5), (None, None), ("7", None), (True, None)])
def test_a_fact_is_a_number_or_nothing(value, number):
    found = fact(Candidate("x", facts={"ruwe": value}), "ruwe")
    assert found == number if number is not None else np.isnan(found)


def test_parallax_errors_grow_with_the_magnitude_known(templates):
    # El-Badry et al. 2021, eq. 16: 1.302 at G = 12.65, 1.141 where G is unknown
    zero = dict(zip(templates.names, templates.bands, strict=True))["Gaia_G"].zero_point_jy
    facts = {"parallax": 10.0, "parallax_error": 0.02}
    seen = Candidate("a", (Measurement("Gaia_G", zero * 10 ** (-0.4 * 12.65), 1e-5),), facts)
    value, error = parallaxes([seen, Candidate("b", facts=facts)], templates, Settings())
    assert value == pytest.approx([10.017, 10.017])
    assert error == pytest.approx([0.02 * 1.3024, 0.02 * 1.141], rel=1e-3)


def test_ruwe_limit_is_a_setting(templates):
    star = Candidate("a", facts={"parallax": 10.0, "parallax_error": 0.02, "ruwe": 1.6})
    assert np.isnan(parallaxes([star], templates, Settings())[0]).all()
    assert np.isfinite(parallaxes([star], templates, Settings(ruwe_max=2.0))[0]).all()


def test_common_errors_reach_the_fits(templates):
    star = Candidate("a", (Measurement("W1", 1.0, 0.1), Measurement("J", 1.0, 0.1)))
    problem = prepare([star], templates, Settings(common={"WISE": 0.03}))
    assert problem.common.tolist() == [[0.0, 0.03]]
    assert prepare([star], templates, Settings()).common.shape == (0, 2)
