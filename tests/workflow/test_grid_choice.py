"""Which spectra of a folder make the photosphere source."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from tui.errors import TableError
from tui.physics.grid import SurfaceSpectrum
from tui.workflow.grid_choice import GivenSpectrum, chosen_spectra, described


def given(teff_k, logg=None, mh=None):
    name = Path(f"{teff_k}_{logg}_{mh}.dat")
    return GivenSpectrum(name, SurfaceSpectrum(float(teff_k), np.array([1.0]), np.array([1.0])), logg, mh)


def test_dwarfs_of_solar_metallicity_are_taken_before_others():
    every = [given(t, g, m) for t in (5000, 4000) for g in (2.0, 4.0, 4.5) for m in (-1.0, 0.0)]
    chosen = chosen_spectra("x", every)
    assert [(one.spectrum.teff_k, one.logg, one.mh) for one in chosen] == [(4000.0, 4.5, 0.0), (5000.0, 4.5, 0.0)]


def test_hot_stars_that_have_another_log_g_only_stay():
    chosen = chosen_spectra("x", [given(40000, 4.5), given(45000, 5.0)])
    assert described(chosen) == "40000-45000 K, log g 4.5 to 5"


def test_what_is_asked_for_is_taken_or_refused():
    every = [given(5000, 4.5, 0.0), given(5000, 2.0, 0.0)]
    assert [one.logg for one in chosen_spectra("x", every, logg=2.0)] == [2.0]
    with pytest.raises(TableError, match="no spectrum has mh -1"):
        chosen_spectra("x", every, mh=-1.0)


def test_two_alike_are_refused():
    with pytest.raises(TableError, match="nothing tells them apart"):
        chosen_spectra("x", [given(5000, 4.5), given(5000, 4.5)])
