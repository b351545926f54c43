"""Every error leaves as one or two plain sentences with the right status, never as a traceback."""

from __future__ import annotations

import errno
import os
import shutil
import signal
import sqlite3
import subprocess
import sys

import click
import pytest
from click.testing import CliRunner

from tui.cli import group
from tui.cli.group import cli
from tui.errors import StoreError

RUN = (sys.executable, "-m", "tui")


@pytest.fixture
def failing(monkeypatch):
    """A command `join` that raises what the test wants."""

    def make(error):
        @click.command("join")
        def join_command():
            raise error

        monkeypatch.setattr(cli, "get_command", lambda ctx, name: join_command)
        return CliRunner().invoke(cli, ["join"])

    return make


@pytest.mark.parametrize(
    ("error", "status", "words"),
    [
        (StoreError("q.db is damaged. Keep it."), 2, "q.db is damaged. Keep it."),
        (sqlite3.OperationalError("database is locked"), 2, "locked by another program"),
        (sqlite3.OperationalError("database or disk is full"), 2, "disk is full"),
        (OSError(errno.ENOSPC, "No space left on device", "out.csv"), 2, "out.csv: No space left on device. Make room"),
        (PermissionError(errno.EACCES, "Permission denied", "q.db"), 2, "q.db: Permission denied. Check who"),
        (MemoryError(), 2, "not enough memory"),
        (KeyboardInterrupt(), 130, "Interrupted"),
    ],
)
def test_an_expected_error_is_a_sentence(failing, error, status, words):
    result = failing(error)
    assert (result.exit_code, result.stdout) == (status, "")
    assert result.stderr.count("\n") <= 2 and "Traceback" not in result.stderr
    assert words in result.stderr


def test_a_fault_of_the_program_is_a_sentence_and_its_details_are_kept(failing, tmp_path, monkeypatch):
    monkeypatch.setattr("platformdirs.user_log_path", lambda *args, **kwargs: tmp_path)
    result = failing(ZeroDivisionError("by zero"))
    assert result.exit_code == 2 and result.stderr.count("\n") == 1 and "Traceback" not in result.stderr
    assert "ZeroDivisionError" in (tmp_path / "fault.txt").read_text()


def test_a_message_with_control_characters_cannot_reach_the_terminal(failing):
    assert "\x1b" not in failing(StoreError("no candidate 'x\x1b[2J'")).stderr


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["nonsense"], "No such command 'nonsense'"),
        (["export"], "Missing argument"),
        (["list", "q.db", "--sort", "beauty"], "beauty"),
        (["rule", "q.db", "SM-1", "dusty", "explains"], "dusty"),
        (["probe", "q.db", "SM-1", "dust", "--fix", "T"], "NAME=VALUE"),
        (["load", "q.db"], "at least one table"),
    ],
)
def test_wrong_use_says_where_to_read_on(arguments, words):
    result = CliRunner().invoke(cli, arguments)
    assert result.exit_code == 2
    assert words in result.stderr and "--help" in result.stderr and result.stderr.count("\n") == 1


def test_help_names_every_command_in_the_order_of_a_round():
    result = CliRunner().invoke(cli, ["--help"])
    places = [result.stdout.index(f"\n  {name} ") for name in group.COMMANDS]
    assert result.exit_code == 0 and places == sorted(places) and result.stdout.count("...") == 1


@pytest.mark.parametrize("name", list(group.COMMANDS))
def test_every_command_explains_itself(name):
    result = CliRunner().invoke(cli, [name, "--help"])
    assert result.exit_code == 0 and len(result.stdout.splitlines()) > 4


def test_a_reader_who_leaves_early_is_no_error():
    process = subprocess.Popen([*RUN, "--help"], stdout=subprocess.PIPE, stderr=subprocess.PIPE)
    process.stdout.close()
    with process.stderr:
        assert process.stderr.read() == b""
    assert process.wait(timeout=60) == 0


def test_a_full_disk_under_standard_output_is_said():
    if not os.path.exists("/dev/full"):
        pytest.fail("this test needs /dev/full")
    with open("/dev/full", "w") as full:
        done = subprocess.run([*RUN, "--help"], stdout=full, stderr=subprocess.PIPE, text=True, timeout=60)
    assert done.returncode == 2 and "Traceback" not in done.stderr
    assert "No space left" in done.stderr


def test_help_starts_without_the_heavy_libraries():
    code = (
        "import sys; from tui.cli.group import cli\ntry: cli.main(['--help'])\n"
        "except SystemExit: pass\nprint(sorted(sys.modules))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60)
    loaded = done.stdout.splitlines()[-1]
    for name in ("scipy", "astropy", "textual", "sqlite_utils", "pandas", "dust_extinction", "rich"):
        assert f"'{name}'" not in loaded, name


def test_no_command_at_all_prints_the_help_as_it_is():
    result = CliRunner().invoke(cli, [])
    assert result.exit_code == 2
    assert result.stderr.startswith("Usage: ") and "\n  assess " in result.stderr
    assert "\ufffd" not in result.stderr


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["rule", "q.db", "SM-1", "dust"], "explains, short, unclear, withdrawn. Try: cli rule --help\n"),
        (["audit", "q.db", "--receipt"], "requires an argument. Try: plainlight audit --help\n"),
    ],
)
def test_what_lacks_is_named_in_one_line(arguments, words):
    result = CliRunner().invoke(cli, arguments)
    assert result.exit_code == 2 and result.stderr.endswith(words)
    assert "\ufffd" not in result.stderr and result.stderr.count("\n") == 1


SAMPLE = os.path.join(os.path.dirname(os.path.dirname(os.path.abspath(__file__))), "sample_db", "saltmarsh.db")


@pytest.mark.parametrize("closed", [(1,), (0, 1, 2)])
def test_closed_streams_are_taken_for_a_reader_that_has_gone_and_the_queue_stays_whole(tmp_path, closed):
    queue = tmp_path / "q.db"
    shutil.copy(SAMPLE, queue)
    before = queue.read_bytes()

    def close():
        for number in closed:
            os.close(number)

    done = subprocess.run([*RUN, "list", str(queue)], stderr=subprocess.PIPE, preexec_fn=close)
    assert (done.returncode, done.stderr) == (0, b"")
    assert queue.read_bytes() == before


def test_a_full_disk_behind_standard_output_is_named(tmp_path):
    shutil.copy(SAMPLE, tmp_path / "q.db")
    with open("/dev/full", "w") as full:
        done = subprocess.run([*RUN, "list", str(tmp_path / "q.db")], stdout=full, stderr=subprocess.PIPE, text=True)
    assert done.returncode == 2
    assert done.stderr == "plainlight: Standard output: No space left on device. Make room on the disk and try again.\n"


def test_what_goes_wrong_beside_a_command_is_written_down_and_not_shown(tmp_path):
    code = (
        "import sys, threading, click; from tui.cli import group; from tui import __main__ as door\n"
        "from tui.errors import StoreError\n"
        "class Left:\n    def __del__(self): raise StoreError('q.db is damaged, says what is cleared away')\n"
        "def fail(): raise StoreError('q.db is damaged, says a thread')\n"
        "@click.command('join')\n"
        "def join():\n    one = threading.Thread(target=fail); one.start(); one.join(); left = Left(); del left\n"
        "group.cli.get_command = lambda ctx, name: join\n"
        "sys.argv = ['plainlight', 'join']; door.main()"
    )
    home = os.environ | {"HOME": str(tmp_path), "XDG_STATE_HOME": str(tmp_path), "XDG_CACHE_HOME": str(tmp_path)}
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, env=home)
    assert (done.returncode, done.stdout, done.stderr) == (0, "", "")
    kept = "".join(path.read_text() for path in tmp_path.rglob("*.txt"))
    assert "says a thread" in kept and "says what is cleared away" in kept


@pytest.mark.parametrize("number", [signal.SIGTERM, signal.SIGINT])
def test_ended_from_outside_it_says_so_and_leaves_no_other_word(tmp_path, number):
    code = (
        "import os, sys, signal; from tui.cli import group; from tui import __main__ as door; import click\n"
        "signal.signal(signal.SIGINT, signal.default_int_handler)  # a shell ignores it for what runs in its background\n"
        "@click.command('join')\n"
        f"def join(): os.kill(os.getpid(), {int(number)}); signal.pause()\n"
        "group.cli.get_command = lambda ctx, name: join\n"
        "sys.argv = ['plainlight', 'join']; door.main()"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60)
    assert (done.returncode, done.stdout) == (130, "")
    assert done.stderr.lstrip("\n") == "plainlight: Interrupted. What was already saved stays saved.\n"
