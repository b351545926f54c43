"""Grids and tables that tests of the checks share, built once."""

from __future__ import annotations

import pytest

from tui.checks.tables import build_tables
from tui.data import load, load_flags
from tui.physics.templates import Spread, build_photosphere, build_templates

NAMES = ("Gaia_BP", "Gaia_G", "Gaia_RP", "J", "H", "Ks", "W1", "W2", "W3", "W4")


@pytest.fixture(scope="session")
def templates():
    """Grids of the mean dwarf sequence for ten bands, R_V 3.1."""
    bands = [load.bands()[name] for name in NAMES]
    spreads = [
        Spread(
            row["photosphere"], row["bands"], *(float(row[key]) for key in ("low_k", "high_k", "short_um", "long_um")),
            float(row["spread"]),
        )
        for row in load.spreads()
    ]  # fmt: skip
    photosphere = build_photosphere("dwarfs", load.dwarfs(), bands, load.bands())
    return build_templates(bands, photosphere, "g23", spreads, r_v=3.1)


@pytest.fixture(scope="session")
def tables():
    """The packaged tables about data quality and surroundings."""
    return build_tables(
        load_flags.flag_rows(), load_flags.gaia_excess_rows(), load_flags.gaia_scatter_rows(),
        load_flags.galaxy_count_rows(), load_flags.natural_class_rows(),
    )  # fmt: skip
