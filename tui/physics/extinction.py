"""Interstellar extinction laws, A(wavelength)/A(V), and their band averages."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache

import numpy as np

from tui.errors import InputError
from tui.model import FloatArray

LAWS = ("g23", "f99", "ccm89", "wc19")
R_V_RANGE = (2.3, 5.6)  # Gordon et al. 2023
G23_RANGE_UM = (0.0912, 32.0)  # Gordon et al. 2023; zero beyond, as nothing is measured
JOIN_UM = (3.0, 5.0)  # other laws meet G23 scaled at the first and fade into G23 by the second
WC19_OPTICAL = (1.0, 0.7499, -0.1086, -0.08909, 0.02905, 0.01069, 0.001707, -0.001002)  # Wang & Chen 2019, eq. 9
WC19_INFRARED = (0.3722, -2.07)  # Wang & Chen 2019, eq. 10: 0.3722 w^-2.07, 1.0 to 3.33 micron
WC19_SHORT_UM = 0.3


@cache
def _model(law: str, r_v: float):  # noqa: ANN202 - a dust_extinction model
    from dust_extinction.parameter_averages import CCM89, F99, G23

    return {"g23": G23, "f99": F99, "ccm89": CCM89}[law](Rv=r_v)


def _g23(wave_um: FloatArray, r_v: float) -> FloatArray:
    inside = (wave_um > G23_RANGE_UM[0]) & (wave_um < G23_RANGE_UM[1])
    curve = np.zeros_like(wave_um)
    curve[inside] = _model("g23", r_v).evaluate(1.0 / wave_um[inside], r_v)
    return curve


def _wc19(wave_um: FloatArray) -> FloatArray:
    y = 1.0 / wave_um - 1.82
    optical = np.polynomial.polynomial.polyval(y, WC19_OPTICAL)
    infrared = WC19_INFRARED[0] * wave_um ** WC19_INFRARED[1]
    return np.where(wave_um < 1.0, optical, infrared)


def _law_itself(law: str, wave_um: FloatArray, r_v: float) -> FloatArray:
    if law == "wc19":
        return _wc19(wave_um)
    x = np.clip(1.0 / wave_um, 0.3001, 9.99)
    if law == "ccm89":
        return _model(law, r_v).evaluate(x, r_v)
    return _model(law, r_v)(x / _micron())


@cache
def _micron():  # noqa: ANN202
    from astropy import units

    return units.micron


def extinction_curve(wave_um: FloatArray, law: str = "g23", r_v: float = 3.1) -> FloatArray:
    """A(wavelength)/A(V), shape of `wave_um` (micron).

    `g23` is Gordon et al. 2023 (ApJ 950, 86), zero beyond 32 micron. `f99` (Fitzpatrick 1999, PASP 111, 63),
    `ccm89` (Cardelli, Clayton & Mathis 1989, ApJ 345, 245) and `wc19` (Wang & Chen 2019, ApJ 877, 116; R_V 3.1
    only) hold to 3 micron; from there G23 scaled to meet them, fading to G23 itself by 5 micron. Shortward of
    0.3 micron wc19 is G23 scaled to meet it.

    Raises:
        InputError: an unknown law, or R_V outside 2.3 to 5.6.
    """
    if law not in LAWS:
        raise InputError(f"There is no extinction law {law!r}; choose one of {', '.join(LAWS)}.")
    if not R_V_RANGE[0] <= r_v <= R_V_RANGE[1]:
        raise InputError(f"R_V {r_v} lies outside {R_V_RANGE[0]} to {R_V_RANGE[1]}.")
    wave = np.atleast_1d(np.asarray(wave_um, dtype=np.float64))
    g23 = _g23(wave, r_v)
    if law == "g23":
        return g23.reshape(np.shape(wave_um))
    curve = _law_itself(law, wave, r_v)
    join = np.array([JOIN_UM[0]])
    meet = float(_law_itself(law, join, r_v)[0] / _g23(join, r_v)[0])
    fade = np.clip((wave - JOIN_UM[0]) / (JOIN_UM[1] - JOIN_UM[0]), 0.0, 1.0)
    curve = np.where(wave > JOIN_UM[0], g23 * (meet + (1.0 - meet) * fade), curve)
    if law == "wc19":
        short = np.array([WC19_SHORT_UM])
        curve = np.where(wave < WC19_SHORT_UM, g23 * (_wc19(short) / _g23(short, r_v)), curve)
    return curve.reshape(np.shape(wave_um))


class BandCurves:
    """One law at the wavelengths of many bands, evaluated for all bands at once: a call costs more than a band."""

    def __init__(self, waves_um: Sequence[FloatArray], law: str) -> None:
        self.waves_um, self.law = tuple(waves_um), law
        self._place = {id(wave): number for number, wave in enumerate(self.waves_um)}
        self._curves: dict[float, list[FloatArray]] = {}

    def __call__(self, wave_um: FloatArray, r_v: float) -> FloatArray:
        """A(wavelength)/A(V) at one of the arrays of wavelengths that this was made with."""
        if r_v not in self._curves:
            ends = np.cumsum([wave.size for wave in self.waves_um])[:-1]
            self._curves[r_v] = np.split(extinction_curve(np.concatenate(self.waves_um), self.law, r_v), ends)
        return self._curves[r_v][self._place[id(wave_um)]]
