"""A split as rows of text: the numbers first, then everybody's rulings and notes, in columns where there is room."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

from tui.desk.text import RULING_WORDS, SIGNS, once_in, p_text, plural, safe, short_band, signed, wrap
from tui.desk.widgets.aligned import table
from tui.desk.widgets.numbers import param_words, tenth
from tui.desk.widgets.rows import Row, Span, fit_row, hanging, paragraph, row
from tui.model import CHECK_TITLES, Evidence

if TYPE_CHECKING:
    from tui.workflow.records import CandidateView, RulingLine

COLUMN_LEAST = 25  # cells: narrower columns of notes cannot be read
PULLS_SHOWN = 5
FITS_SHOWN = 2  # the notes matter most here; the candidate's page has all fits


@dataclass(frozen=True, slots=True)
class Split:
    """What is drawn."""

    name: str
    check: str
    handle: str
    view: CandidateView | None
    evidence: Mapping[str, Evidence]
    question: str

    @property
    def state(self) -> str:
        """The check's state as the reader may see it."""
        return self.view.states.get(self.check, "") if self.view else ""

    def rulings(self) -> list[tuple[str, list[RulingLine]]]:
        """Handle and rulings on this check, the reader first, then the others by name, each in time order."""
        if self.view is None:
            return []
        said: dict[str, list[RulingLine]] = {}
        for line in [*self.view.own_history, *self.view.others]:
            if line.check == self.check:
                said.setdefault(line.handle, []).append(line)
        return sorted(said.items(), key=lambda item: (item[0] != self.handle, item[0]))


def head_rows(split: Split, width: int) -> list[Row]:
    """Candidate, check and its state; the question."""
    title = CHECK_TITLES[split.check].upper()
    state = f"{SIGNS.get(split.state, '')}{split.state}"
    you = f"you: {safe(split.handle)} " if split.handle else "reading, not ruling "
    left = [Span(f" {safe(split.name)}", "name"), Span("   "), Span(title, "now"), Span(f"  {state}", split.state)]
    return [
        [*fit_row(left, width - len(you)), Span(you, "quiet")],
        *indented(split.question, width, "question"),
    ]


def split_rows(split: Split, width: int) -> list[Row]:
    """The whole body."""
    if split.view is None:
        return []
    if not split.view.seal_open:
        return indented("Sealed: what others ruled here opens for you once you are done with this star.", width)
    said = split.rulings()
    if not said:
        return [row((" Nobody has ruled on this check yet.", "quiet"))]
    evidence = split.evidence.get(split.check)
    rows = [*number_rows(evidence, width), []]
    columns = max(1, min(len(said), (width - 1) // COLUMN_LEAST))
    column_width = (width - 1) // columns
    for start in range(0, len(said), columns):
        blocks = [column_rows(handle, lines, column_width - 2, handle == split.handle)
                  for handle, lines in said[start : start + columns]]  # fmt: skip
        rows += side_by_side(blocks, column_width)
    cautions = evidence.cautions if evidence else ()
    return rows + [
        line for text in cautions for line in hanging(row((" CAUTION  ", "caution")), text, width, "caution")
    ]


def number_rows(evidence: Evidence | None, width: int) -> list[Row]:
    """Each fit of the check in one line, and the bands it leaves farthest."""
    if evidence is None:
        return [row((" Not assessed yet.", "quiet"))]
    if not evidence.fits:
        return [row((" Nothing could be fitted: too few data.", "quiet"))]
    fits = evidence.fits[:FITS_SHOWN]
    lines = [(safe(found.model), tenth(found.chi2), str(found.dof), tenth(found.bic), p_text(found.p), once_in(found.p))
             for found in fits]  # fmt: skip
    styles = ["strong", *[""] * (len(lines) - 1)]
    rows = table(("fit, best first", "chi2", "dof", "BIC", "p", "chance alone"), lines, width, (0, 5), styles)
    pulls = sorted(fits[0].pulls.items(), key=lambda item: -abs(item[1]))[:PULLS_SHOWN]
    left = "  ".join(f"{short_band(band)} {signed(pull)}" for band, pull in pulls)
    more = len(evidence.fits) - len(fits)
    rows += [row((f"  and {plural(more, 'fit')} that meet the data less well", "quiet"))] if more else []
    rows += hanging(row(("  left over, sigma  ", "quiet")), left, width)
    said = "; ".join(param_words(key, param) for key, param in fits[0].params.items())
    return rows + hanging(row(("  the best fit  ", "quiet")), said, width)


def indented(text: str, width: int, style: str = "") -> list[Row]:
    """A paragraph one cell from the edge."""
    return hanging([Span(" ")], text, width - 1, style)


def column_rows(handle: str, lines: list[RulingLine], width: int, is_reader: bool) -> list[Row]:
    """One reviewer's rulings in time order, the newest that stands in full colour, each with its note."""
    rows: list[Row] = [row((f"{safe(handle)}{' (you)' if is_reader else ''}", "head"))]
    for line in lines:
        word = RULING_WORDS.get(line.ruling, safe(line.ruling))
        how = "with the others in view" if line.seen_others else "before the seal opened"
        when = safe(line.utc[:10])
        style = line.ruling if line.current else "quiet"
        rows.append(row((f"{SIGNS.get(line.ruling, '')}{word}", style), (f"  {when}", "quiet")))
        rows.append(row((how, "quiet")))
        if not line.current and line.ruling != "withdrawn":
            rows.append(row(("replaced since", "quiet")))
        if line.stale:
            rows += paragraph(f"stale: {safe(line.stale)}", width, "caution")
        for text in line.note.splitlines():
            rows += [[Span(part)] for part in wrap(safe(text), width)]
        rows.append([])
    return rows


def side_by_side(blocks: list[list[Row]], column_width: int) -> list[Row]:
    """Blocks in columns, a margin of one cell before the first."""
    height = max(len(block) for block in blocks)
    rows: list[Row] = []
    for place in range(height):
        line: Row = [Span(" ")]
        for block in blocks:
            line += fit_row(block[place] if place < len(block) else [], column_width)
        rows.append(line)
    return rows


def foot_row(width: int, chosen: str, note: str, is_recording: bool, can_rule: bool, recorded: str = "") -> Row:
    """The ruling, in one row; `recorded`: the one made here already."""
    head = Span(" RULE  ", "head")
    if not can_rule:
        return fit_row([head, Span("nothing can be ruled here by you", "quiet")], width)
    if is_recording:
        return fit_row([head, Span(f"recording {RULING_WORDS[chosen]} ...", "message")], width)
    said = " / ".join(safe(line) for line in note.splitlines() if line.strip())
    waiting = f"{RULING_WORDS[recorded]}, recorded: nothing more is asked here" if recorded else "choose once more"
    line = [head, Span(f"> {RULING_WORDS[chosen]} <", "chosen") if chosen else Span(waiting, "quiet")]
    line += [Span("   "), Span("Enter", "key", "record()"), Span(" records it", "", "record()")] if chosen else []
    return fit_row([*line, *([Span("   note: ", "quiet"), Span(said)] if said else [])], width)
