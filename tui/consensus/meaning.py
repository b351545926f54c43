"""What the emptiness of the list, or its few survivors, means for the survey: numbers and plain sentences."""

from __future__ import annotations

from dataclasses import dataclass

from tui.consensus.proportion import CONFIDENCE
from tui.consensus.survey import upper_limit

CAUTION = (
    "Unexplained means only that these checks fell short with these data and models. It is no detection; "
    "independent data at higher resolution come next."
)


@dataclass(frozen=True, slots=True)
class Meaning:
    """What follows from the counts; `limit` is None where nothing can be said."""

    n_searched: int | None
    survivors: int  # unexplained
    pending: int
    limit: float | None  # one-sided upper limit of the share of sought stars that the search could have seen
    confidence: float
    sentences: tuple[str, ...]


def meaning(n_searched: int | None, survivors: int, pending: int, waiting: int) -> Meaning:
    """Say it.

    Args:
        n_searched: stars that the search went through; None where nobody set it.
        survivors: unexplained candidates.
        pending: candidates without outcome, untouched ones included.
        waiting: those of them that still need reviewers.
    """
    said: list[str] = []
    limit = None
    events = survivors + pending
    if n_searched is None:
        said.append("How common such stars may be cannot be said: the number searched (n_searched) is unknown.")
    elif n_searched < events:
        said.append(f"n_searched is {n_searched}, fewer than the {events} candidates unexplained or pending: mend it.")
    else:
        limit = upper_limit(events, n_searched)
        said.append(_limit_sentence(n_searched, survivors, pending, limit))
        if survivors == 0:
            said.append("A null limits only what the search could have seen.")
    if waiting:
        who = "1 candidate still needs reviewers" if waiting == 1 else f"{waiting} candidates still need reviewers"
        said.append(f"{who}; until then each counts as one that may survive.")
    said.append(CAUTION)
    return Meaning(n_searched, survivors, pending, limit, CONFIDENCE, tuple(said))


def _limit_sentence(n_searched: int, survivors: int, pending: int, limit: float) -> str:
    percent = f"{100 * CONFIDENCE:.0f} %"
    if limit >= 1:
        return f"{survivors} unexplained and {pending} pending of {n_searched} searched set no limit at {percent}."
    return (
        f"At most a share of {limit:.3g} of the stars searched is of the sought kind ({percent}, one-sided; "
        f"{survivors} unexplained and {pending} pending of {n_searched}), had search and vetting kept every such star; "
        "divide it by the share kept."
    )
