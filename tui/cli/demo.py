"""The command that shows the program at work on a copy of the sample: demo."""

from __future__ import annotations

import os
import sys

import click


@click.command("demo", short_help="Open a copy of the sample queue, or say what is in it.")
@click.option("--thin", is_flag=True, help="For slow lines.")
def demo_command(thin: bool) -> int:
    """Open a copy of the sample queue as `visitor`; a text summary when there is no terminal."""
    from tui.workflow.demo import sample_copy

    path = sample_copy()
    if not (sys.stdin.isatty() and sys.stdout.isatty()) or os.environ.get("TERM", "dumb") in ("", "dumb"):
        from tui.cli.demo_text import print_summary

        print_summary(path)
        return 0
    from tui.cli.ruling import open_desk
    from tui.workflow.config import read_config
    from tui.workflow.demo import VISITOR
    from tui.workflow.session import Session

    config = read_config()
    with Session.open(str(path), VISITOR) as session:
        return open_desk(session, thin=thin, theme=config.theme, keys=config.keys)
