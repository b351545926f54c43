"""The log of rulings on one candidate, read in the order of time.

Clocks differ between machines and a reviewer may work on two copies of a queue, so time alone does not say which of
someone's rulings is the newest: a ruling that another one replaces is never the newest, whatever the clocks said; among
the others it is the latest, and at equal times the one with the greater id.
"""

from __future__ import annotations

from collections.abc import Iterable

from tui.model import Ruling

Key = tuple[str, str]  # check, reviewer id


def in_order(rulings: Iterable[Ruling]) -> list[Ruling]:
    """Rulings by UTC, then by id: the one order in which every copy of a queue reads the same log."""
    return sorted(rulings, key=lambda ruling: (ruling.utc, ruling.id))


class Replay:
    """The rulings that are current after each row of the log; feed it rows in the order of `in_order`."""

    def __init__(self) -> None:
        self.current: dict[Key, Ruling] = {}  # withdrawn ones are absent
        self._heads: dict[Key, list[Ruling]] = {}  # not replaced, oldest first: two or more after a fork
        self._replaced: set[tuple[Key, str]] = set()

    def add(self, ruling: Ruling) -> None:
        """Take in the next row."""
        key = (ruling.check, ruling.reviewer_id)
        heads = self._heads.setdefault(key, [])
        if ruling.replaces:
            self._replaced.add((key, ruling.replaces))
            heads[:] = [head for head in heads if head.id != ruling.replaces]
        if (key, ruling.id) not in self._replaced:
            heads.append(ruling)
        if heads and heads[-1].ruling != "withdrawn":
            self.current[key] = heads[-1]
        else:
            self.current.pop(key, None)


def current_rulings(rulings: Iterable[Ruling]) -> dict[Key, Ruling]:
    """Each reviewer's newest ruling on each check, unless it took the ruling back.

    Args:
        rulings: any part of the log on one candidate, in any order.
    Returns:
        (check, reviewer id) -> ruling.
    """
    replay = Replay()
    for ruling in in_order(rulings):
        replay.add(ruling)
    return replay.current


def first_sealed(rulings: Iterable[Ruling]) -> dict[Key, Ruling]:
    """Each reviewer's first ruling on each check, where it was made with the seal closed.

    It is what agreement is measured on. A ruling taken back while the seal was still closed was never given, and the
    next one is the first; a first ruling made with others' in view leaves the reviewer out for that check.

    Returns:
        (check, reviewer id) -> ruling, never a withdrawal.
    """
    first: dict[Key, Ruling] = {}
    for ruling in in_order(rulings):
        key = (ruling.check, ruling.reviewer_id)
        if ruling.ruling != "withdrawn":
            first.setdefault(key, ruling)
        elif not ruling.seen_others and key in first and not first[key].seen_others:
            del first[key]
    return {key: ruling for key, ruling in first.items() if not ruling.seen_others}
