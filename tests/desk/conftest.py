"""Sessions, a desk under a pilot, and plain-text pictures of screens for the desk's tests."""

from __future__ import annotations

import asyncio
import os
from pathlib import Path

import pytest

from tests.desk.disk_queue import make_queue
from tests.desk.fake_session import FakeSession
from tests.desk.made import HOSTILE_NAMES
from tests.desk.million_session import MillionSession


@pytest.fixture
def fake_session() -> FakeSession:
    """Sixty candidates, thirteen of them with names made to do harm; the reviewer is heron."""
    return FakeSession([f"SM-{i:04d}" for i in range(1, 48)] + list(HOSTILE_NAMES))


@pytest.fixture
def reader_session() -> FakeSession:
    """The same queue, read without a handle."""
    return FakeSession([f"SM-{i:04d}" for i in range(1, 48)] + list(HOSTILE_NAMES), handle=None)


@pytest.fixture
def million_session() -> MillionSession:
    """A queue of a million rows."""
    return MillionSession()


@pytest.fixture
def drive():
    """Run a desk under a pilot: `drive(session, steps, size=(80, 24))`, with `async def steps(app, pilot)`."""
    from tui.desk.app import Desk

    def run(session, steps, size=(80, 24), **options):
        async def whole():
            app = Desk(session, **options)
            async with app.run_test(size=size) as pilot:
                await settle(app, pilot)
                await steps(app, pilot)

        asyncio.run(whole())

    return run


async def settle(app, pilot) -> None:
    """Until background work and what it posted are done."""
    for _ in range(3):
        await pilot.pause()
        await app.workers.wait_for_complete()
    await pilot.pause()


@pytest.fixture
def settled():
    """The coroutine function `settle(app, pilot)`."""
    return settle


def text_of(app) -> str:
    """What stands on the screen, as plain text, trailing spaces gone."""
    strips = app.screen._compositor.render_strips()
    return "\n".join("".join(segment.text for segment in strip).rstrip() for strip in strips) + "\n"


@pytest.fixture
def screen_text():
    """The function `screen_text(app) -> str`."""
    return text_of


@pytest.fixture
def any_terminal(monkeypatch):
    """A terminal that can draw braille, whatever the tests run in."""
    monkeypatch.delenv("LC_ALL", raising=False)
    monkeypatch.setenv("LC_CTYPE", "C.UTF-8")
    monkeypatch.setenv("TERM", "xterm-256color")


@pytest.fixture
def on_candidate(drive):
    """Run steps on a candidate's page: `on_candidate(session, steps, name=..., order=...)`.

    `async def steps(app, screen, press)`: `await press(*keys)` presses them one by one, each on a page at rest.
    """
    from tui.desk.screens.candidate import CandidateScreen

    def run(session, steps, name="SM-0001", order=None, **options):
        async def whole(app, pilot):
            screen = CandidateScreen(session, name, order)
            app.push_screen(screen)
            await settle(app, pilot)

            async def press(*keys):
                for key in keys:
                    await pilot.press(key)
                    await settle(app, pilot)

            await steps(app, screen, press)

        drive(session, whole, **options)

    return run


@pytest.fixture
def snapshot():
    """Compare text with `snapshots/NAME.txt`; with PLAINLIGHT_SNAPSHOTS=write, write it."""

    def compare(name: str, text: str) -> None:
        path = Path(__file__).parent / "snapshots" / f"{name}.txt"
        if os.environ.get("PLAINLIGHT_SNAPSHOTS") == "write":
            path.parent.mkdir(exist_ok=True)
            path.write_text(text, encoding="utf-8")
        assert text == path.read_text(encoding="utf-8")

    return compare


@pytest.fixture
def disk_session(tmp_path):
    """A session of heron on a queue on disk."""
    from tui.workflow.session import Session

    with Session.open(make_queue(tmp_path / "saltmarsh.db"), "heron") as session:
        yield session
