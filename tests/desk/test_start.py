"""What the desk leaves until its first rows are drawn."""

from __future__ import annotations

import gc
import subprocess
import sys

import pytest

# slow to import, and of no use before there are rows
HEAVY = (
    "numpy scipy astropy sqlite_utils pandas dust_extinction statistics rich.traceback multiprocessing "
    "tomllib textual.widgets._text_area"
).split()
OWN = (  # of the program itself: needed once something was opened
    "tui.store.order tui.store.audit tui.store.gather tui.workflow.assessing tui.workflow.lookalikes tui.checks "
    "tui.physics tui.readers tui.data tui.desk.screens.candidate tui.desk.screens.tally tui.desk.screens.help"
).split()
PROGRAM = """
import sys
import tui.cli.group, tui.cli.ruling
from tui.workflow.session import Session
from tui.desk.app import Desk

class Watched(Session):
    def rows(self, ids):
        app.loaded = app.loaded or set(sys.modules)
        return super().rows(ids)

with Watched.open(sys.argv[1], "heron") as session:
    app = Desk(session)
    app.loaded = None
    app.call_later(lambda: app.call_after_refresh(app.exit))
    app.run(headless=True)
print(*sorted(app.loaded))
"""


@pytest.fixture
def loaded(disk_session) -> set[str]:
    """The modules that a process has imported when it reads the first rows to draw them."""
    started = [sys.executable, "-c", PROGRAM, disk_session.path]
    done = subprocess.run(started, capture_output=True, text=True, check=False)
    assert not done.returncode, done.stderr
    return set(done.stdout.split())


def test_first_rows_come_before_what_is_slow_to_import(loaded):
    assert "tui.desk.screens.queue" in loaded
    assert sorted(loaded & {*HEAVY, *OWN}) == []


def test_after_the_first_rows_garbage_is_collected_again_where_that_was_stopped(fake_session, drive, monkeypatch):
    frozen = []
    monkeypatch.setattr(gc, "freeze", lambda: frozen.append(gc.isenabled()))

    async def steps(app, pilot):
        assert gc.isenabled() and frozen == [False]

    gc.disable()
    try:
        drive(fake_session, steps)
    finally:
        gc.enable()


def test_a_desk_started_otherwise_leaves_the_collector_alone(fake_session, drive, monkeypatch):
    frozen = []
    monkeypatch.setattr(gc, "freeze", lambda: frozen.append(1))

    async def steps(app, pilot):
        assert gc.isenabled() and not frozen

    drive(fake_session, steps)
