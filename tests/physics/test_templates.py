"""Grids: what they cover, what they refuse, and when they are other grids."""

from __future__ import annotations

import numpy as np
import pytest

from tui.data import load
from tui.errors import InputError, TemplateError
from tui.physics.photosphere import planck_photosphere
from tui.physics.photometry import quadrature
from tui.physics.templates import Spread, build_photosphere, build_templates, even_grid, spread_table

NAMES = ("V", "Ks", "W3", "SDSS_g")


def made(photosphere="planck", law="g23", **options):
    bands = [load.bands()[name] for name in NAMES]
    surface = build_photosphere(photosphere, load.dwarfs(), bands, load.bands())
    return build_templates(bands, surface, law, (), r_v=options.pop("r_v", 3.1), **options)


@pytest.fixture(scope="module")
def plain():
    return made()


def test_bands_come_in_order_of_wavelength(plain, grids):
    assert plain.names == ("SDSS_g", "V", "Ks", "W3")
    assert np.all(np.diff(grids.pivot_um) > 0) and len(grids.bands) == len(load.bands())


def test_some_bands_in_any_order(grids):
    some = grids.take(["W1", "V"])
    assert some.names == ("W1", "V")
    at = np.log([4321.0])
    whole = grids.star.at(at)[0][0]
    assert some.star.at(at)[0][0] == pytest.approx([whole[grids.names.index("W1")], whole[grids.names.index("V")]],
        rel=1e-12)
    with pytest.raises(TemplateError, match="XYZ"):
        grids.take(["V", "XYZ"])


def test_unknown_choices_are_refused():
    with pytest.raises(TemplateError):
        made("phoenix")
    with pytest.raises(InputError):
        made(law="odonnell")
    with pytest.raises(InputError):
        made(r_v=7.0)


def test_digest_follows_everything_the_grids_are_made_of(plain):
    others = [made("dwarfs"), made(law="f99"), made(r_v=3.2), made(source_floor=0.1), made(floors={"V": 0.5})]
    digests = [plain.digest, *(other.digest for other in others)]
    assert len(set(digests)) == len(digests)
    assert made().digest == plain.digest


def test_floors_in_place_of_the_bands_own():
    other = made(floors={"V": 0.5})
    assert other.floor[other.names.index("V")] == 0.5
    assert other.floor[other.names.index("Ks")] == load.bands()["Ks"].floor


def test_every_law_can_be_built():
    for law in ("f99", "ccm89", "wc19"):
        grid = made(law=law)
        av = grid.star_reddening.at(np.log([9000.0]), np.ones(1), np.full(1, 3.1))[0][0, grid.names.index("V")]
        assert grid.law == law and float(av) == pytest.approx(1.0, abs=0.03)


def test_later_rows_of_the_spread_take_over():
    bands = [load.bands()[name] for name in NAMES]
    surface = planck_photosphere(np.array([3000.0, 6000.0, 12000.0]), [quadrature(band) for band in bands])
    rows = [
        Spread("planck", "all", 0, 1e5, 0, 1000, 0.04),
        Spread("planck", "all", 0, 5000, 0, 1000, 0.2),
        Spread("planck", "SDSS_*", 0, 1e5, 0, 1, 0.3),
        Spread("dwarfs", "all", 0, 1e5, 0, 1000, 0.9),
    ]
    table = spread_table(rows, surface, bands, None)
    assert table[:, NAMES.index("V")].tolist() == [0.2, 0.04, 0.04]
    assert table[:, NAMES.index("SDSS_g")].tolist() == [0.3, 0.3, 0.3]
    assert np.all(spread_table(rows, surface, bands, 0.07) == 0.07)


def test_packaged_spread_says_what_was_decided(grids):
    # 3 % where the table has the band; 10 % for Gaia columns of M dwarfs; 20 % for SDSS and PS1 of M dwarfs
    ln_t = grids.star.low + grids.star.step * np.arange(grids.spread.shape[0])

    def spread(name, kelvin):
        return grids.spread[np.argmin(np.abs(ln_t - np.log(kelvin))), grids.names.index(name)]

    assert spread("V", 6000) == spread("Ks", 3300) == 0.03
    assert spread("Gaia_G", 3300) == 0.10 and spread("SDSS_r", 3300) == 0.20 and spread("PS1_i", 6000) == 0.05
    assert np.all((grids.spread > 0) & (grids.spread < 0.4))


def test_even_grid_has_no_longer_step():
    grid = even_grid(0.0, 1.0, 0.3)
    assert grid[0] == 0.0 and grid[-1] == 1.0 and np.allclose(np.diff(grid), 0.25)
