"""A queue of a million candidates, none of which exists before its row is asked for."""

from __future__ import annotations

from array import array

from tests.desk.fake_session import FakeSession
from tui.model import CHECKS
from tui.workflow.records import QueueRow


class MillionSession(FakeSession):
    """A million candidates, none of which exists before its row is asked for."""

    COUNT = 1_000_000

    def __init__(self) -> None:
        super().__init__([])
        self.fetched = 0

    def order(self, sort="oddness", descending=True, where=None, limit=None):
        ids = range(limit or self.COUNT)
        return array("q", ids if descending else reversed(ids))

    def rows(self, ids):
        self.fetched += len(ids)
        return [self.row(i) for i in ids]

    def row(self, i):
        states = dict.fromkeys(CHECKS, "todo")
        fall, name = i * 1e-5, self.name_of(i)
        return QueueRow(i, name, 9 - fall, "W3", 8 - fall, states, frozenset(), "sealed", 0, 5, True, False, False)

    def counts(self):
        return {"all": self.COUNT, "needs_me": self.COUNT} | {f"unresolved:{check}": self.COUNT for check in CHECKS}

    def id_of(self, name):
        return int(name.removeprefix("SM-"))

    def name_of(self, candidate_id):
        return f"SM-{candidate_id:07d}"

    def stored_evidence(self, name):
        return {}
