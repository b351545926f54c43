"""Small pictures of some stars, as a survey's cutout service would give them."""

from __future__ import annotations

import numpy as np
from astropy.io import fits
from making.catalogues import GAIA_YR, Observer
from making.star import Star

PIXELS, SCALE_ARCSEC = 25, 1.375  # AllWISE's own pixels


def picture(star: Star, band: str, observer: Observer, ra: float, dec: float) -> fits.PrimaryHDU:
    """A small image of the star and its neighbours in one band, mJy a pixel."""
    beam = observer.sky.bands[band].beam_fwhm_arcsec
    middle = (PIXELS - 1) / 2
    y, x = np.mgrid[:PIXELS, :PIXELS]
    sources = [(0.0, 0.0, observer.seen(star, band)[0])]
    for near in star.neighbours:
        angle = np.radians(near[1])
        sources.append((near[0] * np.sin(angle), near[0] * np.cos(angle), observer.neighbour_flux(star, near, band)))
    image = np.zeros((PIXELS, PIXELS))
    for east, north, flux in sources:
        square = ((x - middle) + east / SCALE_ARCSEC) ** 2 + ((y - middle) - north / SCALE_ARCSEC) ** 2
        profile = np.exp(-4 * np.log(2) * square * SCALE_ARCSEC**2 / beam**2)
        image += 1e3 * flux * profile / (np.pi * beam**2 / (4 * np.log(2)) / SCALE_ARCSEC**2)
    if star.recipe.startswith("spike"):
        image += 0.35 * image.max() * np.exp(-0.5 * (((x - middle) - (y - middle)) / 1.3) ** 2)
    if star.recipe.startswith("nebula"):
        image += 0.30 * image.max() * np.exp(-0.5 * ((x - middle - 4) ** 2 + (y - middle + 2) ** 2) / 5.0**2)
    image += 0.015 * image.max() * observer.rng.standard_normal(image.shape)
    hdu = fits.PrimaryHDU(image.astype(np.float32))
    cards = {
        "OBJECT": "Saltmarsh",
        "BAND": band,
        "BUNIT": "mJy",
        "CTYPE1": "RA---TAN",
        "CTYPE2": "DEC--TAN",
        "CRVAL1": ra,
        "CRVAL2": dec,
        "CRPIX1": middle + 1,
        "CRPIX2": middle + 1,
        "CDELT1": -SCALE_ARCSEC / 3600,
        "CDELT2": SCALE_ARCSEC / 3600,
        "EQUINOX": 2000.0,
        "EPOCH-YR": GAIA_YR,
    }
    hdu.header.update({key[:8]: value for key, value in cards.items()})
    return hdu
