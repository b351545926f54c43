"""Leaks, chance alignment, matches and the steady-state ceiling against simulation and published statements."""

from __future__ import annotations

import numpy as np
import pytest
from astropy import units
from astropy.coordinates import SkyCoord

from tui.data.load_flags import galaxy_count_rows
from tui.physics.context import (
    chance_alignment,
    density_at,
    leak_fraction,
    match_probability,
    offset_arcsec,
    propagate,
    shell_dimming,
    steady_state_ceiling,
)
from tui.physics.sky_counts import galaxies_per_deg2, galaxy_anchors, stars_per_deg2


@pytest.mark.parametrize("separation", [0.0, 2.0, 4.0, 6.1, 9.0])
def test_leak_is_what_a_profile_fit_takes(separation):
    # Least-squares amplitude of one Gaussian beam, FWHM 6.1 arcsec, fitted on a fine image to one of flux 1 beside it.
    fwhm = 6.1
    x, y = np.meshgrid(np.arange(-30, 30.01, 0.25), np.arange(-30, 30.01, 0.25))
    beam = np.exp(-4 * np.log(2) * (x**2 + y**2) / fwhm**2)
    other = np.exp(-4 * np.log(2) * ((x - separation) ** 2 + y**2) / fwhm**2)
    assert leak_fraction(separation, fwhm) == pytest.approx(np.sum(beam * other) / np.sum(beam**2), rel=1e-6)


def test_chance_alignment_against_thrown_stars():
    # 4000 fields of 1 square arcmin with Poisson numbers of stars thrown at random
    rng = np.random.default_rng(11)
    density, radius, side = 30.0 / 3600.0, 3.0, 60.0
    hits = 0
    for count in rng.poisson(density * side**2, size=4000):
        x, y = rng.uniform(-side / 2, side / 2, size=(2, count))
        hits += bool(np.any(np.hypot(x, y) < radius))
    p = float(chance_alignment(radius, density))
    assert abs(hits - 4000 * p) < 3.5 * np.sqrt(4000 * p * (1 - p))


def test_chance_alignment_small_numbers():
    assert chance_alignment(1e-6, 1e-6) == pytest.approx(np.pi * 1e-18, rel=1e-9)
    assert chance_alignment(6.1, 1e5 / 3600**2) == pytest.approx(0.594241, abs=5e-7)  # 1 - exp(-0.901996)


def test_match_probability_against_scattered_positions():
    rng = np.random.default_rng(12)
    east, north = rng.normal(scale=0.2, size=(2, 20000))
    p = match_probability(east, north, 0.2)
    for level in (0.01, 0.1, 0.5):  # p of right matches is uniform
        assert abs(np.mean(p < level) - level) < 4 * np.sqrt(level * (1 - level) / 20000)


def test_offset_and_motion_against_astropy():
    star = SkyCoord(359.9999 * units.deg, 61.0 * units.deg)
    other = star.spherical_offsets_by(4.0 * units.arcsec, -3.0 * units.arcsec)
    east, north = offset_arcsec(star.ra.deg, star.dec.deg, other.ra.deg, other.dec.deg)
    assert (east, north) == (pytest.approx(4.0, abs=1e-3), pytest.approx(-3.0, abs=1e-3))
    # Barnard's star (Gaia DR3): 10.39 arcsec a year, mostly north; 2MASS saw it some 16 years before Gaia's epoch
    east, north = propagate(-801.551, 10362.394, 2016.0, 2000.0)
    assert (east, north) == (pytest.approx(12.8248, abs=1e-4), pytest.approx(-165.7983, abs=1e-4))


def test_density_slope():
    assert density_at(1e-4, 12.0, 15.0, 0.6) == pytest.approx(1e-4 * 10**1.8)


def test_steady_state_ceiling():
    # Wyatt et al. 2007, abstract: f_max = 0.16e-3 r^(7/3) / t for Sun-like stars; HD 69830 (1 au, 2 Gyr, f = 2e-4)
    # exceeds it by far more than 1000, and eta Corvi's ring at 1.7 au, 1 Gyr, f = 3e-4 does too.
    assert steady_state_ceiling(1.0, 1.0) == pytest.approx(0.16e-3)
    assert steady_state_ceiling(1.0, 2000.0) == pytest.approx(8e-8)
    assert 2e-4 / steady_state_ceiling(1.0, 2000.0, 0.86, 0.6) > 1000
    assert steady_state_ceiling(8.0, 1.0) / steady_state_ceiling(1.0, 1.0) == pytest.approx(128.0)
    assert steady_state_ceiling(1.0, 1.0, 64.0, 1.0) == pytest.approx(0.16e-3 / 32.0)


def test_shell_dimming():
    assert shell_dimming(0.0) == 0.0
    assert shell_dimming(1.0) == pytest.approx(0.7526, abs=5e-5)  # half the light taken


def test_star_counts_against_the_bright_sky():
    # Hipparcos and Yale stars to V = 9 hold 1.46 per square degree at the pole and 1.87 at 30 degrees; the formula is
    # a model of a smooth Galaxy and is asked to be within a factor of 2.
    assert 0.5 < stars_per_deg2(9.0, 90.0, 90.0) / 1.46 < 2.0
    assert 0.5 < stars_per_deg2(9.0, 90.0, 30.0) / 1.87 < 2.0
    assert stars_per_deg2(15.0, 90.0, 2.0) == stars_per_deg2(15.0, 90.0, 20.0)  # no farther than it holds


def test_galaxy_counts_away_from_the_anchors():
    anchors = {anchor.band: anchor for anchor in galaxy_anchors(galaxy_count_rows())}
    # Spitzer at 24 micron: some 400 sources per square degree above 1 mJy (Shupe et al. 2008, AJ 135, 1050); Ks = 20
    # holds 1e4 to 4e4 galaxies per square degree in deep fields. The counts are asked to be within a factor of 3.
    mag = -2.5 * np.log10(1e-3 / 7.17)
    assert 1 / 3 < galaxies_per_deg2(mag, anchors["MIPS24"]) / 400.0 < 3
    assert 1e4 / 3 < galaxies_per_deg2(20.0, anchors["Ks"]) < 4e4 * 3
    assert galaxies_per_deg2(11.75, anchors["Ks"]) == pytest.approx(1.16)
