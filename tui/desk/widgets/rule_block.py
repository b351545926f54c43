"""The last lines of a candidate: what to look at, the caution, the ruling, and the keys that work now."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from tui.desk.text import RULING_WORDS, fit, safe
from tui.desk.widgets.rows import Row, Span, fit_row, hanging, row, row_width
from tui.model import Ruling

NOTE_ROOM = 20  # columns that the beginning of a note takes beside the choice
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
    recorded: tuple[str, ...] = ()  # what was just recorded, at less and less length
    with_others: bool = False  # the seal is open: whatever is ruled now is marked so
    is_done: bool = False  # with this candidate, and nothing to rule again


def advice_rows(
    width: int, height: int, message: str, point: str, look: Sequence[str], caution: str, keeps_look: bool = False
) -> list[Row]:
    """What to look at (or what was just said, or the point under the cursor), then the caution, in `height` rows.

    Args:
        look: the same advice at less and less length; the first that fits is taken.
        keeps_look: what to look at stands beneath what was just said, too.
    """
    first, second = advice_parts(width, message, point, look, caution, height, keeps_look)
    for_first = max(1, height - len(second)) if second else height
    first = _cut(first, for_first, width)
    second = _cut(second, height - len(first), width)
    return [*first, *second] + [[] for _ in range(height - len(first) - len(second))]


def advice_parts(
    width: int,
    message: str,
    point: str,
    look: Sequence[str],
    caution: str,
    height: int,
    keeps_look: bool = False,
) -> tuple[list[Row], list[Row]]:
    """Advice and caution in full, each in as many rows as it takes; of `look` what leaves room in `height` rows."""
    second = _labelled(width, "CAUTION", caution, "caution") if caution else []
    if message:
        first = _labelled(width, "", message, "message")
        first += _labelled(width, "LOOK AT", look[-1], "") if keeps_look and look[-1] else []
    elif point:
        first = _labelled(width, "POINT", point, "")
    else:
        options = [_labelled(width, "LOOK AT", text, "") for text in look if text]
        short = [rows for rows in options if len(rows) <= max(1, height - len(second))]
        first = [*short, *options[-1:], [[]]][0]
    return first, second


def rule_row(width: int, facts: RuleFacts) -> Row:
    """The one line in which a ruling is chosen and recorded, as much of it as there is room for."""
    start = Span(" RULE".ljust(LABEL + 1), "head")
    options = [[start, *words] for words in _rule_words(facts)]
    room = width - (NOTE_ROOM if facts.note and facts.chosen else 0)
    line = next((one for one in options if row_width(one) <= room), options[-1])
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


def _rule_words(facts: RuleFacts) -> list[Row]:
    """What can be ruled now, at less and less length."""
    if facts.reader_only:
        return [row((facts.reader_only, "quiet"))]
    if facts.recording:
        return [row((f"recording {RULING_WORDS.get(facts.chosen, facts.chosen)} ...", "message"))]
    if facts.waiting:
        return [row((facts.waiting, "quiet"))]
    if facts.chosen:
        word = "withdraw" if facts.chosen == "withdrawn" else RULING_WORDS[facts.chosen]
        marked = ", marked as made with others in view" if facts.with_others else ""
        short = ", others in view" if facts.with_others else ""
        return [
            row((f"> {word} <", "chosen"), "   ", ("Enter", "key", "record()"), (f" records it{said}", "", "record()"))
            for said in (marked, short)
        ]
    return [
        [*before, *_choices(gap, facts.is_nodata), *([Span(f"{gap}{hint}", style)] if hint else [])]
        for before, gap, hint, style in _arranged(facts)
    ]


def _choices(gap: str, only_unclear: bool) -> Row:
    choices = row(
        ("e", "key", "choose('explains')"),
        (f" explains{gap}", "", "choose('explains')"),
        ("f", "key", "choose('short')"),
        (f" falls short{gap}", "", "choose('short')"),
        ("u", "key", "choose('unclear')"),
        (" unclear", "", "choose('unclear')"),
    )
    return choices[4:] if only_unclear else choices


def _arranged(facts: RuleFacts) -> list[tuple[Row, str, str, str]]:
    """What stands before the choices, the gaps, what stands behind them and its style: longest first.

    What was just recorded goes last but for the choices.
    """
    befores = _before(facts)
    if facts.recorded:
        befores += [[]] if facts.own and not (facts.stale or facts.note) else []
        wanted = [(before, hint, "message") for hint in facts.recorded for before in befores]
    else:
        wanted = [(before, hint, "quiet") for before in befores for hint in _hints(facts)]
    wanted += [(before, "", "") for before in befores]
    return [(before, gap, hint, style) for before, hint, style in wanted for gap in ("   ", "  ")]


def _before(facts: RuleFacts) -> list[Row]:
    """How the reader's own ruling on this check stands."""
    if facts.is_nodata:
        return [row(("no data test this check, nothing need be ruled", "quiet"), "   ")]
    if facts.own is None:
        return [[]]
    ruled, stands = RULING_WORDS[facts.own.ruling], row(("r", "key", "reaffirm()"), (" it stands  ", "", "reaffirm()"))
    if facts.stale:
        return [
            [*row((f"your {ruled} is stale", "caution"), "  "), *stands],
            [*row((f"stale: {ruled}", "caution"), "  "), *stands],
        ]
    again = stands if facts.note else []
    dated = row(("you ruled ", "quiet"), (ruled, "strong"), (f" {safe(facts.own.utc[:10])}   ", "quiet"))
    return [[*dated, *again], [*row(("you: ", "quiet"), (ruled, "strong"), "  "), *again]]


def _hints(facts: RuleFacts) -> tuple[str, ...]:
    """What Enter will do, or that there is nothing left to do here."""
    if facts.note:
        return ()
    if facts.is_done:
        return "done   m: next star   a: add a note", "done   m: next star", "m: next star"
    if facts.with_others:
        return "choose, then Enter records, marked: others in view", "marked: others in view", "others in view"
    return ("choose, then Enter records",) if facts.own is None else ()


def _with_note(width: int, line: Row, facts: RuleFacts) -> Row:
    """The note's beginning after the choice, as far as there is room."""
    note = safe(" / ".join(part for part in facts.note.splitlines() if part.strip()))
    room = width - row_width(line) - len("   note: ") - 1
    if room >= 4:
        line = [*line, Span("   note: ", "quiet"), Span(fit(note, room).rstrip())]
    return fit_row(line, width)
