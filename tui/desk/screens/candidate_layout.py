"""How the parts of a candidate's page share a terminal: plain numbers, so that every size can be tested."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Shares:
    """Rows of head and foot, and columns of the numbers beside the plot (0: none)."""

    head: int
    foot: int
    side: int


LESSON = 8  # rows of an answer: what was ruled, why, what the star was, and what to look at next


def shares(width: int, height: int, plot_only: bool = False, advice: int = 2, is_lesson: bool = False) -> Shares:
    """The plot gets what is left: 51 x 16 at 80 x 24, about 126 x 45 at 200 x 60.

    Args:
        advice: rows that advice and caution would take in full; 0 where a note or a page has their place.
        is_lesson: more of them may be shown, at the plot's cost.

    >>> shares(80, 24)
    Shares(head=3, foot=5, side=29)
    """
    head = 3 if height < 32 else 5
    if advice == 0:
        return Shares(head, 3, _side(width) if not plot_only else 0)
    least, most = (2, 3) if height < 32 else (3, 5) if height < 45 else (4, 7)
    most = max(most, LESSON) if is_lesson else most
    foot = min(max(advice, least), most) + 3  # then the ruling line and two rows of keys
    return Shares(head, foot, 0 if plot_only else _side(width))


def _side(width: int) -> int:
    if width < 100:
        return 29 + max(0, (width - 80) // 2)
    return 40 + (width - 100) // 4 if width < 165 else min(90, width - 126)
