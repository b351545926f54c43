"""What tests of several rooms share, built once a session."""

from __future__ import annotations

import pytest

from tests.published.reading import read_real_stars
from tui.checks.tables import build_tables
from tui.data import load_flags
from tui.model import Settings
from tui.workflow.templates import build


@pytest.fixture(scope="session")
def grids():
    """Grids of the mean dwarf sequence in every packaged band, law G23, R_V free."""
    return build(Settings(r_v="free"), {})


@pytest.fixture(scope="session")
def real_stars():
    """Real stars with published answers."""
    return read_real_stars()


@pytest.fixture(scope="session")
def quality_tables():
    """The packaged tables about data quality and surroundings."""
    return build_tables(
        load_flags.flag_rows(), load_flags.gaia_excess_rows(), load_flags.gaia_scatter_rows(),
        load_flags.galaxy_count_rows(), load_flags.natural_class_rows(),
    )  # fmt: skip
