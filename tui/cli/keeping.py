"""Commands that keep a queue in order: set, gather, audit."""

from __future__ import annotations

import click

from tui.cli.arguments import as_option, pairs, queue_argument, reader


@click.command("set", context_settings={"ignore_unknown_options": True})  # so that a value may begin with a minus
@queue_argument
@click.argument("name", required=False)
@click.argument("value", required=False)
@as_option
def set_command(queue: str, name: str | None, value: str | None, handle: str | None) -> int:
    """All settings; with NAME its every value so far; with VALUE a new one."""
    from tui.cli.printing import line, table
    from tui.workflow import setting

    if name is None:
        table(("setting", "value", "meaning"), setting.overview(queue))
        return 0
    if value is not None:
        with reader(queue, handle, write=False) as session:
            by = session.reviewer.handle if session.reviewer else None
        line(setting.write(queue, name, value, by))
        return 0
    past = setting.history(queue, name)
    if past:
        table(("set (UTC)", "by", "value"), past)
    else:
        line(f"{name} was never set: the default holds.")
    return 0


@click.command("gather")
@queue_argument
@click.argument("others", nargs=-1, required=True, type=click.Path(), metavar="OTHER...")
@click.option("--rename", multiple=True, callback=pairs, metavar="OLD=NEW", help="Another handle for theirs.")
@click.option("--unrelated", is_flag=True, help="Take in a queue of other candidates too.")
def gather_command(queue: str, others: tuple[str, ...], rename: dict[str, str], unrelated: bool) -> int:
    """Take in what colleagues ruled in their own copies; order and repetition do not matter."""
    from tui.cli.printing import line
    from tui.workflow.gathering import gather_all

    for done in gather_all(queue, others, rename, unrelated=unrelated):
        line(done.sentence())
    return 0


@click.command("audit")
@queue_argument
@click.option("--receipt", "receipts", multiple=True, metavar="TEXT", help="Check a receipt, or a file of them.")
@click.option("--repair", is_flag=True, help="Rebuild the derived tables from the log.")
@click.option("--backup", type=click.Path(), metavar="FILE", help="Write a one-file copy while others work.")
def audit_command(queue: str, receipts: tuple[str, ...], repair: bool, backup: str | None) -> int:
    """Integrity of the file, of every reviewer's chain of rulings, and of the derived states.

    Prints each reviewer's receipt: kept elsewhere, it shows later whether a ruling was cut off.
    """
    from tui.cli.printing import line
    from tui.workflow import auditing

    if backup:
        line(auditing.write_backup(queue, backup))
    done = auditing.audit_queue(queue, repair=repair, receipts=receipts)
    for text in (*done.faults, *done.lines):
        line(text)
    return 1 if done.faults else 0
