"""The tally as text: is it done, can it be trusted, what is left, what it means."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from tui.cli.printing import NOTHING, figure, heading, line, table
from tui.model import CHECK_TITLES, CHECKS, OUTCOMES
from tui.workflow.counting import counted

if TYPE_CHECKING:
    from tui.workflow.tally_record import ReviewerLine, Tally

STATE_HEADINGS = ("none yet", "open", "split", "explains", "falls short", "untestable", "stale")


def print_tally(found: Tally) -> None:
    """Four questions, each with its numbers."""
    line(f"The team's tally, past every seal. {found.utc[:16].replace('T', ' ')} UTC")
    line(f"Quorum {found.quorum} sure rulings, of which {figure(100 * found.agree_share, 3)} % must agree.")
    if found.controls:
        verb = "is" if found.controls == 1 else "are"
        left = f"{counted(found.controls, 'controls')} {verb} left out where candidates are counted"
        line(f"{left}; agreement and what each reviewer ruled keep them.")
    print_progress(found)
    print_trust(found)
    print_survivors(found)
    heading("4 What it means")
    for text in found.meaning.sentences:
        line(text)


def print_progress(found: Tally) -> None:
    """Is it done?"""
    from tui.workflow.tally_record import STATES_SHOWN

    heading(
        f"1 Is it done?  {found.settled.text} of {found.candidates}, {found.under_way.text}, {found.untouched.text}"
    )
    rows = [(CHECK_TITLES[check], *(found.progress[check][state].count for state in STATES_SHOWN)) for check in CHECKS]
    table(("check", *STATE_HEADINGS), rows, numbers=range(1, len(STATE_HEADINGS) + 1))
    for held in found.holds:
        line(f"held up by: {held.text}" + (f" ({shortened(held.names)})" if held.names else ""))


def print_trust(found: Tally) -> None:
    """Can it be trusted?"""
    from tui.workflow.tally_record import trust_sentences

    heading("2 Can it be trusted?  first, sealed rulings only")
    for text in trust_sentences(found.agreement):
        line(text)
    print()
    headings = ("reviewer", "rulings", "candidates", "done", "last ruling (UTC)", "nature found", "wrongly explained")
    shown = len(headings) if found.controls else len(headings) - 2  # rates need controls
    table(headings[:shown], (reviewer_cells(one)[:shown] for one in found.reviewers), numbers=(1, 2, 3))


def reviewer_cells(one: ReviewerLine) -> tuple[object, ...]:
    """One reviewer; rates on controls only where the truth file was given."""
    rates = (rate_words(one.controls.hit), rate_words(one.controls.false)) if one.controls else (NOTHING, NOTHING)
    return (one.handle, one.rulings, one.candidates, one.done, one.last_utc[:16].replace("T", " ") or NOTHING, *rates)


def rate_words(rate: Any) -> str:
    """A share with its 95 % interval, in percent."""
    if rate.low is None or rate.high is None:
        return NOTHING
    return f"{rate.events}/{rate.trials} ({100 * rate.low:.0f} to {100 * rate.high:.0f} %)"


def print_survivors(found: Tally) -> None:
    """What is left?"""
    heading(f"3 What is left?  {found.survivors.text} of {found.settled.count} settled")
    table(("outcome", "candidates"), [(outcome, found.outcomes[outcome].count) for outcome in OUTCOMES], numbers=(1,))
    if found.survivors.names:
        print()
        rows = [(name, figure(found.q_values.get(name), 2)) for name in found.survivors.names]
        table(("unexplained", "q"), rows, numbers=(1,))


def shortened(names: tuple[str, ...], most: int = 5) -> str:
    """The first few names, and how many more."""
    text = ", ".join(names[:most])
    return text if len(names) <= most else f"{text} and {len(names) - most} more"
