"""Which candidates a view lists: asked in a thread, the beginning first where it can be had sooner."""

from __future__ import annotations

from array import array
from collections.abc import Callable, Iterator
from time import sleep
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from tui.desk.queue_view import QueueView
    from tui.workflow.session import Session

REST_S = 0.12  # a search looks inside names once the typing has rested so long
BEGINNING = 200  # lines shown at once, while a long queue is still being ordered


def beginning(session: Session, view: QueueView) -> array[int] | None:
    """The first lines of a view where an index gives them at once; None where the whole must be ordered first."""
    if not view.is_whole or not view.descending:
        return None
    return session.order(view.sort, view.descending, view.where, limit=BEGINNING)


def ordered(session: Session, view: QueueView, is_wanted: Callable[[], bool]) -> Iterator[tuple[array[int], bool]]:
    """Ids for a view, and whether they are all.

    A search gives the first names that begin with the text at once, then these and after them the names that hold it.

    Args:
        is_wanted: asked before the long part of a search, which waits until the typing rests.
    """
    if not view.find:
        yield session.order(view.sort, view.descending, view.where), True
        return
    yield session.find(view.find, limit=BEGINNING), False
    sleep(REST_S)
    if not is_wanted():
        return
    start = session.find(view.find)
    inside = session.find(view.find, substring=True)
    yield start + without(inside, start), True


def without(ids: array[int], known: array[int]) -> array[int]:
    """The ids that are not among the known ones, in their order."""
    import numpy as np  # in a thread: the first rows are drawn before it is there

    found, seen = np.frombuffer(ids, dtype=np.int64), np.frombuffer(known, dtype=np.int64)
    return array("q", found[~np.isin(found, seen, assume_unique=True)].tobytes())


def line_of(ids: array[int], candidate_id: int | None, otherwise: int) -> int:
    """The line on which a candidate stands now, or another one where it does not."""
    if candidate_id is None:
        return otherwise
    if len(ids) > BEGINNING:
        return place_of(ids, candidate_id, otherwise)
    try:
        return ids.index(candidate_id)
    except ValueError:
        return otherwise


def place_of(ids: array[int], candidate_id: int, otherwise: int) -> int:
    """The same on a long list; fifty times as fast as looking at each id, which a key would feel."""
    import numpy as np

    (found,) = np.nonzero(np.frombuffer(ids, dtype=np.int64) == candidate_id)
    return int(found[0]) if found.size else otherwise
