"""Where faults of the program itself are written down for whoever mends it, while the work goes on."""

from __future__ import annotations

import platform
import traceback
from pathlib import Path

from tui import __version__
from tui.workflow.clock import utc_now

LONGEST = 1_000_000  # bytes: a longer file makes way for a new one
NAME = "desk-faults.txt"


def keep_fault(error: BaseException, what: str) -> Path:
    """Add one fault to the user's log file; the path of it.

    Args:
        what: the program was doing when it happened.
    Raises:
        OSError: the file cannot be written.
    """
    import platformdirs

    path = platformdirs.user_log_path("plainlight", ensure_exists=True) / NAME
    if path.exists() and path.stat().st_size > LONGEST:
        path.replace(path.with_suffix(".old.txt"))
    with path.open("a", encoding="utf-8", errors="replace") as stream:
        stream.write(entry(error, what))
    return path


def entry(error: BaseException, what: str) -> str:
    """One fault as text: when, in which program, doing what, and the traceback."""
    head = f"{utc_now()} Plainlight {__version__}, Python {platform.python_version()}: {what}"
    return "\n".join([head, "".join(traceback.format_exception(error)), ""])
