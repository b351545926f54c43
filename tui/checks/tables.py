"""The packaged tables that the checks of data quality and surroundings need, as workflow hands them in."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from tui.checks.cautions import ClassRow, class_rows
from tui.checks.flags import FlagTable, flag_table
from tui.physics.gaia import ExcessLaw, QuietLocus, excess_law, quiet_locus
from tui.physics.sky_counts import GalaxyAnchor, galaxy_anchors

Rows = Sequence[Mapping[str, str]]


@dataclass(frozen=True, slots=True, eq=False)
class Tables:
    """Flags, Gaia's loci, galaxy counts and natural classes."""

    flags: FlagTable
    excess: ExcessLaw
    quiet: QuietLocus
    galaxies: tuple[GalaxyAnchor, ...]
    classes: tuple[ClassRow, ...]


def build_tables(flags: Rows, excess: Rows, scatter: Rows, galaxies: Rows, classes: Rows) -> Tables:
    """Tables from the rows that `tui.data.load_flags` reads, in the order of its functions."""
    return Tables(
        flag_table(flags), excess_law(excess), quiet_locus(scatter), galaxy_anchors(galaxies), class_rows(classes)
    )
