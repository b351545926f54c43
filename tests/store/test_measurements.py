"""Versions, repeats, and one measurement under two labels."""

from __future__ import annotations

import math
from dataclasses import replace
from itertools import permutations

import pytest

from tui.errors import InputError
from tui.model import Measurement
from tui.store.measurements import Row, Series, from_row, measurement_values
from tui.store.measurements import measured as what_of


def measured(flux, source="2MASS", epoch="", **more):
    return Measurement("J", flux, 0.1, source=source, epoch=epoch, **more)


def row(second, measurement):
    return Row(f"2026-01-01T00:00:{second:02d}.000000Z", second, measurement_values(measurement)[3], measurement)


def fluxes(*rows):
    return sorted((r.measurement.source, r.measurement.flux_jy) for r in Series(rows).current())


def test_same_band_source_and_epoch_is_a_new_version():
    assert fluxes(row(1, measured(1.0)), row(2, measured(1.1))) == [("2MASS", 1.1)]


@pytest.mark.parametrize("other", [{"source": "UKIDSS"}, {"epoch": "2015.5"}])
def test_another_source_or_epoch_is_a_repeat(other):
    assert len(fluxes(row(1, measured(1.0)), row(2, measured(1.1, **other)))) == 2


def test_one_measurement_under_another_label_is_kept_once():
    assert fluxes(row(1, measured(1.0)), row(2, measured(1.0, source="AllWISE"))) == [("2MASS", 1.0)]


def test_a_later_correction_supersedes_what_another_label_repeated():
    rows = [row(1, measured(1.0)), row(2, measured(1.2)), row(3, measured(1.0, source="AllWISE"))]
    assert fluxes(*rows) == [("2MASS", 1.2)]


def test_units_do_not_make_another_measurement():
    mag = measured(1.0 + 1e-12, source="mags", value=10.0, unit="mag")
    assert fluxes(row(1, measured(1.0)), row(2, mag)) == [("2MASS", 1.0)]


def test_an_old_version_that_came_again_is_still_old():
    rows = [row(1, measured(1.0)), row(2, measured(1.2)), row(3, measured(1.0))]
    assert fluxes(*rows) == [("2MASS", 1.2)]


def test_the_order_of_arrival_does_not_matter():
    rows = [
        row(1, measured(1.0)),
        row(2, measured(1.2)),
        row(3, measured(1.0, source="A")),
        row(3, measured(1.5, source="A", epoch="2000")),
        row(4, measured(1.0)),
    ]
    assert len({tuple(fluxes(*order)) for order in permutations(rows)}) == 1


def test_a_limit_is_not_a_detection_of_the_same_flux():
    assert len(fluxes(row(1, measured(1.0)), row(2, measured(1.0, source="B", limit=True)))) == 2


def test_what_is_written_is_read():
    given = measured(1.5, flags={"ph_qual": "A"}, exclude=True, value=12.5, value_error=0.02, unit="mag", note="é")
    read = from_row(("utc", 7, *measurement_values(given)))
    assert read.measurement == given
    assert read.load_id == 7


def test_nan_is_kept_as_nothing():
    values = measurement_values(Measurement("W4", 0.2, math.nan, limit=True))
    assert math.isnan(from_row(("utc", 1, *values)).measurement.error_jy)


@pytest.mark.parametrize("flux", [math.nan, math.inf])
def test_a_flux_that_is_no_number_is_refused(flux):
    with pytest.raises(InputError, match="finite"):
        measurement_values(measured(flux))


def test_the_digest_covers_every_field():
    base = measured(1.0)
    variants = [
        measured(1.0, epoch="2000"),
        measured(1.0, nsigma=3.0),
        measured(1.0, flags={"cc_flags": "0000"}),
        measured(1.0, exclude=True),
        measured(1.0, note="x"),
        measured(1.0, unit="mJy"),
        measured(1.0, value=3.0),
    ]
    assert len({measurement_values(one)[3] for one in (base, *variants)}) == len(variants) + 1


# IEEE 754: -0.0 and 0.0 are equal, and JSON writes them as two texts.
@pytest.mark.parametrize("field", ["flux_jy", "value", "value_error", "error_jy"])
def test_a_zero_has_no_sign(field):
    plus, minus = (measured(1.0, value=9.1, value_error=0.1) for _ in range(2))
    plus, minus = replace(plus, **{field: 0.0}), replace(minus, **{field: -0.0})
    assert measurement_values(plus) == measurement_values(minus)
    assert math.copysign(1.0, from_row(("2026", 1, *measurement_values(minus))).measurement.flux_jy) == 1.0
    assert Series([row(1, plus)]).verdict(minus, measurement_values(minus)[3], what_of(minus)) == "same"
