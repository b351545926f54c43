"""Commands that keep a queue in order: set, gather, audit."""

from __future__ import annotations

import click

from tui.cli.arguments import as_option, handle_or_configured, pairs, queue_argument


@click.command("set")
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
        line(setting.write(queue, name, value, handle_or_configured(handle)))
        return 0
    table(("set (UTC)", "by", "value"), setting.history(queue, name))
    return 0


@click.command("gather")
@queue_argument
@click.argument("others", nargs=-1, required=True, type=click.Path(), metavar="OTHER...")
@click.option("--rename", multiple=True, callback=pairs, metavar="OLD=NEW", help="Give a reviewer of OTHER another handle.")
def gather_command(queue: str, others: tuple[str, ...], rename: dict[str, str]) -> int:
    """Take in what colleagues ruled in their own copies; order and repetition do not matter."""
    from tui.cli.printing import line
    from tui.workflow.gathering import gather_all

    for done in gather_all(queue, others, rename):
        line(done.sentence())
    return 0


@click.command("audit")
@queue_argument
@click.option("--receipt", metavar="RECEIPT", help="Check a receipt, or with a HANDLE print that reviewer's.")
@click.option("--repair", is_flag=True, help="Rebuild the derived tables from the log.")
@click.option("--backup", type=click.Path(), metavar="FILE", help="Write a one-file copy while others work.")
def audit_command(queue: str, receipt: str | None, repair: bool, backup: str | None) -> int:
    """Integrity of the file, of every reviewer's chain of rulings, and of the derived states."""
    from tui.cli.printing import line, remark
    from tui.workflow import auditing

    if backup:
        line(auditing.write_backup(queue, backup))
    if receipt:
        line(auditing.check_or_print_receipt(queue, receipt))
        return 0
    done = auditing.audit_queue(queue, repair=repair)
    for text in done.lines:
        line(text)
    for text in done.faults:
        remark(text)
    return 1 if done.faults else 0
