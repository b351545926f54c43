"""Grids of more bands put beside those there are: the points of a spectrum beside the filters."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from tui.model import FloatArray, digest
from tui.physics.reddening import Reddening
from tui.physics.sources import SourceGrid
from tui.physics.templates import Templates

GRIDS = ("star", "dust", "compact", "power")
REDDENINGS = ("star_reddening", "dust_reddening", "compact_reddening", "other_reddening")


def joined(first: Templates, second: Templates, points: str) -> Templates:
    """The bands of both, in order of wavelength; both of one photosphere source, law and R_V.

    Args:
        points: name of the wavelength grid whose points `second` holds.
    """
    bands = (*first.bands, *second.bands)
    order = np.argsort([band.pivot_um for band in bands], kind="stable")
    grids = {part: beside(getattr(first, part), getattr(second, part), order) for part in GRIDS}
    screens = {part: screen_beside(getattr(first, part), getattr(second, part), order) for part in REDDENINGS}
    return replace(
        first,
        bands=tuple(bands[place] for place in order),
        spread=columns(first.spread, second.spread, order),
        silent=(*first.silent, *second.silent),
        digest=digest([first.digest, second.digest]),
        points=points,
        **grids,
        **screens,
    )


def columns(first: FloatArray, second: FloatArray, order: Sequence[int]) -> FloatArray:
    """Two tables side by side, bands on the last axis, in a new order."""
    return np.ascontiguousarray(np.concatenate([first, second], axis=-1)[..., order])


def beside(first: SourceGrid, second: SourceGrid, order: Sequence[int]) -> SourceGrid:
    """Two tables over one parameter side by side."""
    return replace(
        first,
        ln_flux=columns(first.ln_flux, second.ln_flux, order),
        slope=columns(first.slope, second.slope, order),
    )


def screen_beside(first: Reddening, second: Reddening, order: Sequence[int]) -> Reddening:
    """Two families of screens side by side."""
    return replace(first, coefficients=columns(first.coefficients, second.coefficients, order))
