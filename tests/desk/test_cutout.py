"""Pictures as cells: stretches, sizes, damaged images."""

from __future__ import annotations

import numpy as np
import pytest

from tui.desk.widgets.cutout import HALF_BLOCK, STRETCHES, cutout_rows, picture_rows, resampled, stretched
from tui.desk.widgets.rows import row_text, row_width
from tui.model import Band
from tui.workflow.records import Cutout

Y, X = np.indices((41, 41))
STAR = 100 * np.exp(-((X - 20) ** 2 + (Y - 20) ** 2) / 18) + np.random.default_rng(1).normal(0, 1, (41, 41))
BAND = Band("W3", 12.0, "Vega", 1.0, 0.02, "WISE", np.array([12.0]), np.array([1.0]), beam_fwhm_arcsec=6.5)


def test_stretches_keep_order_and_range_and_lift_the_faint():
    faint, middle, bright = (stretched(STAR, one) for one in STRETCHES)
    for levels in (faint, middle, bright):
        assert levels.min() >= 0 and levels.max() <= 1
        assert np.unravel_index(levels.argmax(), levels.shape) in {(20, 20)} or levels[20, 20] == 1
    ring = (slice(12, 13), slice(20, 21))
    assert faint[ring] > middle[ring] > bright[ring]


def test_picture_keeps_its_shape_and_its_first_line_lies_lowest():
    image = np.zeros((20, 20))
    image[0, :] = 1.0
    rows = picture_rows(20, 10, Cutout("J", image, 1.0), None, STRETCHES[2])
    assert len(rows) == 11 and all(row_width(line) == 20 for line in rows)
    assert rows[-1][0].style.endswith("on #ffffff") and rows[1][0].style == "#000000 on #000000"


def test_shrinking_takes_means():
    # outside check: the mean of each 2 x 2 block, by hand
    assert resampled(np.array([[0.0, 1.0], [1.0, 2.0]]), 1, 1).tolist() == [[1.0]]
    assert resampled(np.arange(16.0).reshape(4, 4), 2, 2)[::-1].tolist() == [[2.5, 4.5], [10.5, 12.5]]


@pytest.mark.parametrize(
    "image",
    [
        np.full((5, 5), np.nan),
        np.zeros((0, 0)),
        np.zeros((3, 3)),
        np.full((4, 4), np.inf),
        np.zeros((2, 2, 2)),
        np.ones((1, 400)),
        np.array([[np.nan, 1.0], [np.inf, -np.inf]]),
    ],
    ids=["nan", "empty", "flat", "infinite", "cube", "line", "mixed"],
)
def test_damaged_pictures_cost_a_plain_line_at_most(image):
    for unicode in (True, False):
        rows = picture_rows(30, 12, Cutout("J[/]\x1b", image, float("nan")), BAND, STRETCHES[0], unicode)
        assert 1 <= len(rows) <= 14
        assert all(row_width(line) <= 30 and row_text(line).isprintable() for line in rows)


def test_beam_is_a_ring_and_plain_terminals_get_letters():
    rows = picture_rows(40, 20, Cutout("W3", STAR, 0.5), BAND, STRETCHES[1])
    assert any("#f2cf63" in span.style for line in rows for span in line)
    assert 'W3 middle 20" wide beam 6.5"' in row_text(rows[0])
    plain = picture_rows(40, 20, Cutout("W3", STAR, 0.5), BAND, STRETCHES[1], unicode=False)
    assert all(row_text(line).isascii() for line in plain) and "@" in row_text(plain[11])


def test_pictures_stand_side_by_side_and_swap():
    pictures = [Cutout(band, STAR, 1.0) for band in ("J", "H", "Ks")]
    rows = cutout_rows(78, 16, pictures, {}, 1, 0, True)
    assert row_text(rows[0]).split()[0] == "J" and "Ks" in row_text(rows[0])
    assert row_text(cutout_rows(30, 16, pictures, {}, 1, 1, True)[0]).startswith("H")
    assert all(row_width(line) <= 78 for line in rows) and HALF_BLOCK in row_text(rows[3])
    assert cutout_rows(78, 16, [], {}, 1, 0, True) == []
