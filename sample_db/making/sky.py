"""The light of an invented star, before any catalogue sees it.

Only the photosphere is read off the program's own tables, band by band. Dust, companions, screens and extinction
are laid on as spectra and averaged over each band here, so that the program's fits are tried on fluxes that its
own composite models did not make.
"""

from __future__ import annotations

from functools import cached_property

import numpy as np
from dust_extinction.parameter_averages import G23
from making.star import Companion, Compact, Dust, Nucleus, Screen, Star
from scipy.special import expit

from tui.model import Band, FloatArray
from tui.physics.constants import PARSEC, R_SUN
from tui.physics.photometry import quadrature
from tui.physics.planck import planck_jy
from tui.physics.templates import Templates

KNOTS = ("U", "B", "V", "Rc", "Ic", "J", "H", "Ks", "W1", "W2", "W3", "W4")


class Sky:
    """Fluxes of stars in the bands of some template grids."""

    def __init__(self, templates: Templates) -> None:
        self.templates = templates
        self.bands = {band.name: band for band in templates.bands}
        self.rules = {band.name: quadrature(band) for band in templates.bands}
        self.bends: dict[float, FloatArray] = {}  # T_eff -> ln of photosphere over Planck at the knots
        self.column = {name: place for place, name in enumerate(templates.names)}

    @cached_property
    def grid_ln_t(self) -> FloatArray:
        """ln T of the photosphere's rows."""
        star = self.templates.star
        return star.low + star.step * np.arange(star.ln_flux.shape[0])

    def surface(self, band: str, teff_k: float) -> float:
        """Photosphere flux in a band at an angular radius of 1 radian, Jy; Planck's where the sequence is silent."""
        if band in self.templates.silent:
            rule = self.rules[band]
            return float(np.pi * planck_jy(rule.wave_um, 0.8 * teff_k) @ rule.weight)
        return float(np.exp(self.templates.star.at(np.array([np.log(teff_k)]))[0][0, self.column[band]]))

    def spectrum_of(self, teff_k: float, wave_um: FloatArray) -> FloatArray:
        """A smooth photosphere spectrum: Planck bent to pass through the band fluxes, Jy at 1 radian."""
        pivots = np.array([self.bands[name].pivot_um for name in KNOTS])
        bend = self.bends.get(teff_k)
        if bend is None:
            planck = [np.pi * (planck_jy(self.rules[name].wave_um, teff_k) @ self.rules[name].weight) for name in KNOTS]
            bend = np.log([self.surface(name, teff_k) / flat for name, flat in zip(KNOTS, planck, strict=True)])
            self.bends[teff_k] = bend
        return np.pi * planck_jy(wave_um, teff_k) * np.exp(np.interp(np.log(wave_um), np.log(pivots), bend))

    def radius_m(self, teff_k: float) -> float:
        """Radius of a dwarf, m."""
        return float(np.exp(np.interp(np.log(teff_k), self.grid_ln_t, np.log(self.templates.radius_m))))

    def theta2(self, star: Star) -> float:
        """Squared angular radius of the star, from its Ks magnitude without companions and extinction."""
        return self.bands["Ks"].zero_point_jy * 10 ** (-0.4 * star.ks_mag) / self.surface("Ks", star.teff_k)

    def distance_pc(self, star: Star) -> float:
        """Distance that gives the star this angular radius, parsec."""
        return star.radius * self.radius_m(star.teff_k) / np.sqrt(self.theta2(star)) / PARSEC

    def star_flux(self, star: Star, band: str, teff_k: float, theta2: float) -> float:
        """Flux of one photosphere behind the star's screens, Jy."""
        rule = self.rules[band]
        bare = self.spectrum_of(teff_k, rule.wave_um) * rule.weight
        return (
            theta2 * self.surface(band, teff_k) * float(np.sum(bare * self.passes(star, rule.wave_um)) / np.sum(bare))
        )

    def passes(self, star: Star, wave_um: FloatArray) -> FloatArray:
        """Share of the light that extinction and the screen let through."""
        share = 10 ** (-0.4 * star.av_mag * extinction(wave_um, star.r_v))
        return share * screen(star.screen, wave_um)

    def extra(self, star: Star, wave_um: FloatArray) -> FloatArray:
        """Flux density of dust, white dwarf and galaxy, Jy; companions that are dwarfs are left to `flux`."""
        total, theta2 = np.zeros_like(wave_um), self.theta2(star)
        for part in star.parts:
            if isinstance(part, Dust):
                luminosity = part.fraction * (star.teff_k / part.kelvin) ** 4
                total += theta2 * luminosity * np.pi * planck_jy(wave_um, part.kelvin)
            elif isinstance(part, Compact):
                theta = part.radius_sun * R_SUN / (self.distance_pc(star) * PARSEC)
                total += theta**2 * np.pi * planck_jy(wave_um, part.kelvin)
            elif isinstance(part, Nucleus):
                at_34 = theta2 * self.spectrum_of(star.teff_k, np.array([3.4]))[0] * part.ratio
                total += at_34 * (wave_um / 3.4) ** part.slope / (1 + (0.9 / wave_um) ** 4)
        return total * self.passes(star, wave_um)

    def flux(self, star: Star, band: str) -> float:
        """All the light in a band, Jy."""
        rule, theta2 = self.rules[band], self.theta2(star)
        total = self.star_flux(star, band, star.teff_k, theta2) + float(self.extra(star, rule.wave_um) @ rule.weight)
        for part in star.parts:
            if isinstance(part, Companion):
                theta = self.radius_m(part.kelvin) / (self.distance_pc(star) * PARSEC)
                total += self.star_flux(star, band, part.kelvin, theta**2)
        return total

    def spectrum(self, star: Star, wave_um: FloatArray) -> FloatArray:
        """The spectrum at some wavelengths, Jy."""
        own = self.theta2(star) * self.spectrum_of(star.teff_k, wave_um) * self.passes(star, wave_um)
        return own + self.extra(star, wave_um)


def extinction(wave_um: FloatArray, r_v: float) -> FloatArray:
    """A/A(V) of Gordon et al. 2023; zero beyond 32 micron."""
    inside = (wave_um > 0.0912) & (wave_um < 32.0)
    curve = np.zeros_like(wave_um)
    curve[inside] = G23(Rv=r_v).evaluate(1.0 / wave_um[inside], r_v)
    return curve


def screen(one: Screen | None, wave_um: FloatArray) -> FloatArray:
    """Share of the light that a screen lets through; its edges are soft over 1 % of the wavelength."""
    if one is None:
        return np.ones_like(wave_um)
    rise = expit((wave_um - one.low_um) / (0.01 * max(one.low_um, 0.01)))
    fall = expit((one.high_um - wave_um) / (0.01 * one.high_um))
    inside = rise * fall
    return 1 - one.depth * (inside if one.notch else 1 - inside)


def magnitude(flux_jy: float, band: Band) -> float:
    """Magnitude in the band's own system."""
    return float(-2.5 * np.log10(flux_jy / band.zero_point_jy))
