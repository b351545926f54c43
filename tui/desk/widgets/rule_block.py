"""The last lines of a candidate: what to look at, the caution, the ruling, and the keys that work now."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from tui.desk.text import RULING_WORDS, fit, safe
from tui.desk.widgets.rows import Row, Span, fit_row, hanging, row, row_width
from tui.model import Ruling

LABEL = 9  # columns of the words at the left


@dataclass(frozen=True, slots=True)
class RuleFacts:
    """What the ruling line says."""

    reader_only: str = ""  # how to join, for who has no handle
    waiting: str = ""  # why nothing can be ruled yet
    recording: bool = False
    chosen: str = ""
    note: str = ""
    own: Ruling | None = None
    stale: str = ""
    is_nodata: bool = False


def advice_rows(width: int, height: int, message: str, point: str, look: Sequence[str], caution: str) -> list[Row]:
    """What to look at (or what was just said, or the point under the cursor), then the caution, in `height` rows.

    Args:
        look: the same advice at less and less length; the first that fits is taken.
    """
    first, second = advice_parts(width, message, point, look, caution, height)
    for_first = max(1, height - len(second)) if second else height
    first = _cut(first, for_first, width)
    second = _cut(second, height - len(first), width)
    return [*first, *second] + [[] for _ in range(height - len(first) - len(second))]


def advice_parts(
    width: int, message: str, point: str, look: Sequence[str], caution: str, height: int
) -> tuple[list[Row], list[Row]]:
    """Advice and caution in full, each in as many rows as it takes; of `look` what leaves room in `height` rows."""
    second = _labelled(width, "CAUTION", caution, "caution") if caution else []
    if message:
        first = _labelled(width, "", message, "message")
    elif point:
        first = _labelled(width, "POINT", point, "")
    else:
        options = [_labelled(width, "LOOK AT", text, "") for text in look if text]
        short = [rows for rows in options if len(rows) <= max(1, height - len(second))]
        first = [*short, *options[-1:], [[]]][0]
    return first, second


def rule_row(width: int, facts: RuleFacts) -> Row:
    """The one line in which a ruling is chosen and recorded."""
    start = Span(" RULE".ljust(LABEL + 1), "head")
    line = [start, *_rule_words(facts)]
    if row_width(line) > width:
        line = [start, *_rule_words(facts, terse=True)]
    return _with_note(width, line, facts) if facts.note and not facts.reader_only else fit_row(line, width)


def key_rows(width: int, entries: Sequence[tuple[str, str, str]], lines: int = 2) -> list[Row]:
    """Keys with what they do, (key, label, action) each, on at most `lines` rows; nothing is cut in two.

    Where there is no room for all, those before the last two go: the last two lead out and to the help.
    """
    entries = list(entries)
    rows = _key_rows(width, entries)
    while len(rows) > lines and len(entries) > 2:
        del entries[-3]
        rows = _key_rows(width, entries)
    return (rows + [[] for _ in range(lines)])[:lines]


def _key_rows(width: int, entries: Sequence[tuple[str, str, str]]) -> list[Row]:
    rows: list[Row] = [[]]
    for key, label, action in entries:
        piece = [Span(key, "key", action), Span(f" {label}", "", action)]
        gap = Span("  " if rows[-1] else " ")
        if rows[-1] and row_width(rows[-1]) + len(gap.text) + row_width(piece) > width:
            rows.append([])
            gap = Span(" ")
        rows[-1] += [gap, *piece]
    return rows


def _labelled(width: int, label: str, text: str, style: str) -> list[Row]:
    return hanging([Span(f" {label}".ljust(LABEL + 1) if label else " ", "head")], text, width - 1, style)


def _cut(rows: list[Row], height: int, width: int) -> list[Row]:
    """The first rows; where more are left out the last one ends in dots."""
    if len(rows) <= height or height <= 0:
        return rows[: max(height, 0)]
    return [*rows[: height - 1], fit_row([*rows[height - 1], Span(" " * width)], width - 1, more=" ..")]


def _rule_words(facts: RuleFacts, terse: bool = False) -> Row:
    """What can be ruled now; `terse` for lines of 80 columns that would run over."""
    if facts.reader_only:
        return row((facts.reader_only, "quiet"))
    if facts.recording:
        return row((f"recording {RULING_WORDS.get(facts.chosen, facts.chosen)} ...", "message"))
    if facts.waiting:
        return row((facts.waiting, "quiet"))
    if facts.chosen:
        word = "take back" if facts.chosen == "withdrawn" else RULING_WORDS[facts.chosen]
        return row((f"> {word} <", "chosen"), "   ", ("Enter", "key", "record()"), (" records it", "", "record()"))
    gap = "  " if terse else "   "
    choices = row(
        ("e", "key", "choose('explains')"),
        (f" explains{gap}", "", "choose('explains')"),
        ("f", "key", "choose('short')"),
        (f" falls short{gap}", "", "choose('short')"),
        ("u", "key", "choose('unclear')"),
        (" unclear", "", "choose('unclear')"),
    )
    if facts.is_nodata:
        return row(("no data test this check, nothing need be ruled", "quiet"), "   ", *choices[4:])
    if facts.own is not None and facts.stale:
        ruled = RULING_WORDS[facts.own.ruling]
        return row(
            (f"stale: {ruled}" if terse else f"your {ruled} is stale", "caution"),
            gap,
            ("r", "key", "reaffirm()"),
            (f" it stands{gap}", "", "reaffirm()"),
            *choices,
        )
    if facts.own is not None:
        when = "" if terse else safe(facts.own.utc[:10])
        return row(
            ("you ruled ", "quiet"),
            (RULING_WORDS[facts.own.ruling], "strong"),
            (f" {when}   " if when else "   ", "quiet"),
            *choices,
        )
    return [*choices, Span("     choose, then Enter records", "quiet")]


def _with_note(width: int, line: Row, facts: RuleFacts) -> Row:
    """The note's beginning after the choice, as far as there is room."""
    note = safe(" / ".join(part for part in facts.note.splitlines() if part.strip()))
    room = width - row_width(line) - len("   note: ") - 1
    if room < 6 and facts.chosen == "":
        line = [span for span in line if "Enter records" not in span.text]
        room = width - row_width(line) - len("   note: ") - 1
    if room >= 4:
        line = [*line, Span("   note: ", "quiet"), Span(fit(note, room).rstrip())]
    return fit_row(line, width)
