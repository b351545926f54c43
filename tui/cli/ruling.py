"""Commands that rule: rule, and review, which opens the desk."""

from __future__ import annotations

import gc
import logging
import os
import sys
from typing import TYPE_CHECKING

import click

from tui.cli.arguments import as_option, check_argument, name_argument, needed_handle, queue_argument
from tui.errors import InputError
from tui.model import RULINGS

if TYPE_CHECKING:
    from tui.desk.app import Desk

NO_DESK = (
    "The desk needs a terminal that can place text (TERM=dumb or a pipe cannot). Everything in it can be done by "
    "commands: plainlight list QUEUE --next, show QUEUE NAME, rule QUEUE NAME CHECK RULING, story, tally, export."
)


@click.command("rule")
@queue_argument
@name_argument
@check_argument
@click.argument("ruling", type=click.Choice(RULINGS))
@as_option
@click.option("--note", default="", metavar="TEXT", help="Why.")
def rule_command(queue: str, name: str, check: str, ruling: str, handle: str | None, note: str) -> int:
    """Record a ruling on one check of one candidate; lacking evidence is computed first.

    `withdrawn` takes back your ruling.
    """
    from tui.cli.printing import line
    from tui.workflow.session import Session

    with Session.open(queue, needed_handle(handle)) as session:
        made = session.withdraw(name, check, note) if ruling == "withdrawn" else session.rule(name, check, ruling, note)
        line(f"Recorded: {session.reviewer.handle} rules {made.candidate} {made.check} {made.ruling}. {made.id}")
    return 0


@click.command("review")
@queue_argument
@as_option
@click.option("--thin", is_flag=True, help="For slow lines: no mouse tracking, no animation, fewer bytes.")
def review_command(queue: str, handle: str | None, thin: bool) -> int:
    """The desk: walk the candidates that need you, in the terminal."""
    from tui.cli.printing import line, remark
    from tui.workflow.config import read_config

    config = read_config()
    handle = needed_handle(handle or config.handle)
    refuse_without_terminal()
    gc.disable()  # much is imported now and nothing can be collected of it; the desk enables it once it has drawn
    from tui.workflow.session import READ_ONLY, Session

    with Session.open(queue, handle) as session:
        if session.read_only:
            remark(f"{queue} is {READ_ONLY}.")
        status = open_desk(session, thin=thin, theme=config.theme, keys=config.keys)
        if session.has_ruled():
            line(f"Your receipt: {session.receipt()}")
            line(f"Keep it; plainlight audit {queue} --receipt RECEIPT shows later that nothing of yours was lost.")
    return status


def refuse_without_terminal() -> None:
    """InputError, naming the commands that do the same, where no terminal can show the desk."""
    if not has_terminal():
        raise InputError(NO_DESK)


def has_terminal() -> bool:
    """Whether there is a terminal that can place text."""
    return sys.stdin.isatty() and sys.stdout.isatty() and os.environ.get("TERM", "dumb") not in ("", "dumb")


def open_desk(session, *, thin: bool, theme: str | None, keys) -> int:
    """Run the desk until the reviewer leaves; its return code is the exit status."""
    from tui.desk.app import Desk
    from tui.workflow.config import named_config

    with named_config():
        desk = Desk(session, thin=thin, theme=theme, keys=keys)
    return run_desk(desk)


def run_desk(desk: Desk) -> int:
    """Run one until whoever sits there leaves; its return code is the exit status."""
    logging.getLogger("asyncio").addHandler(logging.NullHandler())  # what nobody waited for was said on the screen
    desk.run()
    return desk.return_code or 0
