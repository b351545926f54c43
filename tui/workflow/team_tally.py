"""The tally of a queue by its path, for the command: the team's, past every seal."""

from __future__ import annotations

from contextlib import closing
from typing import TYPE_CHECKING

from tui.store.connect import open_queue
from tui.store.settings import read_settings
from tui.workflow.clock import utc_now
from tui.workflow.controls import read_truth

if TYPE_CHECKING:
    from tui.workflow.tally_record import Tally


def team_tally(path: str, controls: str | None = None) -> Tally:
    """Where the team stands.

    Args:
        controls: path of the truth file; controls then leave all counts, and reviewers' rates on them are given.
    Raises:
        TableError: the truth file cannot be read.
        StoreError: the queue cannot be opened.
    """
    from tui.workflow.tallying import tally

    truth = read_truth(controls) if controls else None
    with closing(open_queue(path, write=False)) as connection:
        return tally(connection, read_settings(connection), now=utc_now(), truth=truth)
