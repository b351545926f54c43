"""One candidate in one sentence: how odd, where, and what agrees."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

from tui.desk.text import band_names, listed, plural, safe
from tui.model import CHECK_TITLES, Evidence

if TYPE_CHECKING:
    from tui.workflow.records import CandidateView, QueueRow

ODD_PULL = 3.0  # sigma: a band that the sentence names
PLAIN_PULL = 2.0  # sigma: a band that agrees with the star alone
NAMED_BANDS = 4
MANY = 3  # reasons beyond the first from which on they are counted
PARTED = ", though by different checks"


def oddness_sentence(row: QueueRow, evidence: Mapping[str, Evidence]) -> str:
    """Why the candidate is odd, in one sentence."""
    star = evidence.get("star")
    if star is None:
        return "Not assessed yet: opening it computes the evidence."
    if star.best is None or not star.best.pulls:
        return "The star alone cannot be fitted: too few bands."
    pulls = dict(sorted(star.best.pulls.items(), key=lambda item: -abs(item[1])))  # the farthest are named first
    bright = [band for band, pull in pulls.items() if pull >= ODD_PULL]
    faint = [band for band, pull in pulls.items() if pull <= -ODD_PULL]
    said = [f"{_bands(bands)} {word}" for bands, word in ((bright, "brighter"), (faint, "fainter")) if bands]
    sigma = "" if row.oddness != row.oddness else f"{row.oddness:.1f} sigma: "
    if not said:
        return f"{sigma}no single band stands out from the star alone; {_agree(pulls)}."
    return f"{sigma}{' and '.join(said)} than the star alone; {_agree(pulls)}."


def standing_sentence(row: QueueRow, view: CandidateView | None) -> str:
    """Where the candidate stands for this reader, in one sentence."""
    if row.stale:
        return f"Stale: the evidence under your ruling on {_checks(row.stale)} has changed. Look once more."
    if not row.seal_open:
        return _sealed_sentence(row)
    reason = view.pending_reason if view else ""
    if row.outcome == "pending":
        many = reason.count(";") >= MANY
        told = counted_reason(reason) if many else reason_text(reason)
        said = f"Pending: {told}." if reason else "Pending."
        return f"{said} {_asked(row, view)}" if row.needs_me else said
    return f"You are done with it. The team's outcome: {row.outcome}{_cause(row, view)}."


def looking_sentence(handles: Sequence[str]) -> str:
    """Who else is looking at it now; empty where nobody is."""
    return f"{listed(handles)} {'is' if len(handles) == 1 else 'are'} looking at it." if handles else ""


def begun_sentence(view: CandidateView | None) -> str:
    """On which checks the reader has a note that is not yet recorded; empty where there is none."""
    begun = [CHECK_TITLES[check] for check in CHECK_TITLES if view is not None and view.drafts.get(check)]
    return f"A note is begun on {listed(begun)}." if begun else ""


def counted_reason(reason: str) -> str:
    """Why a candidate is pending, the checks counted instead of named.

    >>> counted_reason("open:star;open:blend;split:dust;nodata:extinction")
    '2 checks open, 1 split, 1 without data'
    """
    states = [piece.partition(":")[0] for piece in reason.split(";") if piece]
    words = {state: {"nodata": "without data"}.get(state, safe(state)) for state in dict.fromkeys(states)}
    said = [f"{states.count(state)} {word}" for state, word in words.items()]
    first = plural(states.count(states[0]), "check") if states else ""
    return ", ".join([f"{first} {words[states[0]]}", *said[1:]]) if states else ""


def reason_text(reason: str) -> str:
    """`split:dust;nodata:extinction` as people say it.

    >>> reason_text("split:dust;nodata:extinction")
    'warm dust split, extinction lacks data'
    """
    words = {"nodata": "lacks data"}
    said = []
    for piece in filter(None, reason.split(";")):
        state, _, check = piece.partition(":")
        title = CHECK_TITLES.get(check, check)
        said.append(f"{title} {words.get(state, state)}" if check else CHECK_TITLES.get(state, state))
    return ", ".join(said)


def _cause(row: QueueRow, view: CandidateView | None) -> str:
    if view is None or not view.cause or row.outcome != "explained":
        return ""
    return PARTED if view.cause == "parted" else f" by {reason_text(view.cause)}"


def _asked(row: QueueRow, view: CandidateView | None) -> str:
    """What a star whose seal is open still asks: a split, once more, or the checks never ruled."""
    if row.done or view is None or not view.to_rule:
        return "It asks you once more."
    left = listed([CHECK_TITLES[check] for check in view.to_rule])
    return f"You have {plural(len(view.to_rule), 'check')} left: {left}."


def _sealed_sentence(row: QueueRow) -> str:
    if not row.needs_me:
        return "It needs nobody now. You may still walk it; what others ruled opens when you are done."
    if row.ruled == 0:
        return "You have ruled nothing on it yet. What others ruled opens when you are done."
    return f"You have ruled {row.ruled} of {plural(row.to_rule, 'check')}. What others ruled opens when you are done."


def _agree(pulls: Mapping[str, float]) -> str:
    count = sum(abs(pull) <= PLAIN_PULL for pull in pulls.values())
    return f"{plural(count, 'band')} agree{'s' if count == 1 else ''}"


def _bands(bands: list[str]) -> str:
    names = band_names(bands)
    if len(names) > NAMED_BANDS:
        return f"{', '.join(names[: NAMED_BANDS - 1])} and {len(names) - NAMED_BANDS + 1} more bands"
    return listed(names)


def _checks(checks: frozenset[str]) -> str:
    if len(checks) > 2:
        return plural(len(checks), "check")
    return listed([CHECK_TITLES[check] for check in CHECK_TITLES if check in checks])
