"""The command that fits by hand: probe."""

from __future__ import annotations

import click

from tui.cli.arguments import check_argument, name_argument, pairs, queue_argument
from tui.errors import InputError


@click.command("probe")
@queue_argument
@name_argument
@check_argument
@click.option("--fix", multiple=True, callback=pairs, metavar="PARAM=VALUE", help="Hold a parameter; repeat for more.")
@click.option("--drop", multiple=True, metavar="BAND", help="Leave a band out; repeat for more.")
@click.option("--model", metavar="NAME", help="This model of the check, not the leading one.")
def probe_command(
    queue: str, name: str, check: str, fix: dict[str, str], drop: tuple[str, ...], model: str | None
) -> int:
    """A fit with parameters fixed or bands dropped, with intervals: --fix T=450 --drop W3. Nothing is stored.

    It begins from the model that leads in the evidence; show lists the others.
    """
    from tui.cli.dossier import print_fits
    from tui.cli.printing import line, signed, table
    from tui.workflow.by_command import probe_by_command
    from tui.workflow.session import Session

    fixed = {parameter: number(parameter, text) for parameter, text in fix.items()}
    with Session.open(queue, write=False) as session:
        fit = probe_by_command(session, name, check, fixed, dropped_bands(drop), model)
    line(f"{name}: {check} by hand" + (f", without {', '.join(drop)}" if drop else ""))
    print_fits([fit])
    table(("band", "pull"), [(band, signed(pull)) for band, pull in fit.pulls.items()], numbers=(1,))
    return 0


def number(parameter: str, text: str) -> float:
    """The value of a fixed parameter. InputError where it is no number."""
    try:
        value = float(text)
    except ValueError:
        value = float("nan")
    if not abs(value) < float("inf"):
        raise InputError(f"--fix {parameter}={text}: the value must be a finite number.")
    return value


def dropped_bands(given: tuple[str, ...]) -> frozenset[str]:
    """Bands as typed, several to one --drop allowed with commas."""
    return frozenset(part.strip() for text in given for part in text.split(",") if part.strip())
