"""Who is told that a command waits for another program to let go of a queue."""

from __future__ import annotations

from collections.abc import Callable

from tui.store.connect import listen


def say_waits(hook: Callable[[str], None] | None) -> None:
    """Have `hook` told, once a wait, when any queue of this process has been waited for more than two seconds.

    A session has a hook of its own: `Session.on_wait`.
    """
    listen(hook)
