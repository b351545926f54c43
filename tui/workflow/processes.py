"""Work on many chunks in several processes, in order, with few chunks in flight, so that memory stays flat."""

from __future__ import annotations

import contextlib
import multiprocessing
import os
import signal
from collections import deque
from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import Future, ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool
from multiprocessing import resource_tracker
from typing import Any

from tui.errors import TuiError

AHEAD = 2  # chunks handed out for each process
_ONE_THREAD = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS")  # processes already fill the cores


class WorkerError(TuiError):
    """A process that computed was ended from outside."""


def in_processes(
    work: Callable[[Any], Any],
    chunks: Iterable[Any],
    jobs: int,
    prepare: Callable[..., None],
    prepare_with: tuple[Any, ...],
) -> Iterator[Any]:
    """Yield `work(chunk)` for each chunk, in order, computed in `jobs` fresh processes.

    Args:
        work: a function of a module, called in the processes.
        chunks: read lazily, at most `AHEAD` for each process before the first result is taken.
        prepare: called once in each process with `prepare_with`.
    Raises:
        WorkerError: a process died, as when memory ran out.
    """
    resource_tracker.ensure_running()
    with one_thread_each():
        pool = ProcessPoolExecutor(
            jobs,
            mp_context=multiprocessing.get_context("spawn"),
            initializer=begin,
            initargs=(prepare, prepare_with),
        )
        try:
            yield from in_order(pool, work, chunks, jobs * AHEAD)
        except BrokenProcessPool as error:
            raise WorkerError(
                "A process that computed evidence was ended from outside, perhaps for lack of memory. What was "
                "finished is saved; run it again, with fewer --jobs."
            ) from error
        except BaseException:  # ctrl+c, or nobody wants the rest: what is half computed is not waited for
            end_processes()
            raise
        finally:
            pool.shutdown(wait=True, cancel_futures=True)


def end_processes() -> None:
    """End the processes that this one began; what they had not handed over is lost, and saved nowhere."""
    for process in multiprocessing.active_children():
        process.terminate()


def in_order(pool: ProcessPoolExecutor, work: Callable[[Any], Any], chunks: Iterable[Any], ahead: int) -> Iterator[Any]:
    """Results in the order of the chunks, with at most `ahead` of them waiting."""
    waiting: deque[Future[Any]] = deque()
    for chunk in chunks:
        waiting.append(pool.submit(work, chunk))
        if len(waiting) >= ahead:
            yield waiting.popleft().result()
    while waiting:
        yield waiting.popleft().result()


def begin(prepare: Callable[..., None], prepare_with: tuple[Any, ...]) -> None:
    """First thing in a process: leave ctrl+c to the parent, then prepare."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    prepare(*prepare_with)


@contextlib.contextmanager
def one_thread_each() -> Iterator[None]:
    """Tell the linear algebra of processes begun meanwhile to keep to one thread."""
    before = {name: os.environ.get(name) for name in _ONE_THREAD}
    os.environ.update(dict.fromkeys(_ONE_THREAD, "1"))
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                os.environ.pop(name, None)
            else:
                os.environ[name] = value


def spare_processes() -> int:
    """How many processors this program may use."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1
