"""Random natural mixtures, drawn off every grid of the bound and seen with real floors, spreads and limits."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tui.checks import mixture
from tui.model import Candidate, Measurement, Settings
from tui.physics import natural_sources as cone_sources
from tui.physics.constants import MAG
from tui.physics.extinction import extinction_curve
from tui.physics.photometry import quadrature
from tui.physics.planck import planck_jy

S1 = ("Gaia_BP", "Gaia_G", "Gaia_RP", "J", "H", "Ks", "W1", "W2", "W3", "W4")
UGRIZ = ("SDSS_u", "SDSS_g", "SDSS_r", "SDSS_i", "SDSS_z")
S2 = (*S1, *UGRIZ)
FOURTEEN = (*S1, *UGRIZ[:4])


def in_order(templates, names):
    """The names by wavelength."""
    return tuple(name for name in templates.names if name in names)


@dataclass
class Sky:
    """Exact band fluxes of single sources behind single screens."""

    templates: object
    names: tuple[str, ...]

    def __post_init__(self):
        self.local = self.templates.take(self.names)
        rules = [quadrature(band, 120) for band in self.local.bands]
        self.wave = np.concatenate([rule.wave_um for rule in rules])
        self.weight = np.concatenate([rule.weight for rule in rules])
        self.starts = np.cumsum([0, *(rule.wave_um.size for rule in rules)])[:-1]
        ends = [extinction_curve(self.wave, self.templates.law, r_v) for r_v in (2.5, 5.0)]
        self.slope = (ends[0] - ends[1]) / (1 / 2.5 - 1 / 5.0)  # G23 is linear in 1/R_V (Gordon et al. 2023, eq. 1)
        self.at_five = ends[1]

    def seen(self, spectrum, av=0.0, r_v=3.1):
        """Band fluxes of a function of wavelength behind a screen."""
        curve = self.at_five + self.slope * (1 / r_v - 1 / 5.0)
        return np.add.reduceat(self.weight * spectrum(self.wave) * np.exp(-MAG * av * curve), self.starts)

    def star(self, teff_k, av=0.0, r_v=3.1):
        """A template at any temperature, dimmed as a Planck source of that temperature is."""
        bare = np.exp(self.local.star.at(np.array([np.log(teff_k)]))[0][0])

        def shape(wave):
            return planck_jy(wave, teff_k)

        return bare * self.seen(shape, av, r_v) / self.seen(shape)

    def spread(self, teff_k):
        """Fractional spread of real stars at a temperature."""
        star = self.local.star
        return self.local.spread[int(np.rint((np.log(teff_k) - star.low) / star.step))]


def random_screen(rng):
    """No dust for two in five, else an exponential A_V and any R_V."""
    if rng.random() < 0.4:
        return 0.0, 3.1
    return min(rng.exponential(2.0), 20.0), 1.0 / rng.uniform(1 / 5.6, 1 / 2.3)


def random_source(rng, sky, kind):
    """Band fluxes and the spread of their starlight (Jy) of one source; the brightest band is 1."""
    av, r_v = random_screen(rng)
    if kind == "star":
        teff = float(np.exp(rng.uniform(np.log(2500.0), np.log(30000.0))))
        flux = sky.star(teff, av, r_v)
        return flux / flux.max(), flux / flux.max() * sky.spread(teff)
    if kind == "planck":
        temperature = np.exp(rng.uniform(np.log(30.0), np.log(1e5)))
        flux = sky.seen(lambda wave: planck_jy(wave, temperature), av, r_v)
    elif kind == "grains":
        t, beta = np.exp(rng.uniform(np.log(40.0), np.log(1800.0))), rng.uniform(0.5, 2.0)
        edge = np.exp(rng.uniform(0, np.log(300.0)))
        flux = sky.seen(lambda wave: planck_jy(wave, t) * np.minimum(1.0, edge / wave) ** beta, av, r_v)
    else:
        t, centre = rng.uniform(150.0, 850.0), np.array([rng.uniform(3.3, 38.0)])
        width = np.array([rng.uniform(0.02, 0.3)])
        flux = sky.seen(lambda wave: planck_jy(wave, t) * cone_sources.drude(wave, centre, width)[0], av, r_v)
    return flux / flux.max(), np.zeros_like(flux)


def random_mixture(rng, sky):
    """A star, alone or with up to three further sources: band fluxes and the spread of the starlight."""
    flux, spread = random_source(rng, sky, "star")
    variance = spread**2
    for kind in rng.choice(["star", "planck", "grains", "feature"], size=rng.integers(0, 4)):
        more, spread = random_source(rng, sky, kind)
        size = 10.0 ** rng.uniform(-2.5, 0.0)
        flux, variance = flux + size * more, variance + (size * spread) ** 2
    return flux, np.sqrt(variance)


def observed(rng, sky, flux, spread, *, noise=0.01, depth=1e-4, limits=True, common=None, name="c"):
    """One candidate: floors on the true flux, spread of its starlight, noise, limits below three sigma."""
    error = np.hypot(noise * flux, depth * flux.max())
    scatter = np.sqrt(error**2 + (sky.local.floor * flux) ** 2 + spread**2)
    value = flux + scatter * rng.standard_normal(flux.size)
    for instrument, size in (common or {}).items():
        shared = size * rng.standard_normal()
        value = value + np.array([shared if band.instrument == instrument else 0.0 for band in sky.local.bands]) * flux
    rows = []
    for band, one, sigma in zip(sky.names, value, error, strict=True):
        if limits and one < 3 * sigma:
            rows.append(Measurement(band, max(one, 0.0) + 2 * sigma, np.nan, limit=True, nsigma=2.0))
        else:
            rows.append(Measurement(band, one, sigma))
    return Candidate(name, tuple(rows))


def refused(candidates, templates, settings=None, known=None):
    """Share refused, and the evidence."""
    evidence = mixture.assess(candidates, templates, settings or Settings(), known)
    return float(np.mean([one.adequate is False for one in evidence])), evidence
