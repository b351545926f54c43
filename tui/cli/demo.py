"""The command that shows the program at work on a copy of the sample: demo."""

from __future__ import annotations

import tempfile
from pathlib import Path

import click


@click.command("demo")
@click.option("--thin", is_flag=True, help="For slow lines.")
@click.option("--practice", is_flag=True, help="Only the three practice stars, with the answer after each ruling.")
def demo_command(thin: bool, practice: bool) -> int:
    """Open a copy of the sample queue as `visitor`; a text summary when there is no terminal."""
    if practice:
        return practise(thin)
    from tui.cli.ruling import has_terminal, open_desk

    if not has_terminal():
        return summary_of_a_copy()
    from tui.cli.printing import line
    from tui.workflow.config import read_config
    from tui.workflow.demo import VISITOR, sample_copy
    from tui.workflow.session import Session

    config = read_config()
    path = sample_copy()
    with Session.open(str(path), VISITOR) as session:
        status = open_desk(session, thin=thin, theme=config.theme, keys=config.keys)
    line(f"Your copy of the sample stays at {path}; go on with: plainlight review {path} --as {VISITOR}")
    return status


def practise(thin: bool) -> int:
    """The desk with the practice stars alone; as text where there is no terminal."""
    from tui.cli.ruling import has_terminal

    if not has_terminal():
        from tui.cli.demo_text import print_practice

        print_practice()
        return 0
    from tui.cli.ruling import run_desk
    from tui.desk.practice_desk import PracticeDesk
    from tui.workflow.config import named_config, read_config

    config = read_config()
    with named_config():
        desk = PracticeDesk(thin=thin, theme=config.theme, keys=config.keys)
    return run_desk(desk)


def summary_of_a_copy() -> int:
    """Print what is in the sample, from a copy that is gone afterwards."""
    from tui.cli.demo_text import print_summary
    from tui.workflow.demo import sample_copy

    with tempfile.TemporaryDirectory(prefix="plainlight-demo-") as folder:
        print_summary(sample_copy(Path(folder)))
    return 0
