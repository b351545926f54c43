"""Reads the packaged tables about data quality and sky counts, as rows of text; called by workflow alone.

The rows become tables with units in the pure modules that use them (`tui.checks.tables`).
"""

from __future__ import annotations

from collections.abc import Mapping
from functools import cache

from tui.data.load import read_rows

Rows = tuple[Mapping[str, str], ...]


@cache
def flag_rows() -> Rows:
    """What each catalogue's flags mean: catalogue, column, bands, test, value, meaning, cause, severity, source."""
    return tuple(read_rows("flags.csv"))


@cache
def gaia_excess_rows() -> Rows:
    """Coefficients of Gaia's BP/RP excess factor against colour."""
    return tuple(read_rows("gaia_excess.csv"))


@cache
def gaia_scatter_rows() -> Rows:
    """Scatter of ordinary stars in G against magnitude."""
    return tuple(read_rows("gaia_scatter.csv"))


@cache
def galaxy_count_rows() -> Rows:
    """Galaxies per square degree brighter than one magnitude in some bands."""
    return tuple(read_rows("galaxy_counts.csv"))


@cache
def natural_class_rows() -> Rows:
    """Object and spectral types that shine oddly by nature."""
    return tuple(read_rows("natural_classes.csv"))
