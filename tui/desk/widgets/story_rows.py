"""What happened to a candidate, as rows: when, who, what, then the text as often as it takes lines."""

from __future__ import annotations

from typing import TYPE_CHECKING

from tui.desk.text import RULING_WORDS, SHORT_CHECKS, fit, safe
from tui.desk.widgets.rows import Row, Span, hanging

if TYPE_CHECKING:
    from tui.workflow.records import StoryLine

MARK_WIDE, TIME_WIDE, WHO_WIDE, WHAT_WIDE = 2, 17, 12, 15
NEW = "*"  # before what happened since the reader last ruled here


def story_rows(line: StoryLine, width: int) -> list[Row]:
    """One thing that happened."""
    when = safe(line.utc[:16].replace("T", " "))
    what = f"{safe(line.what)} {SHORT_CHECKS.get(line.check, safe(line.check))}".strip()
    head = [
        Span((NEW if line.since_mine else "").ljust(MARK_WIDE), "key"),
        Span(fit(when, TIME_WIDE), "quiet"),
        Span(fit(safe(line.who), WHO_WIDE - 1) + " ", "strong"),
        Span(fit(what, WHAT_WIDE - 1) + " "),
    ]
    return hanging(head, story_text(line), width)


def story_text(line: StoryLine) -> str:
    """What is told of it, a ruling in the words that the desk uses for it.

    >>> from tui.workflow.records import StoryLine
    >>> story_text(StoryLine("2026-03-01T10:00:00Z", "ruled", "heron", "star", "short: W3 is odd"))
    'falls short: W3 is odd'
    """
    if line.what not in ("ruled", "withdrawn"):
        return line.text
    first = next((ruling for ruling in RULING_WORDS if line.text.startswith(ruling)), "")
    return RULING_WORDS.get(first, "") + line.text[len(first) :]
