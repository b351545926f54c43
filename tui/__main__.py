"""`plainlight` and `python -m tui`."""

from __future__ import annotations

import sys
import warnings


def main() -> None:
    """Run the command line and exit with its status."""
    if not sys.warnoptions:
        warnings.simplefilter("ignore")  # libraries' remarks are not for the person at the terminal
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="replace")  # a terminal that cannot show a letter shows a question mark
    from tui.cli.group import cli

    cli.main()


if __name__ == "__main__":
    main()
