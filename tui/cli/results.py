"""Commands that say where the team stands: tally and export. Both are the team's, past every seal."""

from __future__ import annotations

import click

from tui.cli.arguments import controls_option, json_option, queue_argument, settled_option, unresolved_option


@click.command("tally")
@queue_argument
@controls_option
@json_option
def tally_command(queue: str, controls: str | None, as_json: bool) -> int:
    """Progress, agreement, survivors, and what they mean. This is the team's view: it looks past every seal."""
    from tui.cli import printing
    from tui.workflow.team_tally import team_tally

    found = team_tally(queue, controls)
    if as_json:
        printing.as_json(found.as_dict())
    else:
        from tui.cli.tally_text import print_tally

        print_tally(found)
    return 0


@click.command("export")
@queue_argument
@click.argument("out", type=click.Path())
@settled_option
@unresolved_option
@controls_option
@click.option("--force", is_flag=True, help="Replace OUT if it exists.")
def export_command(queue, out, outcome, unresolved, controls, force) -> int:
    """Write the vetted list: .ecsv .fits .vot .csv by ending. This is the team's view: it looks past every seal."""
    from tui.cli.printing import line, progress
    from tui.workflow.exporting import Selection, export

    with progress("exporting") as report:
        done = export(queue, out, Selection(outcome, unresolved, controls), force=force, report=report)
    line(done.sentence())
    return 0
