"""How fast the desk is: python tests/bench/bench_desk.py [ROWS] [starts keys busy lists ...]; writes to a temporary folder.

starts  first rows of whole processes on a pseudo-terminal, in turn with an empty app's, for a queue of ROWS lines
keys    from a key to the end of its repaint, on a pseudo-terminal and under Textual's pilot, nothing else running
busy    the same while `plainlight assess` computes evidence of 10,000 candidates of the same queue, and while the
        desk itself computes the evidence of the candidates that are opened
lists   whole lists and searches at ROWS lines

Beside every time stands the load average of the machine: more than the number of cores means that others had a part
of them, and then only the ratios within a run say something.
"""

from __future__ import annotations

import asyncio
import os
import resource
import sqlite3
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from textual import events

from tests.bench.desk_queues import make_long, make_measured
from tests.bench.desk_terminal import ENVIRONMENT, Terminal, first_text

EMPTY_APP = "from textual.app import App\nfrom textual.widgets import Static\n" \
    "class A(App):\n    def compose(self):\n        yield Static('SM-ready')\nA().run()\n"  # fmt: skip
DESK = "import sys\nfrom tui.workflow.session import Session\nfrom tui.desk.app import Desk\n" \
    "Desk(Session.open(sys.argv[1], 'heron')).run()\n"  # fmt: skip
COMMAND = "import sys\nsys.argv = ['plainlight', 'review', sys.argv[1], '--as', 'heron']\n" \
    "from tui.__main__ import main\nmain()\n"  # fmt: skip
STARTS = 12
KEYS = 200
MEASURED = 10_000
OPENED = 12
MOVES = {"down": b"\x1b[B", "page down": b"\x1b[6~", "end": b"\x1b[F", "home": b"\x1b[H"}
UNDO = {"end": b"\x1b[A", "home": b"\x1b[B"}  # so that the next one moves again
PAUSE_S = 0.08  # between two keys
Times = dict[str, list[float]]


def line(what: str, times: list[float]) -> None:
    """Print one row of the table."""
    worst = sorted(times)[int(0.99 * (len(times) - 1))]
    print(f"{what:<44}{min(times):>8.1f}{statistics.median(times):>9.1f}{worst:>9.1f}{len(times):>6}"
          f"{os.getloadavg()[0]:>8.1f}", flush=True)  # fmt: skip


# --- starts ---


def starts(path: Path) -> None:
    """First text of an empty app, of the desk and of the whole command, in turn."""
    programs = {"empty app": (EMPTY_APP, b"SM-ready"), "desk": (DESK, b"SM-0"), "plainlight review": (COMMAND, b"SM-0")}
    for program, wanted in programs.values():
        first_text(program, [str(path)], wanted)  # leaves compiled modules behind, as an installed program has them
    found: Times = {name: [] for name in programs}
    for _ in range(STARTS):
        for name, (program, wanted) in programs.items():
            found[name].append(first_text(program, [str(path)], wanted))
    empty = found["empty app"]
    for name, times in found.items():
        line(f"first rows, {name}", times)
        if name != "empty app":
            pairs = statistics.median(one / other for one, other in zip(times, empty, strict=True))
            print(f"{'':<4}times the empty app's: best {min(times) / min(empty):.2f}, median "
                  f"{statistics.median(times) / statistics.median(empty):.2f}, of pairs {pairs:.2f}")  # fmt: skip


# --- keys ---


def terminal_keys(path: Path, count: int, size: tuple[int, int] = (80, 24)) -> Times:
    """Times of keys in the list, on a pseudo-terminal."""
    terminal = Terminal(DESK, [str(path)], size)
    terminal.wait_for(b"SM-0")
    terminal.quiet(1.5)
    found: Times = {name: [] for name in MOVES}
    for _ in range(count // len(MOVES)):
        for name, sent in MOVES.items():
            found[name].append(terminal.key(sent))
            terminal.quiet(PAUSE_S, 1.0)
            if name in UNDO:
                terminal.key(UNDO[name])
                terminal.quiet(PAUSE_S, 1.0)
    terminal.end()
    return found


async def pilot_keys(path: Path, count: int) -> Times:
    """Times from a key that reaches the app until the next frame is handed on, under the pilot."""
    from tui.desk.app import Desk
    from tui.workflow.session import Session

    drawn = asyncio.Event()
    found: Times = {name: [] for name in MOVES}
    with Session.open(str(path), "heron") as session:
        app = Desk(session)
        display = app._display

        def watched(screen, renderable):
            display(screen, renderable)
            if renderable is not None:
                drawn.set()

        app._display = watched
        async with app.run_test(size=(80, 24)) as pilot:
            await pilot.pause(1.5)
            for _ in range(count // len(MOVES)):
                for name in ("down", "page down", "end", "home"):  # each moves, whatever came before
                    drawn.clear()
                    started = time.perf_counter()
                    app.post_message(events.Key(name.replace(" ", ""), None))
                    await asyncio.wait_for(drawn.wait(), 10)
                    found[name].append((time.perf_counter() - started) * 1e3)
                    await asyncio.sleep(PAUSE_S)
    return found


def opened_keys(path: Path, size: tuple[int, int]) -> Times:
    """Times on candidates' pages: opening them, and the keys pressed while their evidence is computed."""
    terminal = Terminal(DESK, [str(path)], size)
    terminal.wait_for(b"SM-0")
    terminal.quiet(1.5)
    found: Times = {"opening": [], "first opened, a key meanwhile": [], "a key meanwhile": []}
    for number in range(OPENED):
        found["opening"].append(terminal.key(b"\r"))
        kind = "a key meanwhile" if number else "first opened, a key meanwhile"
        for sent in (b"i", b"x", b"b", b"d", b"s") * (4 if not number else 2):
            terminal.quiet(0.03, 0.1)
            found[kind].append(terminal.key(sent))
        terminal.quiet(0.5, 5.0)
        terminal.key(b"q")
        terminal.quiet(0.3, 2.0)
        terminal.key(b"\x1b[B")
        terminal.quiet(0.3, 2.0)
    terminal.end()
    return found


@contextmanager
def assessment(path: Path) -> Iterator[subprocess.Popen]:
    """`plainlight assess` on the same queue, once its first evidence is in the file."""
    process = subprocess.Popen(
        [sys.executable, "-m", "tui", "assess", str(path)], stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL,
        env=ENVIRONMENT, start_new_session=True,
    )  # fmt: skip
    try:
        with sqlite3.connect(f"{path.as_uri()}?mode=ro", uri=True) as connection:
            while process.poll() is None and not connection.execute("SELECT COUNT(*) FROM evidence").fetchone()[0]:
                time.sleep(0.2)
        yield process
    finally:
        if process.poll() is None:
            os.killpg(process.pid, 9)
        process.wait()


def keys(path: Path) -> None:
    """Keys with nothing else running."""
    for name, times in terminal_keys(path, KEYS).items():
        line(f"key, terminal, {name}", times)
    for name, times in asyncio.run(pilot_keys(path, KEYS)).items():
        line(f"key, pilot, {name}", times)


def busy(folder: Path) -> None:
    """Keys while evidence is computed, by another process and by the desk."""
    path = folder / "measured.db"
    make_measured(path, MEASURED)
    for size in ((80, 24), (200, 60)):
        for name, times in opened_keys(path, size).items():
            line(f"candidate {size[0]} x {size[1]}, {name}", times)
    with assessment(path) as process:
        shown = {"terminal": terminal_keys(path, KEYS), "pilot": asyncio.run(pilot_keys(path, KEYS))}
        still = process.poll() is None
    for where, found in shown.items():
        for name, times in found.items():
            line(f"key while assessing, {where}, {name}", times)
        line(f"key while assessing, {where}, all", [one for times in found.values() for one in times])
    print(f"{'':<4}the assessment ran {'to the end of it' if still else 'only for a part of it'}")


# --- lists ---


def searched(path: Path) -> Times:
    """Times of a search on a pseudo-terminal: of each letter's repaint, and from all letters at once to their list."""
    terminal = Terminal(DESK, [str(path)])
    terminal.wait_for(b"SM-0")
    terminal.quiet(1.5)
    found: Times = {"search, a letter": [], "search, beginning": [], "search, inside": []}
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


async def whole_lists(path: Path) -> Times:
    """Times from a key to the whole list that it asks for, under the pilot."""
    from tui.desk.app import Desk
    from tui.workflow.session import Session

    found: Times = {}
    with Session.open(str(path), "heron") as session:
        app = Desk(session)
        async with app.run_test(size=(80, 24)) as pilot:
            queue = app.screen
            await pilot.pause()
            while queue.is_ordering or not queue.counts:
                await asyncio.sleep(0.001)
            for action in ("order", "reverse", "all", "unresolved('blend')", "needs_me", "all"):
                started = time.perf_counter()
                await queue.run_action(action)
                while queue.is_ordering:
                    await asyncio.sleep(0.001)
                found.setdefault(f"whole list, {action}", []).append((time.perf_counter() - started) * 1e3)
    return found


def lists(path: Path) -> None:
    """Searches and whole lists."""
    for name, times in (searched(path) | asyncio.run(whole_lists(path))).items():
        line(name, times)


def main(rows: int, parts: set[str]) -> None:
    """Measure and print."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        path = folder / "long.db"
        make_long(path, rows)
        print(f"{rows:,} rows, {os.cpu_count()} cores")
        print(f"{'milliseconds':<44}{'best':>8}{'median':>9}{'p99':>9}{'of':>6}{'load':>8}")
        for part, measure, given in (("starts", starts, path), ("keys", keys, path), ("busy", busy, folder),
                                     ("lists", lists, path)):  # fmt: skip
            if not parts or part in parts:
                measure(given)
        print(f"peak memory {resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024:.0f} MB")


if __name__ == "__main__":
    given = sys.argv[1:]
    main(next((int(one) for one in given if one.isdigit()), 1_000_000), {one for one in given if not one.isdigit()})
