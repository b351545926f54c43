"""Commands that fill a queue: load, assess, join."""

from __future__ import annotations

import click

from tui.cli.arguments import queue_argument
from tui.model import KINDS

SHOWN = 20  # refusals printed; a file takes all of them

@click.command("load")
@queue_argument
@click.argument("tables", nargs=-1, type=click.Path(), metavar="TABLE...")
@click.option("--columns", type=click.Path(), metavar="MAP.toml", help="Column map: [columns], [units], [source].")
@click.option("--source", metavar="LABEL", help="Source label of the measurements.")
@click.option("--refused", type=click.Path(), metavar="FILE", help="Write refused rows there instead of to stderr.")
@click.option("--dips", type=click.Path(), multiple=True, metavar="TABLE", help="Table of dips.")
@click.option("--neighbours", type=click.Path(), multiple=True, metavar="TABLE", help="Table of neighbours.")
@click.option("--spectra", type=click.Path(), multiple=True, metavar="TABLE", help="Table of low-resolution spectra.")
@click.option("--cutouts", type=click.Path(), metavar="DIR", help="Folder of FITS pictures NAME_BAND.fits.")
def load_command(queue, tables, columns, source, refused, dips, neighbours, spectra, cutouts) -> int:
    """Create or extend QUEUE from tables (VOTable, FITS, ECSV, CSV, TSV); the same table twice adds nothing."""
    from tui.cli.printing import line, progress, remark
    from tui.workflow.loading import Sidecars, load, write_refused

    sidecars = Sidecars(tuple(dips), tuple(neighbours), tuple(spectra), cutouts)
    if not tables and sidecars == Sidecars():
        raise click.UsageError("name at least one table to load", ctx=click.get_current_context())
    with progress("loading") as report:
        done = load(queue, tables, columns=columns, source=source, sidecars=sidecars, report=report)
    line(done.sentence())
    for text in done.remarks:
        remark(text)
    if refused:
        write_refused(refused, done.refused)
        if done.refused:
            remark(f"{len(done.refused)} refused: see {refused}.")
    else:
        for row in done.refused[:SHOWN]:
            remark(row)
        if len(done.refused) > SHOWN:
            remark(f"{len(done.refused)} refused, of which these are the first {SHOWN}; all of them: --refused FILE.")
    return 1 if done.refused else 0


@click.command("assess")
@queue_argument
@click.option("--only", type=click.Choice(KINDS), multiple=True, metavar="CHECK", help="Only this kind of evidence.")
@click.option("--jobs", type=click.IntRange(1, 256), metavar="N", help="Processes; by default as a long queue needs.")
def assess_command(queue: str, only: tuple[str, ...], jobs: int | None) -> int:
    """Compute the evidence that is lacking or outdated."""
    from tui.cli.printing import line, progress
    from tui.workflow.assessing import assess_queue
    from tui.workflow.loading import holds_candidates

    with progress("assessing") as report:
        done = assess_queue(queue, kinds=only or KINDS, jobs=jobs, report=report)
    line(done.sentence() if done.candidates or holds_candidates(queue) else f"{queue} holds no candidates.")
    return 0


@click.command("join")
@queue_argument
@click.argument("handle")
def join_command(queue: str, handle: str) -> int:
    """Become a reviewer of QUEUE under HANDLE (a-z, 0-9, _ and -, at most 32)."""
    from tui.cli.printing import line
    from tui.workflow.joining import join

    reviewer = join(queue, handle)
    line(f"{reviewer.handle} joined {queue}. Begin with: plainlight review {queue} --as {reviewer.handle}")
    return 0
