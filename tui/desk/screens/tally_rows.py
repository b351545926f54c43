"""The tally as rows: is it done, can it be trusted, what is left, what it means; and what each reviewer has done."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from rich.cells import cell_len

from tui.desk.text import clock, fit, number, plural, safe, state_text
from tui.desk.widgets.pick_rows import PickRow
from tui.desk.widgets.rows import Row, Span, paragraph, row
from tui.model import CHECK_TITLES, CHECKS, OUTCOMES

if TYPE_CHECKING:
    from tui.workflow.tally_record import Line, ReviewerLine, Tally

HEADS = {"none": "none yet", "stale": "stale*"}
LABEL_WIDE, CELL_WIDE = 13, 9
HANDLE_WIDE, HANDLE_MOST, ROOMY = 14, 33, 100  # cells of a handle on a narrow and on a roomy screen; from where on
WIDEST = 110  # columns of reading text
LEAST_Q = 1e-6  # our choice: far below it only noise is counted, and templates are never wrong so seldom
Q_CAUTION = "q: the share of such stars that noise alone would make; wrong templates are not covered."
NAMED_ON_SCREEN = 200  # survivors; the list that Enter makes has them all


def title_row(queue: str, tally: Tally | None, width: int) -> Row:
    """Whose tally, by what rule, as of when."""
    left = f" {safe(queue)}   TALLY"
    if tally is None:
        return [Span(fit(left, width), "strong")]
    share = "all agree" if tally.agree_share >= 1 else f"{100 * tally.agree_share:.0f} % agree"
    right = f"settled by {tally.quorum} sure rulings, {share}   {clock(tally.utc)} "
    return [Span(fit(left, max(0, width - len(right))), "strong"), Span(right, "quiet")]


@dataclass(frozen=True, slots=True)
class Choice:
    """The chosen row, counted from the first of the rows being made, and the chosen cell in it."""

    line: int
    column: int

    def after(self, rows: Sequence[PickRow]) -> Choice:
        """The same choice, counted from below these rows."""
        return Choice(self.line - len(rows), self.column)

    def cell(self, rows: Sequence[PickRow], cells: int) -> int | None:
        """The chosen cell of the row that comes after `rows`; None where it is not the chosen row."""
        return min(self.column, cells - 1) if self.line == len(rows) else None


def tally_rows(tally: Tally, width: int, choice: Choice) -> list[PickRow]:
    """The whole tally."""
    width = min(width, WIDEST)
    rows = done_rows(tally, width, choice)
    rows += progress_rows(tally, width, choice.after(rows))
    rows += hold_rows(tally, width, choice.after(rows))
    rows += trust_rows(tally, width)
    rows += left_rows(tally, width, choice.after(rows))
    return [*rows, PickRow(), *head("4 WHAT IT MEANS", ""), *text_rows(tally.meaning.sentences, width)]


def done_rows(tally: Tally, width: int, choice: Choice) -> list[PickRow]:
    """Is it done?"""
    rows = head("1 IS IT DONE", f"{plural(tally.candidates, 'candidate')}; every count is the team's")
    return rows + cell_rows((tally.settled, tally.under_way, tally.untouched), width, choice.after(rows))


def progress_rows(tally: Tally, width: int, choice: Choice) -> list[PickRow]:
    """Each check by state."""
    from tui.workflow.tally_record import STATES_SHOWN

    heads = "".join(fit(HEADS.get(state) or state_text(state), CELL_WIDE, align="right") for state in STATES_SHOWN)
    rows = [PickRow(), PickRow([Span(" " * (LABEL_WIDE + 2)), Span(heads, "quiet")])]
    for check in CHECKS:
        found = tuple(tally.progress[check][state] for state in STATES_SHOWN)
        marked = choice.cell(rows, len(found))
        spans = [Span(" " + fit(CHECK_TITLES[check], LABEL_WIDE - 1), "strong" if marked is not None else "")]
        for cell, state in enumerate(STATES_SHOWN):
            text = f"[{found[cell].count}]" if cell == marked else f"{found[cell].count} "
            style = "chosen" if cell == marked else _count_style(state, found[cell].count)
            spans += [Span(" " * max(0, CELL_WIDE - len(text))), Span(text, style)]
        rows.append(PickRow(spans, found))
    return rows


def hold_rows(tally: Tally, width: int, choice: Choice) -> list[PickRow]:
    """What holds it up, the most pressing first."""
    if not tally.holds:
        return []
    rows = [PickRow(row((" what holds it up", "quiet")))]
    return rows + cell_rows(tally.holds, width, choice.after(rows))


def cell_rows(lines: Sequence[Line], width: int, choice: Choice) -> list[PickRow]:
    """Counts one beside the other, on as many rows as they take."""
    rows: list[PickRow] = []
    parts: list[Line] = []
    for line in (*lines, None):
        used = sum(cell_len(safe(part.text)) + 3 for part in parts)
        if parts and (line is None or used + cell_len(safe(line.text)) + 5 > width):
            marked = choice.cell(rows, len(parts))
            spans = [Span(" ")]
            for place, part in enumerate(parts):
                text = safe(part.text)
                spans += [Span(f"[{text}]", "chosen"), Span(" ")] if place == marked else [Span(f" {text}  ")]
            rows.append(PickRow(spans, tuple(parts)))
            parts = []
        parts += [line] if line is not None else []
    return rows


def trust_rows(tally: Tally, width: int) -> list[PickRow]:
    """Can it be trusted?"""
    from tui.workflow.tally_record import trust_sentences

    return [PickRow(), *head("2 CAN IT BE TRUSTED", "first, sealed rulings only"),
            *text_rows(trust_sentences(tally.agreement), width)]  # fmt: skip


def left_rows(tally: Tally, width: int, choice: Choice) -> list[PickRow]:
    """What is left: outcomes, and the unexplained by name where their seal is open to the reader."""
    survivors = tally.survivors
    rows = [PickRow(), *head("3 WHAT IS LEFT", f"{survivors.count} unexplained of {tally.settled.count} settled")]
    counts = [*(tally.outcomes[outcome] for outcome in OUTCOMES), *([tally.parted] if tally.parted.count else [])]
    rows += cell_rows(counts, width, choice.after(rows))
    names = survivors.names[:NAMED_ON_SCREEN]
    if tally.q_values:
        q = [q_text(tally.q_values.get(name)) for name in names]
        rows += [PickRow(row((f"   {fit(safe(name), 30, cut='middle')}", "strong"), f"  q {value}"))
                 for name, value in zip(names, q, strict=True)]  # fmt: skip
        rows += text_rows([Q_CAUTION], width) if names else []
    elif names:
        rows += text_rows([", ".join(safe(name) for name in names)], width)
    if survivors.unnamed:
        verb = "is" if survivors.unnamed == 1 else "are"
        rows += text_rows([f"{survivors.unnamed} of the unexplained {verb} still sealed to you and not named."], width)
    return rows


def q_text(q: float | None) -> str:
    """A false discovery rate; one that no template is good enough for as below that.

    >>> q_text(0.031), q_text(7.2e-189), q_text(None)
    ('= 0.031', '< 1e-6', '= --')
    """
    return "< 1e-6" if q is not None and q < LEAST_Q else f"= {number(q, 2)}"


def reviewer_rows(tally: Tally, width: int) -> list[PickRow]:
    """What each reviewer has done, by handle; who agrees with whom. No ranking."""
    width = min(width, WIDEST)
    size = HANDLE_WIDE if width < ROOMY else HANDLE_MOST
    heads = f" {fit('reviewer', size)}{'rulings':>9}{'candidates':>12}{'done':>8}   last ruling"
    rows = [*head("REVIEWERS", "by handle; this is no ranking"), PickRow(row((heads, "quiet")))]
    rows += [PickRow([Span(reviewer_text(one, size))]) for one in tally.reviewers]
    handles = {one.id: one.handle for one in tally.reviewers}
    if tally.agreement.pairs:
        rows += [PickRow(), *head("WHO RULED ALIKE", "first, sealed rulings that both made")]
    for pair in tally.agreement.pairs:
        names = f"{safe(handles.get(pair.one, pair.one))} and {safe(handles.get(pair.two, pair.two))}"
        rows.append(PickRow([Span(f" {fit(names, 30)}{pair_text(pair)}")]))
    if tally.agreement.error_rates_note:
        rows += [PickRow(), *text_rows([tally.agreement.error_rates_note], width)]
    return rows


def reviewer_text(one: ReviewerLine, size: int) -> str:
    """One reviewer's line, the handle in `size` cells."""
    last = one.last_utc[:16].replace("T", " ") or "none yet"
    ago = f", {plural(round(one.quiet_days), 'day')} ago" if one.quiet_days and one.quiet_days >= 1 else ""
    return f" {fit(safe(one.handle), size)}{one.rulings:>9,}{one.candidates:>12,}{one.done:>8,}   {last}{ago}"


def pair_text(pair) -> str:
    """How far two reviewers agree."""
    same = "" if pair.raw is None else f"same in {100 * pair.raw:.0f} % of {pair.rated}"
    kappa = "" if pair.kappa is None else f"   kappa {pair.kappa:.2f}"
    interval = "" if pair.interval is None else f" ({pair.interval[0]:.2f} to {pair.interval[1]:.2f})"
    return f"{same}{kappa}{interval}"


def head(title: str, rest: str) -> list[PickRow]:
    """The head of a part."""
    return [PickRow(row((f" {title}", "head"), (f"   {rest}" if rest else "", "quiet")))]


def text_rows(sentences, width: int) -> list[PickRow]:
    """Sentences, each begun on a line of its own."""
    return [PickRow([Span("   "), *line]) for text in sentences for line in paragraph(text, width - 4)]


def chosen_line(target: tuple[Line, ...] | None, column: int) -> Line | None:
    """The count that is chosen."""
    return target[min(column, len(target) - 1)] if target else None


def _count_style(state: str, count: int) -> str:
    return "quiet" if not count else state if state in {"explains", "short", "split"} else ""
