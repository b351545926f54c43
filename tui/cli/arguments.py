"""Arguments and options that several commands share."""

from __future__ import annotations

from typing import TYPE_CHECKING

import click

from tui.errors import HandleError
from tui.model import CHECKS, OUTCOMES

if TYPE_CHECKING:
    from tui.workflow.session import Session

queue_argument = click.argument("queue", type=click.Path())
name_argument = click.argument("name")
check_argument = click.argument("check", type=click.Choice(CHECKS))
as_option = click.option("--as", "handle", metavar="HANDLE", help="See, or rule, as this reviewer.")
json_option = click.option("--json", "as_json", is_flag=True, help="One JSON document, documented in the README.")
unresolved_option = click.option(
    "--unresolved", type=click.Choice(CHECKS), help="Only candidates on which this check is open or split."
)
outcome_option = click.option("--outcome", type=click.Choice((*OUTCOMES, "sealed")), help="Only this outcome.")
settled_option = click.option("--outcome", type=click.Choice(OUTCOMES), help="Only this outcome.")
controls_option = click.option(
    "--controls", type=click.Path(), metavar="TRUTH", help="Table of controls: name, nature."
)


def reader(queue: str, handle: str | None, *, write: bool = True) -> Session:
    """The queue opened by the handle given, else by the config file's if it joined this queue, else by nobody.

    Raises:
        HandleError: nobody joined under the handle given.
    """
    from tui.workflow.config import read_config
    from tui.workflow.session import Session

    configured = None if handle else read_config().handle
    if configured:
        try:
            return Session.open(queue, configured, write=write)
        except HandleError:  # it is of other queues
            return Session.open(queue, write=write)
    return Session.open(queue, handle, write=write)


def needed_handle(handle: str | None) -> str:
    """The handle to rule as; HandleError, saying how to give one, where there is none."""
    from tui.workflow.config import read_config

    found = handle or read_config().handle
    if not found:
        raise HandleError("", "Say who you are: --as HANDLE, or handle = \"...\" in your config file.")
    return found


def pairs(ctx: click.Context, param: click.Parameter, values: tuple[str, ...]) -> dict[str, str]:
    """A click callback: repeated NAME=VALUE as a dict."""
    found: dict[str, str] = {}
    for text in values:
        name, equals, value = text.partition("=")
        if not equals or not name.strip() or not value.strip():
            raise click.BadParameter(f"{text!r} is not of the form NAME=VALUE", ctx=ctx, param=param)
        found[name.strip()] = value.strip()
    return found


def share_of(ctx: click.Context, param: click.Parameter, text: str | None) -> tuple[int, int] | None:
    """A click callback: `I/N` as numbers; the queue says whether I is in range."""
    if text is None:
        return None
    index, _, of = text.partition("/")
    if not (index.isascii() and index.isdigit() and of.isascii() and of.isdigit()) or len(text) > 16:
        raise click.BadParameter(f"{text!r} is not of the form I/N, such as 2/3", ctx=ctx, param=param)
    return int(index), int(of)
