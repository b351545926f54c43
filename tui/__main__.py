"""`plainlight` and `python -m tui`."""

from __future__ import annotations

import os
import signal
import sys
import threading
import warnings
from contextlib import suppress
from typing import Any


def main() -> None:
    """Run the command line and exit with its status."""
    fill_closed_streams()
    signal.signal(signal.SIGTERM, signal.default_int_handler)  # ended from outside: in order, as by ctrl+c
    if not sys.warnoptions:
        warnings.simplefilter("ignore")  # libraries' remarks are not for the person at the terminal
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="replace")  # a terminal that cannot show a letter shows a question mark
    sys.unraisablehook = threading.excepthook = keep_stray
    from tui.cli.group import cli

    cli.main()


def keep_stray(stray: Any) -> None:
    """Write down what went wrong in a thread, or in clearing away, where no command can say it any more."""
    from tui.workflow.fault_log import keep_fault

    if isinstance(stray.exc_value, Exception):
        with suppress(OSError):
            keep_fault(stray.exc_value, "beside a command")


def fill_closed_streams() -> None:
    """Give closed standard streams an end that swallows all: the next file opened, a queue, would take their place."""
    for number, name, mode in ((0, "stdin", "r"), (1, "stdout", "w"), (2, "stderr", "w")):
        try:
            os.fstat(number)
        except OSError:
            os.open(os.devnull, os.O_RDWR)  # takes the lowest number that is free: this one
        if getattr(sys, name) is None:
            setattr(sys, name, open(number, mode, encoding="utf-8", closefd=False))  # noqa: SIM115 - lives until exit


if __name__ == "__main__":
    main()
