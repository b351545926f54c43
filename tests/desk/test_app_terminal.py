"""The desk on a real pseudo-terminal: what the terminal's own keys and signals do to it."""

from __future__ import annotations

import fcntl
import os
import pty
import select
import signal
import struct
import subprocess
import sys
import termios
import time
from contextlib import contextmanager

import pytest

PROGRAM = (
    "import sys\nfrom tui.workflow.session import Session\nfrom tui.desk.app import Desk\n"
    "with Session.open(sys.argv[1], 'heron') as session:\n    Desk(session).run()\nprint('left in order')\n"
)
INTO, OUT_OF = b"\x1b[?1049h", b"\x1b[?1049l"  # xterm: use and leave the other screen
LONGEST_S = 30.0


class Terminal:
    """A process whose controlling terminal we hold the other end of."""

    def __init__(self, arguments: list[str]) -> None:
        self.leader, follower = pty.openpty()
        fcntl.ioctl(follower, termios.TIOCSWINSZ, struct.pack("HHHH", 24, 80, 0, 0))
        self.before = termios.tcgetattr(follower)
        self.process = subprocess.Popen(
            [sys.executable, "-c", PROGRAM, *arguments], stdin=follower, stdout=follower, stderr=follower,
            start_new_session=True, env={**os.environ, "TERM": "xterm-256color", "COLUMNS": "80", "LINES": "24"},
            preexec_fn=lambda: fcntl.ioctl(0, termios.TIOCSCTTY, 0),
        )  # fmt: skip
        self.follower = follower
        self.seen = b""

    def wait_for(self, wanted: bytes) -> None:
        """Read until `wanted` was written after what was waited for before."""
        ends = time.monotonic() + LONGEST_S
        while wanted not in self.seen:
            assert time.monotonic() < ends, self.seen[-2000:]
            if select.select([self.leader], [], [], 0.1)[0]:
                self.seen += os.read(self.leader, 65536)
        self.seen = self.seen[self.seen.index(wanted) + len(wanted) :]

    def is_as_before(self) -> bool:
        """Whether echo and line editing are as the shell left them."""
        return termios.tcgetattr(self.follower)[:4] == self.before[:4]


@contextmanager
def terminal(path: str):
    """A desk, open at its queue."""
    made = Terminal([path])
    try:
        made.wait_for(INTO)
        made.wait_for(b"SM-0001")
        yield made
    finally:
        made.process.kill()
        made.process.wait()
        os.close(made.leader)
        os.close(made.follower)


@pytest.fixture
def path(disk_session) -> str:
    """The path of a queue on disk."""
    return disk_session.path


@pytest.mark.parametrize("leave", ["qq", "\x03", signal.SIGTERM, signal.SIGHUP], ids=str)
def test_the_terminal_is_as_it_was_after(path, leave):
    with terminal(path) as desk:
        if isinstance(leave, str):
            os.write(desk.leader, leave.encode())
        else:
            desk.process.send_signal(leave)
        desk.wait_for(OUT_OF)
        desk.wait_for(b"left in order")
        assert desk.process.wait(LONGEST_S) == 0
        assert desk.is_as_before()


def test_ctrl_z_stops_it_and_fg_brings_it_back(path):
    with terminal(path) as desk:
        os.write(desk.leader, b"\x1a")
        desk.wait_for(OUT_OF)
        _, status = os.waitpid(desk.process.pid, os.WUNTRACED)
        assert os.WIFSTOPPED(status) and desk.is_as_before()
        desk.process.send_signal(signal.SIGCONT)
        desk.wait_for(INTO)
        for shown in (b"saltmarsh.db", b"SM-0001", b"SM-0003", b"next, fewest finished"):  # all is drawn anew
            desk.wait_for(shown)
        os.write(desk.leader, b"Q")
        desk.wait_for(b"left in order")


def test_a_line_that_is_cut_ends_it(path):
    made = Terminal([path])
    made.wait_for(b"SM-0001")
    os.close(made.follower)
    os.close(made.leader)
    made.process.wait(LONGEST_S)


def test_a_terminal_that_goes_without_a_signal_ends_it(path):
    # as under nohup, or where the terminal was never the process's own: no hang-up signal comes, only an end of input
    leader, follower = pty.openpty()
    fcntl.ioctl(follower, termios.TIOCSWINSZ, struct.pack("HHHH", 24, 80, 0, 0))
    process = subprocess.Popen(
        [sys.executable, "-c", PROGRAM, path], stdin=follower, stdout=follower, stderr=follower,
        start_new_session=True, env={**os.environ, "TERM": "xterm-256color", "COLUMNS": "80", "LINES": "24"},
    )  # fmt: skip
    os.close(follower)
    seen, ends = b"", time.monotonic() + LONGEST_S
    while b"SM-0001" not in seen and time.monotonic() < ends:
        if select.select([leader], [], [], 0.1)[0]:
            seen += os.read(leader, 65536)
    assert b"SM-0001" in seen
    os.close(leader)
    try:
        process.wait(LONGEST_S)
    finally:
        process.kill()
    assert process.returncode != -signal.SIGKILL
