"""A thread that owns one clone of the session: jobs run there in order, off the interface's thread."""

from __future__ import annotations

import asyncio
from collections.abc import Callable
from concurrent.futures import Future
from queue import SimpleQueue
from threading import Thread
from typing import TYPE_CHECKING, Any, TypeVar

if TYPE_CHECKING:
    from tui.workflow.session import Session

Result = TypeVar("Result")
FINISH_S = 60.0  # as long as a writer may have to wait for its turn at the file


class SessionThread:
    """Runs jobs one after another, each handed the thread's own session, which is opened at the first.

    The thread never holds up the end of the program: what must be finished is waited for in `close`.
    """

    def __init__(self, session: Session, name: str) -> None:
        self._parent = session
        self._jobs: SimpleQueue[tuple[Future[Any], Callable[[Session], Any]] | None] = SimpleQueue()
        self._thread = Thread(target=self._work, name=name, daemon=True)
        self._is_open = True
        self._thread.start()

    async def ask(self, job: Callable[[Session], Result]) -> Result:
        """Run a job and wait for it without holding up the interface; its error is raised here."""
        future: Future[Result] = Future()
        self._jobs.put((future, job))
        return await asyncio.wrap_future(future)

    def close(self, *, finish: bool) -> None:
        """End the thread after the jobs that wait; `finish`: not before they are done."""
        if self._is_open:
            self._is_open = False
            self._jobs.put(None)
        if finish:
            self._thread.join(FINISH_S)

    def _work(self) -> None:
        session: Session | None = None
        while (item := self._jobs.get()) is not None:
            future, job = item
            if not future.set_running_or_notify_cancel():
                continue
            try:
                session = session or self._parent.clone()
                future.set_result(job(session))
            except BaseException as error:  # handed to whoever asked
                future.set_exception(error)
        if session is not None:
            session.close()
