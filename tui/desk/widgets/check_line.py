"""The lines on top of a candidate: name and standing, the five checks as their reader may see them."""

from __future__ import annotations

from collections.abc import Sequence

from tui.desk.summary import counted_reason, reason_text
from tui.desk.text import SHORT_CHECKS, fit, outcome_text, safe, state_text
from tui.desk.widgets.rows import Row, Span, fit_row, row_width
from tui.model import CHECK_TITLES, CHECKS
from tui.workflow.records import CandidateView

LEAST_NAME = 12  # cells of a name that is cut
DRAFT = '"'
ROOMY = 100  # columns from which checks stand under their full names


def title_row(width: int, name: str, odd: str, view: CandidateView | None, right: Sequence[str]) -> Row:
    """Name, why it is odd and where it stands; at the right who looks.

    Where there is no room for all, what stands at the right is said shorter, then where the candidate stands, then
    why it is odd is left out; name and handle stay, the name cut in its middle where it must be.

    Args:
        right: the same said at less and less length, the handle last.
    """
    shown = Span(safe(name), "name")
    said = standings_of(view) if view else []
    standings = [[Span("   "), Span(text, outcome_style(view.outcome))] for text in said] or [[]]
    odds = [[Span(f"   {odd}", "quiet")], []] if odd else [[]]
    tails = [[Span(f"  {text} ", "quiet")] for text in right] or [[]]
    choices = [(why, standing, tail) for why in odds for standing in standings for tail in tails]
    needed = 1 + row_width([shown])
    fitting = (parts for parts in choices if needed + sum(map(row_width, parts)) <= width)
    why, standing, tail = next(fitting, (odds[0], standings[-1], tails[-1]))
    room = width - 1 - sum(map(row_width, (why, standing, tail)))
    name_span = shown._replace(text=fit(shown.text, min(row_width([shown]), max(LEAST_NAME, room)), cut="middle"))
    return [*fit_row([Span(" "), name_span, *why, *standing], width - row_width(tail)), *tail]


def standings_of(view: CandidateView) -> list[str]:
    """Outcome and the reader's own progress, or why it is pending, at less and less length."""
    outcome = outcome_text(view.outcome)
    if not view.seal_open:
        needed = [check for check, state in view.states.items() if state != "nodata"]
        ruled = len(set(needed) - set(view.to_rule))
        return [f"{outcome}, {ruled} of {len(needed)} ruled", outcome] if view.own or view.to_rule else [outcome]
    if view.pending_reason:
        reason = safe(reason_text(view.pending_reason))
        return [f"{outcome}: {reason}", f"{outcome}: {counted_reason(view.pending_reason)}", outcome]
    return [f"{outcome} by {safe(reason_text(view.cause))}", outcome] if view.cause else [outcome]


def outcome_style(outcome: str) -> str:
    """Style name of an outcome."""
    return {"explained": "explains", "ordinary": "explains", "unexplained": "short", "pending": "open"}.get(
        outcome, "sealed"
    )


def check_row(width: int, view: CandidateView | None, current: str, pages: str = "") -> Row:
    """The five checks in walking order with sign and word; the one on view in capitals between brackets.

    A check with a note begun and not recorded carries the mark `DRAFT`.
    """
    names = CHECK_TITLES if width >= ROOMY else SHORT_CHECKS
    gap = "   " if width >= ROOMY else " "
    line: Row = [Span(" ")]
    for check in CHECKS:
        state = view.states.get(check, "todo") if view else "todo"
        stale = view is not None and check in view.stale
        text, action = state_text(state, stale), f"check('{check}')"
        here = check == current
        label = f"[{names[check].upper()}" if here else f" {names[check]}"
        mark = DRAFT if view is not None and view.drafts.get(check) else " "
        line += [Span(label + mark, "now" if here else "", action), Span(text, state, action)]
        line += [Span("]" if here else " ", "now"), Span(gap if width >= ROOMY else "")]
    missing = width - row_width(line) - len(pages) - 1
    if pages and missing >= 1:
        line += [Span(" " * missing), Span(pages, "quiet")]
    return fit_row(line, width)
