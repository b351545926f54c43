"""The lines on top of a candidate: name and standing, the five checks as their reader may see them."""

from __future__ import annotations

from collections.abc import Sequence

from tui.desk.summary import reason_text
from tui.desk.text import KEY_OF_CHECK, SHORT_CHECKS, fit, outcome_text, safe, state_text
from tui.desk.widgets.rows import Row, Span, fit_row, row_width
from tui.model import CHECK_TITLES, CHECKS
from tui.workflow.records import CandidateView

ROOMY = 100  # columns from which checks stand under their full names


def title_row(width: int, name: str, odd: str, view: CandidateView | None, right: Sequence[str]) -> Row:
    """Name, why it is odd and where it stands; at the right who looks.

    Args:
        right: the same said at less and less length; what leaves the name whole is taken. The name gives way last.
    """
    shown = safe(name)
    middle = [Span(f"   {odd}", "quiet")] if odd else []
    if view is not None:
        middle += [Span("   "), Span(standing_words(view), outcome_style(view.outcome))]
    taken = 1 + row_width(middle) + row_width([Span(shown)])
    tails = [[Span(f"  {text} ", "quiet")] for text in right if taken + len(text) + 3 <= width]
    tail = tails[0] if tails else []
    room = width - 1 - row_width(middle) - row_width(tail)
    name_span = Span(fit(shown, min(room, row_width([Span(shown)])), cut="middle"), "name")
    left: Row = [Span(" "), name_span, *middle]
    return [*fit_row(left, width - row_width(tail)), *tail]


def standing_words(view: CandidateView) -> str:
    """Outcome and the reader's own progress, or why it is pending."""
    if not view.seal_open:
        count = len(view.own)
        return f"{outcome_text(view.outcome)}" + (
            f", {count} of {count + len(view.to_rule)} ruled" if count or view.to_rule else ""
        )
    reason = f": {safe(reason_text(view.pending_reason))}" if view.pending_reason else ""
    reason = reason or (f" by {safe(reason_text(view.cause))}" if view.cause else "")
    return outcome_text(view.outcome) + reason


def outcome_style(outcome: str) -> str:
    """Style name of an outcome."""
    return {"explained": "explains", "ordinary": "explains", "unexplained": "short", "pending": "open"}.get(
        outcome, "sealed"
    )


def check_row(width: int, view: CandidateView | None, current: str, pages: str = "") -> Row:
    """The five checks in walking order with sign and word; the one on view in capitals between brackets."""
    names = CHECK_TITLES if width >= ROOMY else SHORT_CHECKS
    gap = "   " if width >= ROOMY else " "
    line: Row = [Span(" ")]
    for check in CHECKS:
        state = view.states.get(check, "todo") if view else "todo"
        stale = view is not None and check in view.stale
        text, action = state_text(state, stale), f"check('{check}')"
        here = check == current
        label = f"[{names[check].upper()}" if here else f" {names[check]}"
        line += [Span(label + " ", "now" if here else "", action), Span(text, state, action)]
        line += [Span("]" if here else " ", "now"), Span(gap if width >= ROOMY else "")]
    missing = width - row_width(line) - len(pages) - 1
    if pages and missing >= 1:
        line += [Span(" " * missing), Span(pages, "quiet")]
    return fit_row(line, width)


def check_letters() -> str:
    """The keys of the checks, in order."""
    return " ".join(KEY_OF_CHECK[check] for check in CHECKS)
