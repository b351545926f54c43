"""The group of all commands, and the one door through which every error leaves: a sentence, never a traceback."""

from __future__ import annotations

import errno
import importlib
import os
import sqlite3
import sys
import traceback
from collections.abc import Sequence
from typing import Any

import click

from tui import __version__
from tui.errors import TuiError, reason_of

DONE, FAULTS, WRONG_USE = 0, 1, 2
INTERRUPTED = 130  # 128 + SIGINT, as shells say it; by SIGTERM too
NO_ROOM = (errno.ENOSPC, errno.EDQUOT, errno.EFBIG, errno.EIO)

COMMANDS = {  # name -> module of tui.cli that holds it, what it does; in the order of a vetting round
    "demo": ("demo", "Open a copy of the sample queue, or say what is in it."),
    "load": ("filling", "Create or extend a queue from tables."),
    "assess": ("filling", "Compute evidence that is lacking or outdated."),
    "join": ("filling", "Become a reviewer."),
    "list": ("looking", "The queue as text."),
    "show": ("looking", "One candidate's evidence."),
    "rule": ("ruling", "Record a ruling on one check of one candidate."),
    "probe": ("probing", "A fit with parameters fixed or bands dropped."),
    "review": ("ruling", "The desk: walk what needs you, in the terminal."),
    "set": ("keeping", "Settings, with every past value."),
    "tally": ("results", "Progress, agreement, survivors."),
    "export": ("results", "Write the vetted list."),
    "gather": ("keeping", "Take in what colleagues ruled in their copies."),
    "audit": ("keeping", "Integrity of file, chains and derived states."),
    "story": ("looking", "What happened to a candidate, in time order."),
}


class PlainGroup(click.Group):
    """A click group that finds its commands late and says every error as one or two plain sentences."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """All commands, in the order of a vetting round."""
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """Import the module of one command."""
        if cmd_name not in COMMANDS:
            return None
        module = importlib.import_module(f"tui.cli.{COMMANDS[cmd_name][0]}")
        return getattr(module, f"{cmd_name}_command")

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        """List the commands from the table above, so that help imports none of them."""
        with formatter.section("Commands"):
            formatter.write_dl([(name, words) for name, (_, words) in COMMANDS.items()])

    def main(self, args: Sequence[str] | None = None, prog_name: str | None = None, **extra: Any) -> Any:
        """Run a command and leave with its exit status."""
        extra["standalone_mode"] = False
        sys.exit(self._status(args, prog_name or "plainlight", extra))

    def _status(self, args: Sequence[str] | None, prog_name: str, extra: dict[str, Any]) -> int:
        try:
            status = super().main(args=args, prog_name=prog_name, **extra)
            return status if isinstance(status, int) else DONE
        except (KeyboardInterrupt, click.Abort):
            complain("Interrupted. What was already saved stays saved.")
            return INTERRUPTED
        except click.exceptions.NoArgsIsHelpError as error:
            print_help(error)
            return WRONG_USE
        except click.ClickException as error:
            complain(usage_sentence(error, sys.argv[1:] if args is None else args))
            return WRONG_USE
        except OSError as error:  # while help was printed
            return failed(error)
        except SystemExit:  # how click leaves when whoever read our output has gone
            return DONE

    def invoke(self, ctx: click.Context) -> int | None:
        """Run the chosen command; what it raises becomes a sentence and a status."""
        from tui.workflow.waiting import say_waits

        say_waits(complain)
        try:
            status = super().invoke(ctx)
            sys.stdout.flush()  # a full disk or a closed pipe is met here and not at interpreter exit
            return status
        except (TuiError, sqlite3.Error, OSError, MemoryError) as error:
            return failed(error)
        except (click.ClickException, click.exceptions.Exit, click.Abort):
            raise
        except Exception as error:  # a fault of the program: said, and kept whole for whoever mends it
            return fault(error)


def failed(error: BaseException) -> int:
    """Say an expected error; a reader that closed the pipe wants no more, and that is no error."""
    if is_broken_pipe(error):
        silence_stdout()
        return DONE
    if is_output_refused(error):
        silence_stdout()
    complain(sentence(error))
    return WRONG_USE


def is_broken_pipe(error: BaseException) -> bool:
    """Whether whoever read our output has gone."""
    return isinstance(error, BrokenPipeError) or getattr(error, "errno", None) == errno.EPIPE


def is_output_refused(error: BaseException) -> bool:
    """Whether standard output could not be written: what the program opens itself is named in its errors."""
    return isinstance(error, OSError) and error.filename is None and error.errno in NO_ROOM


def silence_stdout() -> None:
    """Point standard output at nothing, so that the interpreter's last flush stays quiet."""
    try:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    except (OSError, ValueError):  # no real file behind it
        sys.stdout = open(os.devnull, "w", encoding="utf-8")  # noqa: SIM115 - lives until exit


def complain(text: str) -> None:
    """One line on standard error, safe for a terminal."""
    from tui.workflow.safe_text import safe

    try:
        print(f"plainlight: {safe(text)}", file=sys.stderr, flush=True)
    except OSError:  # nobody listens there
        return


def print_help(error: click.ClickException) -> None:
    """The help that click holds ready where a command was named without anything, as it is."""
    try:
        print(error.format_message(), file=sys.stderr, flush=True)
    except OSError:  # nobody listens there
        return


def usage_sentence(error: click.ClickException, args: Sequence[str] = ()) -> str:
    """What was wrong with the command as typed, and where to read how it goes.

    Args:
        args: as typed, for the name of the command where click does not know it any more.
    """
    text = " ".join(error.format_message().split())  # click puts each choice on a line of its own
    text = text if text.endswith((".", "?", "!")) else f"{text}."
    context = getattr(error, "ctx", None)
    typed = next((f"plainlight {word}" for word in args[:1] if word in COMMANDS), "plainlight")
    return f"{text} Try: {context.command_path if context else typed} --help"


def sentence(error: BaseException) -> str:
    """An expected error in plain words, with the file and the mend where they are known."""
    if isinstance(error, TuiError):
        return str(error)
    if isinstance(error, MemoryError):
        return "There was not enough memory. Close other programs, or work on a smaller table."
    if isinstance(error, sqlite3.Error):
        return sqlite_sentence(error)
    return os_sentence(error)


def sqlite_sentence(error: sqlite3.Error) -> str:
    """SQLite's complaint with the mend; nothing was written when one is raised."""
    text = str(error)
    if "locked" in text or "busy" in text:
        return "The queue is locked by another program. Nothing was written; try again when it has finished."
    if "full" in text:
        return "The disk is full. Nothing was written; make room and try again."
    if "readonly" in text:
        return "The queue file may only be read. Copy it to a folder you may write to, or ask its owner."
    return f"The queue file could not be used: {text}. plainlight audit QUEUE says more."


def os_sentence(error: BaseException) -> str:
    """The operating system's complaint: the file, what is wrong with it, and the mend."""
    name = getattr(error, "filename", None)
    reason = getattr(error, "strerror", None) or str(error)
    place = f"{os.fsdecode(name)}: " if isinstance(name, (str, bytes)) else ""
    if is_output_refused(error):
        place = "Standard output: "
    mend = {
        errno.ENOSPC: "Make room on the disk and try again.",
        errno.ENOENT: "Check the path.",
        errno.EACCES: "Check who may read and write it.",
        errno.EISDIR: "Name a file, not a folder.",
    }.get(getattr(error, "errno", None), "Check the path and try again.")
    return f"{place}{reason}. {mend}"


def fault(error: Exception) -> int:
    """A fault of the program itself: one sentence here, the whole of it in a file."""
    where = kept_traceback(error)
    complain(f"Plainlight failed through a fault of its own ({type(error).__name__}: {error}). {where}")
    return WRONG_USE


def kept_traceback(error: Exception) -> str:
    """Write the traceback to the user's log folder; says where, or that it could not."""
    try:
        import platformdirs

        path = platformdirs.user_log_path("plainlight", ensure_exists=True) / "fault.txt"
        path.write_text("".join(traceback.format_exception(error)), encoding="utf-8", errors="replace")
    except (OSError, ImportError) as refused:
        return f"Its details could not be kept: {reason_of(refused)}."
    return f"Please send {path} to whoever maintains it."


@click.group(
    cls=PlainGroup,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
    epilog="QUEUE is one SQLite file. Exit status: 0 done, 1 done with rows refused or faults found, 2 wrong use, "
    "130 interrupted.",
)
@click.version_option(__version__, prog_name="plainlight", message="%(prog)s %(version)s")
def cli() -> None:
    """Vet odd stars together: explain each one away, with numbers, or keep it as unexplained."""
