"""Numbers with units to Jy, against published values and astropy's own conversions."""

from __future__ import annotations

import math

import numpy as np
import pytest
from astropy import units as u

from tui.data.load import bands
from tui.errors import InputError
from tui.readers.units import MAG_PER_RATIO, SOFTENING, parse_unit, relative_error, scale

BANDS = bands()

# SDSS Early Data Release, Stoughton et al. 2002, AJ 123, 485, Table 21:
# band, b, magnitude of zero flux, magnitude at f/f0 = 10 b.
EDR_TABLE_21 = [
    ("u", 1.4e-10, 24.63, 22.12),
    ("g", 0.9e-10, 25.11, 22.60),
    ("r", 1.2e-10, 24.80, 22.29),
    ("i", 1.8e-10, 24.36, 21.85),
    ("z", 7.4e-10, 22.83, 20.32),
]


@pytest.mark.parametrize(
    ("letter", "b", "zero_flux_mag", "ten_b_mag"), EDR_TABLE_21, ids=[row[0] for row in EDR_TABLE_21]
)
def test_asinh_magnitudes_of_edr_table_21(letter, b, zero_flux_mag, ten_b_mag):
    band = BANDS[f"SDSS_{letter}"]
    asinh = scale("mag(asinh)", band, is_mag=True)
    assert SOFTENING[band.name] == b
    half_digit = 0.0051  # the print has two decimals
    flux = asinh.flux(np.array([zero_flux_mag, ten_b_mag])) / band.zero_point_jy
    slope = 2 * b / MAG_PER_RATIO  # d(f/f0)/dm at zero flux
    assert abs(flux[0]) < slope * half_digit
    assert flux[1] == pytest.approx(10 * b, rel=half_digit / MAG_PER_RATIO * 1.01)


def test_asinh_meets_pogson_when_bright_and_its_error_is_the_slope():
    band = BANDS["SDSS_r"]
    asinh, pogson = scale("mag(asinh)", band, is_mag=True), scale("mag", band, is_mag=True)
    mag = np.array([15.0, 22.0, 24.0, 25.5])
    assert asinh.flux(mag)[0] == pytest.approx(pogson.flux(mag)[0], rel=1e-6)
    assert asinh.flux(mag)[3] < 0
    step = 1e-5
    slope = (asinh.flux(mag - step) - asinh.flux(mag + step)) / (2 * step)
    assert asinh.flux_error(asinh.flux(mag), np.full(4, 0.1)) == pytest.approx(0.1 * slope, rel=1e-6)


@pytest.mark.parametrize(
    "unit",
    [
        "Jy",
        "mJy",
        "uJy",
        "W m-2 Hz-1",
        "erg/s/cm2/Hz",
        "W m-2 um-1",
        "erg s-1 cm-2 AA-1",
        "mW/m2/nm",
        "ph/s/cm2/AA",
        "W/m2",
    ],
)
def test_flux_densities_as_astropy_turns_them(unit):
    band = BANDS["W3"]
    expected = (2.5 * parse_unit(unit)).to_value(u.Jy, equivalencies=u.spectral_density(band.pivot_um * u.um))
    assert scale(unit, band, is_mag=False).flux(np.array([2.5]))[0] == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize("unit", ["mag(AB)", "ABmag", "AB"])
def test_ab_magnitudes_as_astropy_turns_them(unit):
    expected = (12.3 * u.ABmag).to_value(u.Jy)  # astropy keeps 3631 Jy only to -48.6 mag, a part in 10^4
    assert scale(unit, BANDS["J"], is_mag=True).flux(np.array([12.3]))[0] == pytest.approx(expected, rel=1e-4)


def test_magnitudes_are_in_the_band_s_own_system():
    # Cohen, Wheaton & Megeath 2003, AJ 126, 1090: J = 0 is 1594 Jy.
    for unit in ("", "mag", "mag(Vega)"):
        assert scale(unit, BANDS["J"], is_mag=True).flux(np.array([0.0]))[0] == pytest.approx(1594.0)
    assert scale("mmag", BANDS["J"], is_mag=True).flux(np.array([5000.0]))[0] == pytest.approx(15.94)


def test_a_magnitude_error_is_a_share_of_the_flux():
    mag = scale("mag", BANDS["J"], is_mag=True)
    assert mag.flux_error(np.array([2.0]), np.array([0.01]))[0] == pytest.approx(0.4 * math.log(10) * 0.01 * 2.0)


def test_nanomaggies():
    # 22.5 mag on the band's own system is one nanomaggy (SDSS DR8 and later).
    band = BANDS["SDSS_g"]
    one = scale("nanomaggies", band, is_mag=False).flux(np.array([1.0]))[0]
    assert one == pytest.approx(scale("mag", band, is_mag=True).flux(np.array([22.5]))[0])
    assert scale("nmgy(AB)", BANDS["W1"], is_mag=False).flux(np.array([1.0]))[0] == pytest.approx(3.631e-6)


@pytest.mark.parametrize(
    ("unit", "band", "is_mag", "word"),
    [
        ("", "W4", False, "no unit"),
        ("ergs", "J", False, "no unit that astropy knows"),
        ("K", "J", False, "neither"),
        ("mag(Vega)", "SDSS_g", True, "AB"),
        ("nmgy", "W1", False, "Vega or AB"),
        ("mag(asinh)", "J", True, "asinh"),
        ("Jy" * 100, "J", False, "characters"),
        ("dex(Jy)", "J", False, "neither"),
        ("Jy(((", "J", False, "astropy knows"),
    ],
)
def test_no_unit_is_guessed(unit, band, is_mag, word):
    with pytest.raises(InputError, match=word):
        scale(unit, BANDS[band], is_mag=is_mag)


@pytest.mark.parametrize(
    "unit", ["10^999999999 Jy", "Jy**999999999", "Jy99999999", "Jy**1e9", "(10**99)**99 Jy", "1/0", "("]
)
def test_units_that_would_never_end_or_are_none(unit):
    assert parse_unit(unit) is None


def test_percent_errors():
    assert relative_error("%") == relative_error(" percent") == 0.01
    assert relative_error("mag") is None
