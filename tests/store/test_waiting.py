"""Waiting for another program: said once, in time, and given up in the end; no test waits on the clock."""

from __future__ import annotations

import sqlite3

import pytest

from tui.errors import StoreError
from tui.store import waiting
from tui.store.connect import immediate, listen, open_queue


class Clock:
    """Time that passes only when somebody sleeps, half a second at a time."""

    def __init__(self):
        self.now = 0.0
        self.at = {}

    def sleep(self, seconds):
        self.now += 0.5
        self.at.pop(self.now, lambda: None)()


@pytest.fixture
def clock(monkeypatch):
    made = Clock()
    monkeypatch.setattr(waiting, "monotonic", lambda: made.now)
    monkeypatch.setattr(waiting, "sleep", made.sleep)
    return made


@pytest.fixture
def holder(queue, path):
    """Another program that holds the write lock."""
    other = sqlite3.connect(path, isolation_level=None)
    other.execute("BEGIN IMMEDIATE")
    yield other
    other.close()


def test_a_wait_is_said_once_after_two_seconds_and_ends_when_the_lock_does(queue, path, holder, clock):
    said = []
    listen(lambda text: said.append((clock.now, text)), queue)
    clock.at[20.0] = lambda: holder.execute("ROLLBACK")
    with immediate(queue):
        assert clock.now == 20.0
    assert said == [(2.5, f"{path} is in use by another program; waiting up to 60 s")]


def test_after_a_minute_it_is_refused(queue, holder, clock):
    with pytest.raises(StoreError, match="stayed locked for 60 s"), immediate(queue):
        pass
    assert clock.now == pytest.approx(60.5)


def test_a_short_wait_is_not_said(queue, holder, clock):
    said = []
    listen(said.append, queue)
    clock.at[1.5] = lambda: holder.execute("ROLLBACK")
    with immediate(queue):
        assert said == []


def test_a_hook_of_the_process_hears_of_every_queue_without_one_of_its_own(queue, path, holder, clock):
    said = []
    listen(said.append)
    try:
        clock.at[10.0] = lambda: holder.execute("ROLLBACK")
        other = open_queue(path)
        with immediate(other):
            assert len(said) == 1
        other.close()
    finally:
        listen(None)
