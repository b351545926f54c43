"""The program in a terminal of its own, driven by what a person sees there: a key is pressed only where it is named."""

from __future__ import annotations

import fcntl
import os
import pty
import re
import select
import struct
import subprocess
import sys
import termios
import time
from collections.abc import Callable
from pathlib import Path

import pyte
import pytest

ROOT = str(Path(__file__).parents[2])
PATIENCE_S = 120.0  # for a screen, on a busy machine
AGAIN_S = 20.0  # a key that did nothing for so long fell on a page not yet drawn, where keys are dropped
ENTER, TAB, UP = "\r", "\t", "\x1b[A"
NAMED = {ENTER: "Enter", TAB: "Tab", UP: "Up"}


class Terminal:
    """`plainlight` with some arguments on a pseudo-terminal; the screen is kept as pyte makes it of the bytes."""

    def __init__(self, *arguments: str, columns: int, lines: int, folder: str, **environment: str) -> None:
        self.screen = pyte.Screen(columns, lines)
        self.stream = pyte.ByteStream(self.screen)
        self.raw = b""
        self.master, self.follower = pty.openpty()
        fcntl.ioctl(self.follower, termios.TIOCSWINSZ, struct.pack("HHHH", lines, columns, 0, 0))
        self.before = termios.tcgetattr(self.follower)
        kept = {name: value for name, value in os.environ.items() if name not in ("COLUMNS", "LINES", "NO_COLOR")}
        kept |= {"TERM": "xterm-256color", "PYTHONPATH": ROOT, **environment}
        self.process = subprocess.Popen(
            [sys.executable, "-m", "tui", *arguments], stdin=self.follower, stdout=self.follower, stderr=self.follower,
            start_new_session=True, cwd=folder, env=kept,
        )  # fmt: skip

    # --- looking ---

    @property
    def text(self) -> str:
        """The screen, line by line."""
        return "\n".join(line.rstrip() for line in self.screen.display)

    def shows(self, words: str) -> bool:
        """Whether the screen holds what matches, however wide its gaps."""
        return re.search(words, self.text) is not None

    def until(self, words: str) -> re.Match[str]:
        """Wait until the screen holds what matches a pattern; the match."""
        self._wait(lambda: self.shows(words), words, PATIENCE_S)
        return re.search(words, self.text)

    def cursor_on(self, words: str) -> None:
        """Wait until the terminal's own cursor stands on a line with such words."""
        self._wait(lambda: words in self.screen.display[self.screen.cursor.y], f"cursor on {words}", PATIENCE_S)

    def _wait(self, seen: Callable[[], bool], wanted: str, seconds: float, must: bool = True) -> bool:
        end = time.monotonic() + seconds
        while not seen():
            alive = self._read(0.1)
            if time.monotonic() > end or not (alive or seen()):
                if must or not alive:
                    pytest.fail(f"{wanted!r} never came:\n{self.text}")
                return False
        return True

    def _read(self, seconds: float) -> bool:
        """Take in what arrives within some time; False when the program has ended."""
        if not select.select([self.master], [], [], seconds)[0]:
            return self.process.poll() is None
        arrived = os.read(self.master, 65536)
        self.raw += arrived
        self.stream.feed(arrived)
        return True

    # --- doing ---

    def press(self, key: str, label: str, then: str) -> re.Match[str]:
        """Press a key that the screen names with that label, until the screen holds what it should bring."""
        self.until(rf"{re.escape(NAMED.get(key, key))}( (\S|Down|Right))* {label}")
        end = time.monotonic() + PATIENCE_S
        while time.monotonic() < end:
            os.write(self.master, key.encode())
            if self._wait(lambda: self.shows(then), then, AGAIN_S, must=False):
                break
        return self.until(then)

    def type(self, text: str) -> None:
        """Type into a line or a note that is open, and wait to see it."""
        os.write(self.master, text.encode())
        self.until(re.escape(text))

    def type_key(self, key: str) -> None:
        """A key that ends the page or the program it is pressed on, whatever comes after."""
        os.write(self.master, key.encode())

    # --- ending ---

    def status(self) -> int:
        """Read to the end; the exit status."""
        self._wait(lambda: self.process.poll() is not None, "the end", PATIENCE_S)
        while select.select([self.master], [], [], 0)[0]:
            self._read(0)
        return self.process.returncode

    def is_as_before(self) -> bool:
        """Echo, line editing, the first screen, the cursor and the mouse are as the shell left them."""
        pairs = (b"\x1b[?1049l", b"\x1b[?1049h"), (b"\x1b[?25h", b"\x1b[?25l")
        undone = all(self.raw.rfind(off) > self.raw.rfind(on) for off, on in pairs)
        mouse = self.raw.rfind(b"\x1b[?1000l") >= self.raw.rfind(b"\x1b[?1000h")
        return undone and mouse and termios.tcgetattr(self.follower)[:4] == self.before[:4]

    def close(self) -> None:
        """Leave nothing running."""
        self.process.kill()
        self.process.wait()
        os.close(self.master)
        os.close(self.follower)
