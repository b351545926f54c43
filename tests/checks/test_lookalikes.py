"""Look-alikes: cosines by hand, chance by permutation, shared magnitude and place, and a large queue."""

from __future__ import annotations

import time
import tracemalloc

import numpy as np
import pytest

from tui.checks.lookalikes import (
    alike_many,
    cosines,
    look_alikes,
    pulls_table,
    ready,
    sentence,
    shared_patterns,
    shuffled,
    sky_vectors,
)

BANDS = tuple("abcdefgh")
PATTERN = np.array([0, 0, 0, 0, 2.0, 4.0, 6.0, 8.0])


def queue(count, members, rng, missing=0.0):
    """Noise pulls; the first `members` rows share a pattern."""
    pulls = rng.normal(size=(count, 8))
    pulls[:members] += PATTERN
    pulls[rng.random(pulls.shape) < missing] = np.nan
    return pulls


def test_cosine_by_hand():
    target = np.array([1.0, 2.0, np.nan, 2.0, 4.0])
    rows = np.array(
        [
            [2.0, 4.0, 9.0, 4.0, 8.0],  # the same pattern twice as strong, over the four shared bands
            [-1.0, -2.0, 0.0, -2.0, -4.0],  # turned over
            [2.0, -1.0, 0.0, 4.0, -2.0],  # at right angles
            [1.0, 2.0, 5.0, np.nan, 4.0],  # three shared bands: too few
            [0.0, 0.0, 5.0, 0.0, 0.0],  # nothing to compare
        ]
    )
    found = cosines(target, ready(rows))
    assert found[:3] == pytest.approx([1.0, -1.0, 0.0], abs=1e-6)
    assert np.isnan(found[3:]).all()


def test_many_at_once_agree_with_one_by_one():
    rng = np.random.default_rng(61)
    pulls = queue(3000, 100, rng, missing=0.3)
    table = ready(pulls)
    rows = np.array([0, 5, 50, 999])
    together = alike_many(ready(pulls[rows]), table)
    for found, row in zip(together, rows, strict=True):
        one = cosines(pulls[row], table)
        assert np.array_equal(found, np.nan_to_num(one) >= 0.9)


def test_permutation_keeps_each_band():
    pulls = queue(500, 50, np.random.default_rng(62), missing=0.2)
    table = ready(pulls)
    dealt = shuffled(table, np.random.default_rng(63))
    assert np.array_equal(dealt.present, table.present)
    assert np.allclose(np.sort(dealt.value, axis=0), np.sort(table.value, axis=0))
    assert not np.allclose(dealt.value, table.value)


def test_a_shared_pattern_with_magnitude_points_to_calibration():
    rng = np.random.default_rng(64)
    pulls = queue(2000, 60, rng)
    magnitude = rng.uniform(8, 16, 2000)
    magnitude[:60] = rng.normal(9.0, 0.1, 60)
    place = sky_vectors(rng.uniform(0, 360, 2000), np.degrees(np.arcsin(rng.uniform(-1, 1, 2000))))
    found = look_alikes(3, ready(pulls), np.random.default_rng(1), {"magnitude": magnitude, "place": place})
    members = np.isin(found.rows, np.arange(60))
    # |pattern|^2 = 120 and noise of 8 bands: the cosine of two members is 120/128 = 0.94 on average, most reach 0.9
    assert members.sum() > 0.8 * 59 and members.mean() > 0.8
    assert 3 not in found.rows and np.all(np.diff(found.cosine) <= 0)
    assert found.p == 0.01 and found.expected < 15
    assert found.shared["magnitude"] == 0.01 and found.shared["place"] > 0.01
    assert found.points_to_calibration
    assert "They share magnitude too" in sentence(found)


def test_a_class_of_stars_does_not():
    rng = np.random.default_rng(65)
    pulls = queue(2000, 60, rng)
    found = look_alikes(3, ready(pulls), np.random.default_rng(1), {"magnitude": rng.uniform(8, 16, 2000)})
    assert found.p == 0.01 and not found.points_to_calibration
    assert "neither magnitude" in sentence(found)


def test_chance_is_called_chance():
    p = []
    for seed in range(40):
        pulls = np.random.default_rng(100 + seed).normal(size=(400, 8))
        p.append(look_alikes(0, ready(pulls), np.random.default_rng(seed), permutations=39).p)
    assert np.mean(np.array(p) <= 0.05) < 0.25  # nominal 0.05 and ties; 40 queues of noise


def test_nothing_alike():
    pulls = np.full((3, 8), np.nan)
    pulls[:, :3] = 1.0
    found = look_alikes(0, ready(pulls), np.random.default_rng(0), {"magnitude": np.ones(3)}, permutations=9)
    assert found.rows.size == 0 and sentence(found).startswith("No candidate")
    assert np.isnan(found.shared["magnitude"]) and not found.points_to_calibration


def test_place_has_no_seam():
    near = sky_vectors(np.array([359.9, 0.1]), np.array([10.0, 10.0]))
    assert np.linalg.norm(near[0] - near[1]) == pytest.approx(np.radians(0.2) * np.cos(np.radians(10)), rel=1e-3)


def test_patterns_of_the_queue_are_found_apart():
    rng = np.random.default_rng(66)
    pulls = rng.normal(size=(3000, 8))
    pulls[:200] += PATTERN
    pulls[200:350] += 1.5 * PATTERN[::-1] * np.array([1, -1, 1, -1, 1, 1, 1, 1])
    patterns = shared_patterns(ready(pulls), np.random.default_rng(7))
    assert len(patterns) >= 2
    first, second = patterns[:2]
    assert np.mean(np.isin(first.rows, np.arange(200))) > 0.8
    assert np.mean(np.isin(second.rows, np.arange(200, 350))) > 0.8
    assert not np.intersect1d(first.rows, second.rows).size
    assert all(pattern.p == 0.01 and pattern.rows.size > pattern.expected for pattern in patterns)


def test_noise_holds_no_pattern():
    pulls = np.random.default_rng(67).normal(size=(2000, 8))
    assert len(shared_patterns(ready(pulls), np.random.default_rng(8), tried=64)) <= 1  # 8 looks at p = 0.01


def test_pulls_table_from_fits():
    table = pulls_table([{"a": 1.0, "h": 2.0, "zz": 9.0}, {}], BANDS)
    assert table.shape == (2, 8) and table[0, 0] == 1.0 and table[0, 7] == 2.0 and np.isnan(table[1]).all()


def test_a_hundred_thousand_candidates():
    rng = np.random.default_rng(68)
    pulls = rng.normal(size=(100_000, 14))
    pulls[:500, 10:] += 1.5 * PATTERN[4:]  # cosine of two members: 270/284 = 0.95
    tracemalloc.start()
    started = time.process_time()
    found = look_alikes(3, ready(pulls), np.random.default_rng(9), {"magnitude": rng.uniform(8, 16, 100_000)})
    used = time.process_time() - started
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert found.rows.size > 400 and found.p == 0.01
    assert peak < 500e6
    assert used < 4.0  # processor seconds, of all threads; the wall clock is the benchmark's
