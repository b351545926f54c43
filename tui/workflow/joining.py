"""Become a reviewer of a queue."""

from __future__ import annotations

from tui.model import Reviewer
from tui.store.connect import open_queue
from tui.store.reviewers import add_reviewer
from tui.workflow.clock import utc_now


def join(path: str, handle: str) -> Reviewer:
    """Add a reviewer under `handle`; HandleError where the handle is malformed or taken."""
    connection = open_queue(path)
    try:
        return add_reviewer(connection, handle, utc_now())
    finally:
        connection.close()
