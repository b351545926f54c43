"""Which candidates a view lists: asked in a thread, the beginning first where it can be had sooner."""

from __future__ import annotations

from array import array
from collections.abc import Iterator
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from tui.desk.queue_view import QueueView
    from tui.workflow.session import Session

BEGINNING = 200  # lines shown at once, while a long queue is still being ordered


def beginning(session: Session, view: QueueView) -> array[int] | None:
    """The first lines of a view where an index gives them at once; None where the whole must be ordered first."""
    if not view.is_whole or not view.descending:
        return None
    return session.order(view.sort, view.descending, view.where, limit=BEGINNING)


def ordered(session: Session, view: QueueView) -> Iterator[tuple[array[int], bool]]:
    """Ids for a view, and whether they are all.

    A search gives the names that begin with the text, then these and after them the names that hold it.
    """
    if not view.find:
        yield session.order(view.sort, view.descending, view.where), True
        return
    start = session.find(view.find)
    yield start, False
    known = set(start)
    inside = (found for found in session.find(view.find, substring=True) if found not in known)
    yield start + array("q", inside), True


def line_of(ids: array[int], candidate_id: int | None, otherwise: int) -> int:
    """The line on which a candidate stands now, or another one where it does not."""
    if candidate_id is None:
        return otherwise
    try:
        return ids.index(candidate_id)
    except ValueError:
        return otherwise
