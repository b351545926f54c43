"""Several measurements of a band become one, and candidates become arrays."""

from __future__ import annotations

import numpy as np
import pytest

from tui.errors import TemplateError
from tui.model import Candidate, Measurement
from tui.physics.problem import build_problem, combine, fitted_bands

NAN = float("nan")


def arrays(candidates, grids, **options):
    count = len(candidates)
    nothing = (np.full(count, NAN), np.full(count, NAN))
    return build_problem(candidates, grids, parallaxes=nothing, av_max=np.full(count, 5.0), **options)


def test_repeats_take_their_weighted_mean():
    # weights 1/0.01^2 and 1/0.02^2: mean (4*1.00 + 1*1.05)/5, error 0.01 sqrt(4/5), by hand
    found = combine([Measurement("J", 1.00, 0.01), Measurement("J", 1.05, 0.02)])
    assert (found.flux_jy, found.error_jy) == pytest.approx((1.01, 0.01 * np.sqrt(0.8)))
    assert found.count == 2 and not found.limit
    assert found.scatter == pytest.approx(np.sqrt((0.01 / 0.01) ** 2 + (0.04 / 0.02) ** 2))


def test_repeats_of_pure_noise_scatter_by_one():
    rng = np.random.default_rng(2)
    draws = [
        combine([Measurement("J", 1 + 0.02 * rng.standard_normal(), 0.02)
        for _ in range(6)]).scatter ** 2 for _ in range(400)
    ]
    assert np.mean(draws) == pytest.approx(1.0, abs=0.1)  # chi-square of 5 degrees over 5: error of the mean 0.03


def test_a_lone_detection_without_error_leaves_it_to_the_floor():
    found = combine([Measurement("J", -2.0, NAN)])
    assert (found.flux_jy, found.error_jy) == (-2.0, 0.0)


def test_limits_alone_leave_the_tightest_and_detections_stand_before_limits():
    limits = [Measurement("W4", 3.0, NAN, True, 2.0), Measurement("W4", 1.8, NAN, True, 3.0)]
    found = combine(limits)
    assert found.limit and (found.flux_jy, found.error_jy) == pytest.approx((1.8, 0.6))
    assert not combine([*limits, Measurement("W4", 2.0, 0.5)]).limit


def test_excluded_measurements_are_not_fitted():
    candidate = Candidate("x", (Measurement("J", 1.0, 0.1), Measurement("J", 9.0, 0.1, exclude=True)))
    assert fitted_bands(candidate)["J"].flux_jy == 1.0
    gone = Candidate("x", (Measurement("J", 9.0, 0.1, exclude=True),))
    assert fitted_bands(gone) == {}


def test_arrays_hold_what_was_measured(grids):
    first = Candidate("a", (Measurement("W4", 2e-3, NAN, True, 2.0), Measurement("V", 1.0, 0.02)))
    second = Candidate("b", (Measurement("Ks", -0.01, 0.02), Measurement("GALEX_NUV", 1e-3, 1e-4)))
    found = arrays([first, second], grids, common={"WISE": 0.02})
    assert found.templates.names == ("V", "Ks", "W4")  # nothing is said of NUV: left out, and the star's evidence tells
    assert found.detected.tolist() == [[True, False, False], [False, True, False]]
    assert found.limited.tolist() == [[False, False, True], [False, False, False]]
    assert found.error_jy[0, 2] == pytest.approx(1e-3)
    assert found.flux_jy[1, 1] == -0.01  # a negative flux stays what it is
    assert found.points.tolist() == [2, 1]
    assert found.common.tolist() == [[0.0, 0.0, 0.02]]


def test_a_band_that_the_grids_lack_is_named(grids):
    stranger = Candidate("a", (Measurement("Zz", 1.0, 0.1),))
    with pytest.raises(TemplateError, match="Zz"):
        arrays([stranger], grids)


def test_some_rows_and_fewer_cells(grids):
    stars = [Candidate(str(n), (Measurement("V", 1.0 + n, 0.1), Measurement("Ks", 1.0, 0.1))) for n in range(4)]
    whole = arrays(stars, grids)
    assert len(whole) == 4
    assert whole.take(np.array([3, 1])).flux_jy[:, 0].tolist() == [4.0, 2.0]
    dropped = np.zeros((4, 2), bool)
    dropped[2, 0] = True
    assert whole.without(dropped).points.tolist() == [2, 2, 1, 2]


def test_no_candidate_and_no_band_are_fine(grids):
    assert len(arrays([], grids)) == 0
    assert arrays([Candidate("empty")], grids).points.tolist() == [0]
