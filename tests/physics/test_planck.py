"""Planck's law against its own constants, astropy and the laws of Wien and of Stefan and Boltzmann."""

from __future__ import annotations

import numpy as np
import pytest
from astropy import units
from astropy.modeling.physical_models import BlackBody
from scipy.optimize import minimize_scalar

from tui.physics.constants import AU, L_SUN, PARSEC, R_SUN, STEFAN_SIGMA, T_EQUILIBRIUM_1AU_K
from tui.physics.planck import ln_planck_jy, planck_jy, surface_flux

C_UM_HZ = 2.99792458e14  # speed of light, micron per second


@pytest.mark.parametrize("kelvin", [20.0, 100.0, 300.0, 1500.0, 5772.0, 30000.0, 1e5])
def test_against_astropy(kelvin):
    wave = np.geomspace(0.15, 300.0, 60)
    wave = wave[wave * kelvin > 25.0]  # shorter ones underflow in astropy
    outside = BlackBody(temperature=kelvin * units.K)(wave * units.micron).to_value("Jy / sr")
    assert planck_jy(wave, kelvin) == pytest.approx(outside, rel=1e-12)


def test_constants_of_the_sun():
    # IAU 2015 resolutions B2, B3 and IAU 2012 B2
    assert (L_SUN, R_SUN, AU) == (3.828e26, 6.957e8, 149597870700.0)
    assert PARSEC == pytest.approx(648000 / np.pi * AU, rel=1e-12)


def test_wien_displacement():
    # CODATA 2018: b = 2897.771955 micron K for B_lambda, b' = 5.878925757e10 Hz/K for B_nu
    def falling(power):
        def minus_ln(ln_wave):
            return -float(ln_planck_jy(np.exp(ln_wave), 1000.0)) - power * ln_wave

        return float(np.exp(minimize_scalar(minus_ln, bracket=(0.0, 1.0), tol=1e-12).x)) * 1000.0

    assert falling(-2.0) == pytest.approx(2897.771955, rel=1e-6)  # B_lambda = B_nu c / w^2
    assert falling(0.0) == pytest.approx(C_UM_HZ / 5.878925757e10, rel=1e-6)


@pytest.mark.parametrize("kelvin", [50.0, 300.0, 5772.0, 40000.0])
def test_stefan_boltzmann(kelvin):
    # CODATA 2018: sigma = 5.670374419e-8 W m-2 K-4
    ln_wave = np.linspace(np.log(0.15 * 2898 / kelvin), np.log(3e4 * 2898 / kelvin), 20001)
    nu = C_UM_HZ / np.exp(ln_wave)
    integral = np.trapezoid(np.pi * planck_jy(np.exp(ln_wave), kelvin) * 1e-26 * nu, ln_wave)
    assert integral == pytest.approx(5.670374419e-8 * kelvin**4, rel=1e-6)
    assert float(surface_flux(kelvin)) == pytest.approx(5.670374419e-8 * kelvin**4, rel=1e-9)


def test_the_sun_gives_its_luminosity_and_a_grain_its_temperature():
    # IAU 2015 B3: T_N = 5772 K is defined by L_N and R_N to 1 K. A grain takes pi a^2 and gives from 4 pi a^2.
    assert 4 * np.pi * R_SUN**2 * float(surface_flux(5772.0)) == pytest.approx(3.828e26, rel=1e-4)
    grain = (L_SUN / (16 * np.pi * STEFAN_SIGMA * AU**2)) ** 0.25
    assert grain == pytest.approx(T_EQUILIBRIUM_1AU_K, abs=0.005)


def test_far_in_the_wien_tail_the_logarithm_stays_finite():
    # h nu / k T = 14387.77 / 25 = 575.5, CODATA 2018: B_nu falls as exp(-x)
    found = ln_planck_jy([1.0, 2.0], [25.0, 25.0])
    assert np.all(np.isfinite(found))
    assert found[1] - found[0] == pytest.approx(14387.76877 / 25 / 2 - 3 * np.log(2), rel=1e-9)
    assert float(planck_jy(0.15, 20.0)) == 0.0
