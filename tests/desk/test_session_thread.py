"""Jobs on a session of their own, in order, off the asking thread."""

from __future__ import annotations

import asyncio
import threading

import pytest

from tui.desk.session_thread import SessionThread
from tui.errors import StoreError


class OneThread:
    """A session that notices when it is used outside the thread that opened it."""

    def __init__(self) -> None:
        self.home = threading.get_ident()
        self.closed = False
        self.clones: list[OneThread] = []

    def clone(self) -> OneThread:
        self.clones.append(OneThread())
        return self.clones[-1]

    def close(self) -> None:
        assert threading.get_ident() == self.home
        self.closed = True


def test_jobs_run_in_order_on_one_clone_of_their_own():
    parent, seen = OneThread(), []

    def job(number):
        def run(session):
            assert session is not parent and threading.get_ident() == session.home
            seen.append(number)
            return number

        return run

    async def ask_all():
        thread = SessionThread(parent, "test")
        answers = await asyncio.gather(*(thread.ask(job(number)) for number in range(20)))
        thread.close(finish=True)
        return answers

    assert asyncio.run(ask_all()) == seen == list(range(20))
    assert len(parent.clones) == 1 and parent.clones[0].closed and not parent.closed


def test_error_of_a_job_is_raised_where_it_was_asked_and_the_next_job_runs():
    def refuse(session):
        raise StoreError("The queue file is full.")

    async def ask_both():
        thread = SessionThread(OneThread(), "test")
        with pytest.raises(StoreError, match="full"):
            await thread.ask(refuse)
        answer = await thread.ask(lambda session: 7)
        thread.close(finish=True)
        return answer

    assert asyncio.run(ask_both()) == 7


def test_close_waits_for_what_must_be_finished():
    gate, done = threading.Event(), []

    async def begin():
        thread = SessionThread(OneThread(), "test")
        asking = [
            asyncio.ensure_future(thread.ask(lambda s: gate.wait(20))),
            asyncio.ensure_future(thread.ask(lambda s: done.append(1))),
        ]
        await asyncio.sleep(0)
        gate.set()
        thread.close(finish=True)
        thread.close(finish=True)
        await asyncio.gather(*asking)

    asyncio.run(begin())
    assert done == [1]
