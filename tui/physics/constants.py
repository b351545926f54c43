"""Physical constants: CODATA 2018 and IAU 2015 nominal values, from astropy.constants."""

from __future__ import annotations

from astropy import constants as _c

PLANCK_H = float(_c.h.si.value)  # J s
LIGHT_C = float(_c.c.si.value)  # m s-1
BOLTZMANN_K = float(_c.k_B.si.value)  # J K-1
STEFAN_SIGMA = float(_c.sigma_sb.si.value)  # W m-2 K-4
L_SUN = float(_c.L_sun.si.value)  # W, IAU 2015 nominal
R_SUN = float(_c.R_sun.si.value)  # m, IAU 2015 nominal
AU = float(_c.au.si.value)  # m
PARSEC = float(_c.pc.si.value)  # m
JY = 1e-26  # W m-2 Hz-1
MICRON = 1e-6  # m
C2_UM_K = PLANCK_H * LIGHT_C / BOLTZMANN_K / MICRON  # second radiation constant, micron K
MAG = 0.4 * 2.302585092994046  # magnitudes to natural logarithm of flux: 0.4 ln 10
T_EQUILIBRIUM_1AU_K = 278.33  # black grain at 1 au from 1 L_sun; Backman & Paresce 1993, from the constants above
