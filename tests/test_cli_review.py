"""The desk through the command: in a real terminal of 80 by 24 it opens, is left by a key, and gives a receipt."""

from __future__ import annotations

import fcntl
import os
import pty
import select
import struct
import sys
import termios
import time
from contextlib import closing

import pyte
import pytest

from tui.model import CHECKS, Candidate, Evidence, Fit, Measurement, digest
from tui.store.candidates import save_candidates
from tui.store.connect import open_queue
from tui.store.evidence import save_evidence
from tui.store.records import LoadRecord
from tui.store.reviewers import add_reviewer
from tui.workflow.session import Session

UTC = "2026-01-01T00:00:00.000000Z"
PATIENCE_S = 60.0  # for a screen on a busy machine
NAME = "SM-[/]-星"


class Terminal:
    """A command in a terminal of its own; what it shows is kept as a person would see it."""

    def __init__(self, *arguments, **environment):
        self.screen = pyte.Screen(80, 24)
        self.stream = pyte.ByteStream(self.screen)
        self.raw = b""
        self.pid, self.master = pty.fork()
        if self.pid == 0:
            os.environ.update({"TERM": "xterm-256color", **environment})
            os.execv(sys.executable, [sys.executable, "-m", "tui", *arguments])
        fcntl.ioctl(self.master, termios.TIOCSWINSZ, struct.pack("HHHH", 24, 80, 0, 0))

    def read(self, seconds):
        """Take in what arrives within some time; False when the command has ended."""
        ready, _, _ = select.select([self.master], [], [], seconds)
        if not ready:
            return True
        try:
            arrived = os.read(self.master, 65536)
        except OSError:
            return False
        self.raw += arrived
        self.stream.feed(arrived)
        return bool(arrived)

    def until(self, words):
        """Wait until the screen shows some words."""
        end = time.monotonic() + PATIENCE_S
        while words not in "\n".join(self.screen.display):
            if time.monotonic() > end or not self.read(0.1):
                pytest.fail(f"{words!r} never came:\n" + "\n".join(self.screen.display))

    def press(self, keys):
        os.write(self.master, keys.encode())

    def status(self):
        """Read to the end; the exit status."""
        end = time.monotonic() + PATIENCE_S
        while self.read(0.1):
            if time.monotonic() > end:
                pytest.fail("the command did not end")
        os.close(self.master)
        return os.waitstatus_to_exitcode(os.waitpid(self.pid, 0)[1])


@pytest.fixture
def queue(tmp_path, monkeypatch):
    monkeypatch.setenv("PLAINLIGHT_CONFIG", str(tmp_path / "none.toml"))
    path = str(tmp_path / "q.db")
    measured = (Measurement("J", 1.0, 0.02), Measurement("W3", 1.0, 0.02))
    with closing(open_queue(path, create=True)) as connection:
        save_candidates(connection, [LoadRecord(Candidate(NAME, measured), "t")], UTC)
        fit = Fit("star", 20.0, 5, 1e-6, 24.0, 25.0, {}, {"W3": 8.0})
        rows = [(NAME, Evidence(kind, 1, False, (fit,), (), {}, digest([kind]), ("J", "W3"))) for kind in CHECKS]
        save_evidence(connection, rows)
        add_reviewer(connection, "heron", UTC)
    return path


def test_the_desk_opens_is_left_by_a_key_and_leaves_the_terminal_whole(queue):
    terminal = Terminal("review", queue, "--as", "heron")
    terminal.until("SM-")
    terminal.press("qq")
    assert terminal.status() == 0
    assert terminal.raw.endswith(b"\n") or b"\x1b[?1049l" in terminal.raw
    assert b"receipt" not in terminal.raw


def test_who_has_ruled_gets_a_receipt_on_leaving(queue):
    with Session.open(queue, "heron") as session:
        session.rule(NAME, "dust", "short", "", session.stored_evidence(NAME)["dust"].digest)
        receipt = session.receipt()
    terminal = Terminal("review", queue, "--as", "heron", COLUMNS="80")
    terminal.until("SM-")
    terminal.press("qq")
    assert terminal.status() == 0
    assert receipt in terminal.raw.decode().replace("\r\n", "")


def test_a_dumb_terminal_is_refused_in_one_sentence(queue):
    terminal = Terminal("review", queue, "--as", "heron", TERM="dumb")
    assert terminal.status() == 2
    assert b"plainlight list QUEUE" in terminal.raw.replace(b"\r\n", b"") and b"\x1b[?1049h" not in terminal.raw


def test_list_at_a_terminal_fits_80_columns_and_cuts_no_name(queue):
    terminal = Terminal("list", queue, "--as", "heron")
    assert terminal.status() == 0
    shown = [line.rstrip() for line in terminal.screen.display if line.strip()]
    assert shown[0].split() == "name odd most in star instr extin blend wdust outcome yours".split()
    assert shown[1].split()[0] == NAME.replace("星", "星 ").strip() and shown[1].endswith("0/5") and len(shown) == 2


def test_no_colour_is_shown_where_none_is_wanted(queue):
    terminal = Terminal("list", queue, "--as", "heron", NO_COLOR="1")
    assert terminal.status() == 0 and b"\x1b[3" not in terminal.raw
