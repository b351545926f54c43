"""What one reader may see of a candidate's standing, and whose turn comes next.

The seal guards independence: until a reviewer has been done with a candidate for the first time, a check they have not
ruled reads `todo`, one they have ruled reads their own ruling, the outcome reads `sealed`. `nodata` comes from the
evidence, not from people, and is never hidden from a reviewer. A reader without a handle sees `sealed` everywhere.
"""

from __future__ import annotations

import hashlib

from tui.consensus.standing import Standing
from tui.model import CHECKS

SEALED = "sealed"
NOT_RULED = "todo"


def is_open(standing: Standing, reviewer_id: str | None) -> bool:
    """Whether this reader may see others' rulings here."""
    return reviewer_id is not None and reviewer_id in standing.opened


def seen_states(standing: Standing, reviewer_id: str | None) -> dict[str, str]:
    """Check -> what this reader may read there: `todo`, their own ruling, the check state, or `sealed`."""
    if reviewer_id is None:
        return dict.fromkeys(CHECKS, SEALED)
    if is_open(standing, reviewer_id):
        return dict(standing.states)
    own = {check: standing.current.get((check, reviewer_id)) for check in CHECKS}
    return {
        check: "nodata" if standing.states[check] == "nodata" else ruling.ruling if ruling else NOT_RULED
        for check, ruling in own.items()
    }


def seen_outcome(standing: Standing, reviewer_id: str | None) -> str:
    """The outcome, or `sealed`."""
    return standing.outcome if is_open(standing, reviewer_id) else SEALED


def seen_pending_reason(standing: Standing, reviewer_id: str | None) -> str:
    """Why it is pending; empty while sealed."""
    return standing.pending_reason if is_open(standing, reviewer_id) else ""


def own_stale(standing: Standing, reviewer_id: str | None) -> dict[str, str]:
    """Check -> why the reader's own ruling on it no longer counts; others' stale rulings are never told here."""
    return {
        check: standing.stale[ruling.id]
        for (check, owner), ruling in standing.current.items()
        if owner == reviewer_id and ruling.id in standing.stale
    }


def has_others_in_view(standing: Standing, reviewer_id: str) -> bool:
    """The `seen_others` mark of a ruling that this reviewer makes now: seal open, and someone else has ruled here."""
    return is_open(standing, reviewer_id) and any(owner != reviewer_id for _, owner in standing.current)


def turn(candidate: str, reviewer_id: str) -> str:
    """Orders candidates for one reviewer, after the number of done reviewers: a hash, so people spread over a queue."""
    return hashlib.sha256(f"{candidate}\n{reviewer_id}".encode()).hexdigest()
