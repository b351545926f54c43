"""The mean dwarf sequence against its own table, the Sun, real M dwarfs and the rule for gaps."""

from __future__ import annotations

import numpy as np
import pytest

from tui.data import load
from tui.physics.constants import L_SUN, PARSEC, R_SUN
from tui.physics.photometry import mag_from_flux, quadrature
from tui.physics.photosphere import interpolate_gaps, planck_photosphere, smoothed
from tui.physics.planck import planck_jy, surface_flux

TEN_PARSEC = 10 * PARSEC


def magnitudes(grids, teff_k, radius_m):
    """Absolute magnitudes by band at temperatures (N,), radii (N,): name -> (N,)."""
    ln_flux = grids.star.at(np.log(teff_k))[0] + 2 * np.log(radius_m / TEN_PARSEC)[:, None]
    return {
        band.name: mag_from_flux(np.exp(ln_flux[:, column]), band.zero_point_jy) for column,
        band in enumerate(grids.bands)
    }


def sequence_radius(grids, teff_k):
    ln_t = grids.star.low + grids.star.step * np.arange(grids.radius_m.size)
    return np.exp(np.interp(np.log(teff_k), ln_t, np.log(grids.radius_m)))


# Willmer 2018, ApJS 236, 47, Table 3: absolute magnitudes of the Sun (Vega; SDSS and PS1 AB), from memory. Tabulated
# dwarfs of 5770 K differ from the Sun by up to 0.03 mag, the published solar values among themselves by 0.03; PS1 r and
# i stand between tabulated bands.
THE_SUN = {
    "U": 5.61, "B": 5.44, "V": 4.81, "Rc": 4.43, "Ic": 4.10, "J": 3.67, "H": 3.32, "Ks": 3.27, "W1": 3.26, "W2": 3.28,
    "W3": 3.26, "W4": 3.27, "SDSS_u": 6.39, "SDSS_g": 5.11, "SDSS_r": 4.65, "SDSS_i": 4.53, "SDSS_z": 4.50,
    "Gaia_G": 4.67,
    "PS1_g": 5.03, "PS1_r": 4.64, "PS1_i": 4.52, "PS1_z": 4.51, "PS1_y": 4.50, "IRAC1": 3.26, "IRAC2": 3.28,
}  # fmt: skip


@pytest.mark.parametrize("name", THE_SUN)
def test_the_sun(grids, name):
    found = float(magnitudes(grids, np.array([5772.0]), np.array([R_SUN]))[name][0])
    assert found == pytest.approx(THE_SUN[name], rel=0, abs=0.06)


# Ramirez et al. 2012, ApJ 752, 5 (B-V, V-Rc, V-Ic) and Casagrande et al. 2012, ApJ 761, 16 (the rest): colours of solar
# twins. The mean sequence is not a solar twin: 0.04 mag.
@pytest.mark.parametrize(
    ("colour", "printed"),
    [("B-V", 0.653), ("V-Rc", 0.352), ("V-Ic", 0.702), ("V-J", 1.198), ("V-H", 1.484), ("V-Ks", 1.560), ("V-W1", 1.608),
     ("V-W2", 1.563), ("V-W3", 1.552), ("V-W4", 1.604)],
)  # fmt: skip
def test_colours_of_solar_twins(grids, colour, printed):
    found = magnitudes(grids, np.array([5772.0]), np.array([R_SUN]))
    left, right = colour.split("-")
    assert float(found[left][0] - found[right][0]) == pytest.approx(printed, rel=0, abs=0.04)


# Rows are smoothed by design: the table's temperatures are rounded and scatter by 1 to 2 % about any smooth relation,
# and the wiggles they make would give chi-square several minima. So a row is met to the size of that scatter: colours
# with Ks in the median to 0.02 mag (0.06 mag SDSS z, which the table takes through two transformations), 9 of 10 to
# 0.13 mag, which 2 % in T_eff is for a blue colour; the infrared, where colours change little, to 0.02 mag.
@pytest.mark.parametrize("name", [n for n in load.dwarfs().absolute_mag if n in load.bands()])
def test_the_table_is_met(grids, name):
    table = load.dwarfs()
    found = magnitudes(grids, table.teff_k, np.full(table.teff_k.shape, R_SUN))
    off = np.abs((found[name] - found["Ks"]) - (table.absolute_mag[name] - table.absolute_mag["Ks"]))
    off = off[np.isfinite(off)]
    infrared = name in ("H", "Ks", "W1", "W2", "W3", "W4")
    assert np.median(off) < (0.003 if infrared else 0.06 if name == "SDSS_z" else 0.03)
    assert np.quantile(off, 0.9) < (0.02 if infrared else 0.13)


def test_absolute_magnitudes_and_radii_are_the_tables(grids):
    # radius from L = 4 pi R^2 sigma T^4 of the same row, not the table's own R column, which is off by up to 6.6 %
    table = load.dwarfs()
    found = sequence_radius(grids, table.teff_k)
    exact = np.sqrt(L_SUN * 10**table.logl / (4 * np.pi * surface_flux(table.teff_k)))
    assert np.median(np.abs(found / exact - 1)) < 0.025
    assert np.abs(found / exact - 1).max() < 0.07
    absolute = magnitudes(grids, table.teff_k, found)
    off = np.abs(absolute["Ks"] - table.absolute_mag["Ks"])
    assert np.median(off) < 0.05 and off.max() < 0.16


def test_luminosity_is_kept(grids):
    # The sequence's light summed over B to W4 by trapezoids in ln nu, with Planck tails, is sigma T^4: a solid check
    # that zero points, bands and radii are one system. The gaps between bands are coarse and U stands for the whole
    # Balmer jump: 8 % to 9000 K.
    names = [n for n in ("U", "B", "V", "Rc", "Ic", "J", "H", "Ks", "W1", "W2", "W3") if n in grids.names]
    local = grids.take(names)
    fine = np.geomspace(0.1, 100, 4001)
    for kelvin in (4800.0, 5772.0, 7000.0, 9000.0):
        ratio = local.star.at(np.log([kelvin]))[0][0] - np.log(
            [np.pi * np.sum(q.weight * planck_jy(q.wave_um, kelvin)) for q in map(quadrature, local.bands)]
        )
        smooth = np.exp(np.interp(np.log(fine), np.log(local.pivot_um), ratio))
        spectrum = np.pi * planck_jy(fine, kelvin) * smooth
        total = np.trapezoid(spectrum * 1e-26 * 2.99792458e14 / fine, np.log(fine))
        assert total == pytest.approx(float(surface_flux(kelvin)), rel=0.08)


# CARMENES input catalogue (Gaia DR3, 2MASS, AllWISE): M2 to M5.5 dwarfs in the gap of the W2, W3, W4 columns, each at
# the temperature that its own G-Ks has on the sequence. W2 only where fainter than its saturation, 6.7 mag (brighter
# ones read too bright): 0.03 mag in the median. Interpolated magnitudes would miss by 0.25 to 0.5 mag. W3 and W4,
# carried from 4440 K on, come to within 0.16 mag (0.10 and 0.17 found).
def test_gap_rule_against_real_m_dwarfs(grids, real_stars):
    teff = np.geomspace(2700.0, 4500.0, 600)
    sequence = magnitudes(grids, teff, np.full(teff.shape, R_SUN))
    offsets = {"W2": [], "W3": [], "W4": []}
    for star in real_stars:
        mags = star.magnitudes
        if star.group != "b" or not {"Gaia_G", "Ks", *offsets} <= mags.keys() or mags["W2"] < 6.7:
            continue
        place = np.argmin(np.abs(sequence["Gaia_G"] - sequence["Ks"] - (mags["Gaia_G"] - mags["Ks"])))
        for name, values in offsets.items():
            values.append(mags["Ks"] - mags[name] - (sequence["Ks"] - sequence[name])[place])
    assert [len(values) for values in offsets.values()] == [3, 3, 3]
    assert abs(np.median(offsets["W2"])) < 0.04
    assert abs(np.median(offsets["W3"])) < 0.16
    assert abs(np.median(offsets["W4"])) < 0.16 + 0.09  # catalogue W4 runs 9 % above simple models of ordinary stars


def test_nothing_is_said_in_the_ultraviolet(grids):
    assert set(grids.silent) == {"GALEX_FUV", "GALEX_NUV"}


def test_a_gap_is_bridged_without_overshoot_and_ends_are_carried():
    x = np.linspace(0.0, 1.0, 11)
    y = np.where((x > 0.25) & (x < 0.75), np.nan, np.where(x < 0.5, 0.0, 1.0))
    y[-2:] = np.nan
    at = np.linspace(-0.5, 1.5, 401)
    found = interpolate_gaps(x, y, at)
    assert found.min() > -1e-9 and found.max() < 1 + 1e-9
    assert np.all(np.diff(found) > -1e-9)
    assert found[0] == pytest.approx(0.0, abs=1e-9) and found[-1] == pytest.approx(1.0, abs=1e-9)


def test_smoothing_keeps_parabolas_and_gaps():
    # local quadratic regression (Cleveland 1979) returns any parabola
    rng = np.random.default_rng(5)
    x = np.sort(rng.uniform(0, 3, 40))
    y = 2 - x + 0.7 * x**2
    y[7] = np.nan
    found = smoothed(x, y)
    assert np.isnan(found[7])
    assert np.delete(found, 7) == pytest.approx(np.delete(y, 7), abs=1e-9)
    noisy = smoothed(x, y + rng.normal(0, 0.1, 40))
    assert np.nanstd(noisy - y) < 0.07  # 15 nodes, tricube: the noise falls to about half


def test_planck_as_a_star_is_planck():
    bands = [load.bands()[name] for name in ("B", "Ks", "W3")]
    found = planck_photosphere(np.array([3000.0, 9000.0]), [quadrature(band) for band in bands])
    for column, band in enumerate(bands):
        wave = np.linspace(band.wave_um[0], band.wave_um[-1], 6001)
        weight = np.interp(wave, band.wave_um, band.response) / wave
        for row, kelvin in enumerate((3000.0, 9000.0)):
            exact = np.pi * np.trapezoid(weight * planck_jy(wave, kelvin), wave) / np.trapezoid(weight, wave)
            assert np.exp(found.ln_flux[row, column]) == pytest.approx(exact, rel=3e-4)
    assert np.isnan(found.radius_m).all()
