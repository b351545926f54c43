"""The bootstrap beside the mixture bound: seeded, for refused candidates only, never surer than it may be."""

from __future__ import annotations

import numpy as np
import pytest

from tests.bench.natural_mixtures import FOURTEEN, Sky, in_order
from tui.checks import mixture
from tui.checks.mixture_draws import DRAWS, drawn
from tui.model import Candidate, Measurement, Settings
from tui.workflow.templates import build


@pytest.fixture(scope="module")
def templates():
    return build(Settings(), {})


@pytest.fixture(scope="module")
def sky(templates):
    return Sky(templates, in_order(templates, FOURTEEN))


def notched(sky, left, **limits):
    """A 5772 K star with a share of its light left in H; some bands as 2 sigma limits at a multiple of its flux."""
    flux = sky.star(5772.0) * np.where(np.array(sky.names) == "H", left, 1.0)
    rows = [Measurement(name, one, 0.01 * one) for name, one in zip(sky.names, flux, strict=True)]
    rows = [
        Measurement(one.band, limits[one.band] * one.flux_jy, np.nan, limit=True, nsigma=2.0) if one.band in limits else one
        for one in rows
    ]
    return Candidate("c", tuple(rows))


def test_nothing_is_drawn_where_mixtures_are_not_refused(templates, sky):
    assert drawn(notched(sky, 1.0), templates, Settings(), np.random.default_rng(1)) is None
    lone = Candidate("c", (Measurement("J", 1.0, 0.02),))
    assert drawn(lone, templates, Settings(), np.random.default_rng(1)) is None
    assert drawn(Candidate("none"), templates, Settings(), np.random.default_rng(1)) is None


def test_a_deep_notch_is_never_drawn_and_the_same_seed_draws_the_same(templates, sky):
    first, again = (drawn(notched(sky, 0.3), templates, Settings(), np.random.default_rng(4)) for _ in range(2))
    assert first == again and first.draws == DRAWS
    assert first.as_bad == 0 and first.p == pytest.approx(1 / (DRAWS + 1))
    assert "no bound" in first.sentence and f"Of {DRAWS} sets" in first.sentence


def test_draws_come_out_as_badly_no_more_often_than_the_bound_allows(templates, sky):
    # a bound on every mixture's chance bounds that of the nearest one too
    star = notched(sky, 0.72, W4=3.0)
    settings = Settings(p_min=0.5)
    (bound,) = mixture.assess([star], templates, settings)
    found = drawn(star, templates, settings, np.random.default_rng(5))
    assert bound.adequate is False and 0.001 < bound.facts["p"] < 0.5
    noise = 3 * np.sqrt(bound.facts["p"] * (1 - bound.facts["p"]) / found.draws)
    assert found.as_bad / found.draws <= bound.facts["p"] + noise
