"""The one place that reads the wall clock."""

from __future__ import annotations

from datetime import UTC, datetime


def utc_now() -> str:
    """This moment: ISO 8601 in UTC with microseconds, ending in Z, so that text order is time order."""
    return datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%S.%fZ")
