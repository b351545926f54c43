"""A queue on disk for the desk's tests, with evidence and with rulings that agree, part and are unclear."""

from __future__ import annotations

from pathlib import Path

from tests.desk.made import FIXED_UTC, HOSTILE_NAMES, make_candidate, make_evidence
from tui.model import CHECKS


def make_queue(path: Path) -> str:
    """A queue on disk: forty candidates with evidence, three reviewers, rulings that agree, part and are unclear."""
    from tui.store import candidates, connect, evidence, reviewers
    from tui.store.records import LoadRecord
    from tui.workflow.session import Session

    names = [f"SM-{i:04d}" for i in range(1, 36)] + list(HOSTILE_NAMES[:5])
    connection = connect.open_queue(str(path), create=True)
    records = [LoadRecord(make_candidate(name, i), "archive") for i, name in enumerate(names)]
    candidates.save_candidates(connection, records, FIXED_UTC)
    computed = [(name, one) for i, name in enumerate(names) for one in make_evidence(i).values()]
    evidence.save_evidence(connection, computed)
    for number, handle in enumerate(("heron", "plover", "curlew")):
        reviewers.add_reviewer(connection, handle, f"2026-03-0{number + 1}T00:00:00.000000Z")
    connection.close()
    for handle, step in (("heron", 0), ("plover", 1), ("curlew", 2)):
        with Session.open(str(path), handle) as session:
            for i, name in enumerate(names[: 12 + 4 * step]):
                rule_through(session, name, i, step)
    return str(path)


def rule_through(session, name: str, number: int, step: int) -> None:
    """One reviewer's walk through one candidate: a few end early, one is left half-way."""
    for place, check in enumerate(CHECKS):
        if number % 6 == 5 and place > 1:
            return
        if number % 6 == 3 and check == "extinction":
            continue  # untestable there
        parts = number % 4 == 2 and check == "blend" and step
        ruling = "explains" if parts or (number % 4 == 1 and check == "dust") else "short"
        digest = f"{check}-{number}"
        session.rule(name, check, "unclear" if number % 7 == 6 and check == "star" else ruling, "W3 alone", digest)
        if ruling == "explains":
            return
