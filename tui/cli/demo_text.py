"""What is in the sample, as text: for a pipe, a log, or a terminal that cannot place text."""

from __future__ import annotations

from pathlib import Path

from tui.cli.looking import print_short
from tui.cli.printing import heading, line

SHOWN = 10  # oddest candidates listed
RULED = {"explains": "explains it", "short": "falls short", "unclear": "is unclear"}
NEXT_STEPS = (
    ("plainlight demo", "in a terminal: opens a copy of this queue as visitor"),
    ("plainlight demo --practice", "three stars to learn on, with answers"),
    ("plainlight load my.db table.vot", "begin a queue of your own"),
    ("plainlight --help", "every command"),
)


def print_practice() -> None:
    """The practice stars with their answers, where no terminal can show them."""
    from tui.model import CHECK_TITLES
    from tui.workflow.practice import practice_stars

    line("Practice stars belong to no queue. In a terminal the answers follow your own rulings.")
    for star in practice_stars():
        heading(f"{star.name}: {star.title}")
        for check, answer in star.answers.items():
            line(f"{CHECK_TITLES[check]} {RULED[answer.ruling]}: {answer.why}")
        line(star.told)


def print_summary(path: Path) -> None:
    """How many candidates, which are oddest, who ruled, what is settled, and how to go on."""
    from tui.workflow.demo import VISITOR
    from tui.workflow.session import Session

    with Session.open(str(path), VISITOR, write=False) as session:
        counts = session.counts()
        line(f"Saltmarsh, an invented survey: {counts['all']} candidates, {counts['needs_me']} need a new reviewer.")
        team = ", ".join(one.handle for one in session.reviewers() if one.handle != VISITOR)
        line(f"Reviewers so far: {team}. What they ruled stays sealed until you have ruled yourself.")
        heading(f"The {SHOWN} oddest, as a new reviewer sees them")
        print_short(session.rows(session.order()[:SHOWN]))
        heading("Where the team stands")
        newest = max((one.last_utc for one in session.tally().reviewers), default="")
        for text in session.tally(now=newest or None).sentences():  # its reviewers are quiet since it was made
            line(text)
    heading("Go on with")
    for command, meaning in NEXT_STEPS:
        line(f"  {command:<34}{meaning}")
