"""Counts in words."""

from __future__ import annotations


def counted(count: int, things: str) -> str:
    """A number of things, whose plural ends in s.

    >>> counted(1, "rulings"), counted(0, "faults"), counted(2, "new candidates")
    ('1 ruling', '0 faults', '2 new candidates')
    """
    return f"{count} {things.removesuffix('s') if count == 1 else things}"
