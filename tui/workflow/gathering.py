"""Take in what colleagues ruled in their own copies."""

from __future__ import annotations

import os
from collections.abc import Iterator, Mapping, Sequence
from contextlib import closing
from dataclasses import dataclass

from tui.errors import InputError
from tui.store.connect import open_queue
from tui.store.gather import gather
from tui.store.records import GatherReport
from tui.workflow.counting import counted

PARTS = ("candidates", "measurements", "rulings", "reviewers", "settings", "evidence")


@dataclass(frozen=True, slots=True)
class Gathered:
    """What one copy brought."""

    report: GatherReport
    queue: str

    def sentence(self) -> str:
        """What was new in it, and what to do next."""
        new = [counted(getattr(self.report, part), part) for part in PARTS if getattr(self.report, part)]
        if not new:
            return f"{self.report.path}: nothing new."
        text = f"{self.report.path}: {', '.join(new)}."
        if self.report.affected:
            have = "has" if len(self.report.affected) == 1 else "have"
            text += f" {counted(len(self.report.affected), 'candidates')} {have} new measurements: plainlight assess "
            text += self.queue
        if self.report.unrelated:
            text += f" None of its candidates was in {self.queue} before."
        return text


def gather_all(
    path: str, others: Sequence[str], rename: Mapping[str, str], *, unrelated: bool = False
) -> Iterator[Gathered]:
    """Take in each copy in turn; what was taken in before a refusal stays.

    Args:
        unrelated: also take in a queue that has no candidate in common with this one.
    Raises:
        HandleError: two people under one handle; the text says how to rename one.
        InputError: a copy is the queue itself.
        StoreError: a copy cannot be read, or is of other candidates altogether.
    """
    for other in others:
        if os.path.exists(other) and os.path.exists(path) and os.path.samefile(other, path):
            raise InputError(f"{other} is the queue itself; name a colleague's copy.")
    with closing(open_queue(path)) as connection:
        for other in others:
            yield Gathered(gather(connection, other, rename, unrelated=unrelated), path)
