"""A program on a pseudo-terminal, timed from a key to the end of its repaint; for the desk's benchmark."""

from __future__ import annotations

import fcntl
import os
import pty
import select
import struct
import subprocess
import sys
import tempfile
import termios
import time
from pathlib import Path

SYNC_ASKED, SYNC_KNOWN = b"\x1b[?2026$p", b"\x1b[?2026;2$y"
SYNC_END = b"\x1b[?2026l"  # ends a repaint, where the terminal said it knows the mode
ENVIRONMENT = {name: value for name, value in os.environ.items() if name != "PYTHONDONTWRITEBYTECODE"}
ENVIRONMENT |= {"TERM": "xterm-256color", "PYTHONPYCACHEPREFIX": str(Path(tempfile.gettempdir()) / "bench-desk-cache")}
LONGEST_S = 10.0  # for a key; one that brought no repaint at all would count so long


class Terminal:
    """A process on a pseudo-terminal."""

    def __init__(self, program: str, arguments: list[str], size: tuple[int, int] = (80, 24)) -> None:
        self.started = time.perf_counter()
        self.leader, follower = pty.openpty()
        fcntl.ioctl(follower, termios.TIOCSWINSZ, struct.pack("HHHH", size[1], size[0], 0, 0))
        self.process = subprocess.Popen(
            [sys.executable, "-c", program, *arguments], stdin=follower, stdout=follower, stderr=follower,
            env=ENVIRONMENT, start_new_session=True,
        )  # fmt: skip
        os.close(follower)
        self.written = b""
        self.answered = False

    def wait_for(self, wanted: bytes, seconds: float = 60.0) -> float:
        """Milliseconds since the start of waiting until `wanted` was written after now."""
        waited = time.perf_counter()
        self.written = b""
        while wanted not in self.written and time.perf_counter() - waited < seconds:
            if select.select([self.leader], [], [], 0.05)[0]:
                self.written += os.read(self.leader, 65536)
                if SYNC_ASKED in self.written and not self.answered:
                    self.answered = True
                    os.write(self.leader, SYNC_KNOWN)
        return (time.perf_counter() - waited) * 1e3

    def quiet(self, seconds: float, longest: float = 10.0) -> None:
        """Read on until nothing was written for so long, or for the longest time."""
        end = time.perf_counter() + longest
        while time.perf_counter() < end and select.select([self.leader], [], [], seconds)[0]:
            os.read(self.leader, 65536)

    def key(self, sent: bytes) -> float:
        """Milliseconds from a key to the end of the next repaint."""
        os.write(self.leader, sent)
        return self.wait_for(SYNC_END, LONGEST_S)

    def end(self) -> None:
        """Stop it."""
        self.process.kill()
        self.process.wait()
        os.close(self.leader)


def first_text(program: str, arguments: list[str], wanted: bytes) -> float:
    """Milliseconds from the start of a process on a pseudo-terminal until `wanted` is on it."""
    terminal = Terminal(program, arguments)
    terminal.wait_for(wanted)
    took = (time.perf_counter() - terminal.started) * 1e3
    terminal.end()
    return took
