"""The one place that reads the wall clock and makes ids."""

from __future__ import annotations

import uuid
from datetime import UTC, datetime


def utc_now() -> str:
    """This moment: ISO 8601 in UTC with microseconds, ending in Z, so that text order is time order."""
    return datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%S.%fZ")


def new_id() -> str:
    """A globally unique id, 32 hex digits."""
    return uuid.uuid4().hex
