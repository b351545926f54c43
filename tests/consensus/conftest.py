"""A team that rules on one candidate as the store would let it: times, marks and opened seals kept as it goes."""

from __future__ import annotations

from dataclasses import replace

import pytest

from tui.consensus import seal
from tui.consensus.standing import standing
from tui.model import CHECKS, Evidence, Fit, Ruling, Settings


def fitted(check: str, adequate: bool | None = False, version: int = 1, **pulls: float) -> Evidence:
    pulls = pulls or {"J": 0.5, "W3": 8.2}
    fit = Fit(check, chi2=1.0, dof=1, p=0.5, aic=1.0, bic=1.0, pulls=pulls)
    return Evidence(check, version, adequate, (fit,), digest=f"{check}-{version}-{adequate}", bands=tuple(pulls))


class Team:
    """One candidate, its evidence and its log."""

    def __init__(self, nodata: tuple[str, ...] = (), **settings: object) -> None:
        self.settings = replace(Settings(), **settings)
        self.evidence = {check: fitted(check, None if check in nodata else False) for check in CHECKS}
        self.cited = {one.digest: one for one in self.evidence.values()}
        self.log: list[Ruling] = []
        self.opened: frozenset[str] = frozenset()
        self.now = self.refresh()

    def refresh(self):
        self.now = standing(self.log, self.evidence, self.cited, self.settings, self.opened)
        self.opened = self.now.opened
        return self.now

    def rule(self, who: str, ruling: str, *checks: str):
        """One ruling on each of these checks (all five if none is named), in the order given."""
        for check in checks or CHECKS:
            mine = self.now.current.get((check, who))
            number = len(self.log) + 1
            self.log.append(
                Ruling(
                    "SM-0001", check, who, ruling,
                    evidence_digest=self.evidence[check].digest,
                    seen_others=seal.has_others_in_view(self.now, who),
                    replaces=mine.id if mine else "",
                    utc=f"2031-01-01T00:00:{number:09.6f}Z",
                    id=f"{who}{number:04d}",
                )
            )  # fmt: skip
            self.refresh()
        return self.now

    def compute(self, check: str, **evidence: object):
        """New evidence for one check; the old stays where a ruling cites it."""
        self.evidence[check] = fitted(check, **evidence)
        self.cited[self.evidence[check].digest] = self.evidence[check]
        return self.refresh()

    def fork(self) -> Team:
        """The same candidate, to go on apart."""
        other = object.__new__(Team)
        other.__dict__.update(self.__dict__)
        other.log, other.evidence, other.cited = list(self.log), dict(self.evidence), dict(self.cited)
        return other


@pytest.fixture(scope="session")
def new_team():
    """Builds a team: `new_team(nodata=("dust",), quorum=3)`."""
    return Team


@pytest.fixture(scope="session")
def new_evidence():
    """Builds one check's evidence: `new_evidence("dust", adequate=True, version=2, W3=1.0)`."""
    return fitted
