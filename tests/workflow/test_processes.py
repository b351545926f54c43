"""Work in several processes: in order, few chunks ahead, a death said plainly.

Fresh processes import the work by name, so it is a function that every Python has.
"""

from __future__ import annotations

import multiprocessing
import os
import signal
import time

import pytest

from tui.workflow.processes import AHEAD, WorkerError, in_processes

TAKEN: list[int] = []


def chunks(count):
    for number in range(count):
        TAKEN.append(number)
        yield number


def test_results_come_in_order_and_chunks_are_read_late():
    TAKEN.clear()
    results = in_processes(abs, chunks(20), 2, int, ())
    assert next(results) == 0 and len(TAKEN) <= 2 * AHEAD
    assert list(results) == list(range(1, 20))


def test_a_process_that_is_ended_is_said_plainly():
    with pytest.raises(WorkerError, match="fewer --jobs"):
        list(in_processes(signal.raise_signal, iter([signal.SIGKILL]), 1, int, ()))


def test_an_error_in_the_work_arrives_as_it_is():
    with pytest.raises(TypeError):
        list(in_processes(abs, iter(["text"]), 1, int, ()))


def test_the_environment_is_as_it_was():
    before = dict(os.environ)
    assert list(in_processes(abs, iter([-1]), 1, int, ())) == [1]
    assert dict(os.environ) == before


def test_an_interruption_does_not_wait_for_what_is_half_computed():
    def interrupted():
        yield 1_000_000  # seconds that a process would sleep
        raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        list(in_processes(time.sleep, interrupted(), 1, int, ()))
    assert not multiprocessing.active_children()
