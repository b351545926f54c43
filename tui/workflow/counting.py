"""Counts in words."""

from __future__ import annotations

import re

PLURAL = re.compile(r"s(?=\s|$)")


def counted(count: int, things: str) -> str:
    """A number of things, the first word of which that ends in s is their plural.

    >>> counted(1, "rulings"), counted(0, "faults"), counted(1, "candidates with other facts")
    ('1 ruling', '0 faults', '1 candidate with other facts')
    """
    return f"{count} {PLURAL.sub('', things, count=1) if count == 1 else things}"
