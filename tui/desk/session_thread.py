"""A thread that owns one clone of the session: jobs run there in order, off the interface's thread."""

from __future__ import annotations

import asyncio
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from typing import TYPE_CHECKING, TypeVar

if TYPE_CHECKING:
    from tui.workflow.session import Session

Result = TypeVar("Result")
Job = Callable[["Session"], Result]


class SessionThread:
    """Runs jobs one after another, each handed the thread's own session, which is opened at the first."""

    def __init__(self, session: Session, name: str) -> None:
        self._parent = session
        self._own: Session | None = None
        self._pool = ThreadPoolExecutor(max_workers=1, thread_name_prefix=name)

    async def ask(self, job: Job[Result]) -> Result:
        """Run a job and wait for it without holding up the interface; its error is raised here."""
        return await asyncio.wrap_future(self._pool.submit(self._run, job))

    def close(self, *, finish: bool) -> None:
        """End the thread once its running job is over; `finish`: the waiting ones too, and wait for them."""
        if not finish:
            self._pool.submit(self._close_own)
            self._pool.shutdown(wait=False)
            return
        self._pool.submit(self._close_own)
        self._pool.shutdown(wait=True)

    def _run(self, job: Job[Result]) -> Result:
        if self._own is None:
            self._own = self._parent.clone()
        return job(self._own)

    def _close_own(self) -> None:
        if self._own is not None:
            self._own.close()
            self._own = None
