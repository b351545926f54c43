"""How fast the desk is on a long queue: python tests/bench/bench_desk.py [ROWS]; writes only to a temporary folder.

Times of the first rows are those of a whole process on a pseudo-terminal, against an empty app's; times of keys are
taken on the same, from the key to the end of its repaint; those of whole lists under Textual's pilot.
"""

from __future__ import annotations

import asyncio
import fcntl
import os
import pty
import resource
import select
import statistics
import struct
import subprocess
import sys
import tempfile
import termios
import time
from pathlib import Path

EMPTY_APP = "from textual.app import App\nfrom textual.widgets import Static\n" \
    "class A(App):\n    def compose(self):\n        yield Static('SM-ready')\nA().run()\n"  # fmt: skip
DESK = "import sys\nfrom tui.workflow.session import Session\nfrom tui.desk.app import Desk\n" \
    "Desk(Session.open(sys.argv[1], 'heron')).run()\n"  # fmt: skip
SYNC_ASKED, SYNC_KNOWN = b"\x1b[?2026$p", b"\x1b[?2026;2$y"
SYNC_END = b"\x1b[?2026l"  # ends a repaint, where the terminal said it knows the mode
ENVIRONMENT = {name: value for name, value in os.environ.items() if name != "PYTHONDONTWRITEBYTECODE"}
ENVIRONMENT |= {"TERM": "xterm-256color", "PYTHONPYCACHEPREFIX": str(Path(tempfile.gettempdir()) / "bench-desk-cache")}
STARTS = 7
KEYS = 200


def make_queue(path: Path, rows: int) -> None:
    """A queue of so many assessed candidates, as many as it takes to measure a list; no measurements."""
    from tui.model import Reviewer
    from tui.store import connect, reviewers
    from tui.store.names import folded, ring

    connection = connect.open_queue(str(path), create=True)
    names = [f"SM-{i:07d}" for i in range(rows)]
    with connect.immediate(connection):
        connection.executemany("INSERT INTO candidate (id, name) VALUES (?, ?)", enumerate(names, 1))
        connection.executemany(
            "INSERT INTO queue_row (id, name, fold, ring, oddness, odd_band, odd_pull) VALUES (?, ?, ?, ?, ?, ?, ?)",
            ((i, name, folded(name), ring(name), (i * 7919 % rows) / rows * 12, "W3", i % 90 / 10)
             for i, name in enumerate(names, 1)),
        )  # fmt: skip
    reviewers.add_reviewer(connection, "heron", "2026-03-04T05:06:07.000000Z")
    assert isinstance(reviewers.reviewer_by_handle(connection, "heron"), Reviewer)
    connection.close()


class Terminal:
    """A process on a pseudo-terminal of 80 columns and 24 lines."""

    def __init__(self, program: str, arguments: list[str]) -> None:
        self.started = time.perf_counter()
        self.leader, follower = pty.openpty()
        fcntl.ioctl(follower, termios.TIOCSWINSZ, struct.pack("HHHH", 24, 80, 0, 0))
        self.process = subprocess.Popen(
            [sys.executable, "-c", program, *arguments], stdin=follower, stdout=follower, stderr=follower,
            env=ENVIRONMENT, start_new_session=True,
        )  # fmt: skip
        os.close(follower)
        self.written = b""
        self.answered = False

    def wait_for(self, wanted: bytes, seconds: float = 30.0) -> float:
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

    def quiet(self, seconds: float) -> None:
        """Read on until nothing was written for so long."""
        while select.select([self.leader], [], [], seconds)[0]:
            os.read(self.leader, 65536)

    def key(self, sent: bytes) -> float:
        """Milliseconds from a key to the end of the next repaint."""
        os.write(self.leader, sent)
        return self.wait_for(SYNC_END, 5.0)

    def end(self) -> None:
        """Stop it."""
        self.process.terminate()
        self.process.wait()
        os.close(self.leader)


def first_text(program: str, arguments: list[str], wanted: bytes) -> float:
    """Milliseconds from the start of a process on a pseudo-terminal until `wanted` is on it."""
    terminal = Terminal(program, arguments)
    terminal.wait_for(wanted)
    took = (time.perf_counter() - terminal.started) * 1e3
    terminal.end()
    return took


def terminal_key_times(path: Path) -> dict[str, list[float]]:
    """Times of keys on a pseudo-terminal."""
    terminal = Terminal(DESK, [str(path)])
    terminal.wait_for(b"SM-0")
    terminal.quiet(1.5)
    found: dict[str, list[float]] = {}
    for name, sent in {"down": b"\x1b[B", "page down": b"\x1b[6~", "end": b"\x1b[F", "home": b"\x1b[H"}.items():
        for _ in range(KEYS // 4):
            found.setdefault(f"terminal, {name}", []).append(terminal.key(sent))
            terminal.quiet(0.12)
            if name in {"end", "home"}:
                terminal.key(b"\x1b[A" if name == "end" else b"\x1b[B")
                terminal.quiet(0.12)
    terminal.end()
    return found


async def list_times(path: Path) -> dict[str, list[float]]:
    """Times from a key to the whole list that it asks for."""
    from tui.desk.app import Desk
    from tui.workflow.session import Session

    session = Session.open(str(path), "heron")
    app = Desk(session)
    found: dict[str, list[float]] = {}
    async with app.run_test(size=(80, 24)) as pilot:
        queue = app.screen

        async def listed(action: str) -> None:
            started = time.perf_counter()
            await queue.run_action(action)
            while queue.is_ordering:
                await asyncio.sleep(0.001)
            found.setdefault(f"whole list, {action}", []).append((time.perf_counter() - started) * 1e3)

        await pilot.pause()
        while queue.is_ordering or not queue.counts:
            await asyncio.sleep(0.001)
        for action in ("order", "reverse", "all", "unresolved('blend')", "needs_me", "all"):
            await listed(action)
    session.close()
    return found


def searched(path: Path) -> dict[str, list[float]]:
    """Times of a search on a pseudo-terminal: of each letter's repaint, and from all letters at once to their list."""
    terminal = Terminal(DESK, [str(path)])
    terminal.wait_for(b"SM-0")
    terminal.quiet(1.5)
    found: dict[str, list[float]] = {"search, a letter": [], "search, beginning": [], "search, inside": []}
    for text, kind in ((b"sm-09", "search, beginning"), (b"98765", "search, inside")):
        terminal.key(b"/")
        terminal.quiet(0.5)
        os.write(terminal.leader, text)
        found[kind].append(terminal.wait_for(b"SM-09000" if kind.endswith("beginning") else b"SM-0098765"))
        terminal.quiet(2.0)
        for _ in text:
            found["search, a letter"].append(terminal.key(b"\x7f"))
            terminal.quiet(0.05)
        terminal.key(b"\r")
        terminal.quiet(2.0)
    terminal.end()
    return found


def main(rows: int) -> None:
    """Measure and print."""
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "long.db"
        make_queue(path, rows)
        first_text(DESK, [str(path)], b"SM-0")  # leaves compiled modules behind, as an installed program has them
        empty = [first_text(EMPTY_APP, [], b"SM-ready") for _ in range(STARTS)]
        desk = [first_text(DESK, [str(path)], b"SM-0") for _ in range(STARTS)]
        print(f"{rows:,} rows, {os.cpu_count()} cores")
        print(f"{'first text, empty app':<28}{statistics.median(empty):>9.0f} ms median of {STARTS}")
        print(f"{'first rows, desk':<28}{statistics.median(desk):>9.0f} ms, "
              f"{statistics.median(desk) / statistics.median(empty):.2f} times")  # fmt: skip
        for what, times in (terminal_key_times(path) | searched(path) | asyncio.run(list_times(path))).items():
            worst = sorted(times)[int(0.99 * (len(times) - 1))]
            print(f"{what:<28}{statistics.median(times):>9.1f} ms median{worst:>9.1f} ms p99 of {len(times)}")
        print(f"peak memory {resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024:.0f} MB")


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 1_000_000)
