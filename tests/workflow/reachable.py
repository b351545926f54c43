"""All that a reviewer who is not done can reach of a queue, as one row of numbers a candidate."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np

from tui.errors import TuiError
from tui.model import CHECKS, OUTCOMES
from tui.store.candidate_view import others_rulings
from tui.workflow.records import SORTS, Filter
from tui.workflow.session import Session
from tui.workflow.showing import Dossier

FILTERS = (
    Filter(),
    *(Filter(unresolved=check) for check in CHECKS),
    *(Filter(outcome=outcome) for outcome in (*OUTCOMES, "sealed")),
    Filter(needs_me=True), Filter(stale=True), Filter(mine=True), Filter(mine=False), Filter(done=True),
    Filter(done=False), Filter(later=True), Filter(text="SM"), *(Filter(share=(part, 2)) for part in (1, 2)),
)  # fmt: skip
SAME = 0.98  # columns that correlate so closely are one
Columns = dict[str, list[float | str]]


def reachable(session: Session, other_eyes: Session, names: list[str]) -> np.ndarray:
    """What the reader can reach of some candidates, timing apart.

    Args:
        session: the reader's own.
        other_eyes: the same queue read without a handle.
        names: of the candidates.
    Returns:
        One row a name, standardised; words become one column of 0 and 1 for each word that occurs.
    """
    columns: Columns = {}
    for who, eyes in (("own", session), ("nobody", other_eyes)):
        listed(eyes, names, who, columns)
        shown(eyes, names, who, columns)
    turns(session, names, columns)
    tallied(session, names, columns)
    refused(session, names, columns)
    return numbers(columns)


def listed(session: Session, names: list[str], who: str, columns: Columns) -> None:
    """Rows of the list, and the place in it under every order, direction and filter."""
    ids = [session.id_of(name) for name in names]
    for row in session.rows(ids):
        for key in ("oddness", "odd_band", "odd_pull", "outcome", "ruled", "to_rule", "needs_me", "done", "seal_open"):
            columns.setdefault(f"{who} {key}", []).append(getattr(row, key))
        for check in CHECKS:
            columns.setdefault(f"{who} {check}", []).append(row.states[check])
            columns.setdefault(f"{who} {check} stale", []).append(check in row.stale)
    for number, where in enumerate(FILTERS):
        for sort in SORTS if number == 0 else ("oddness",):
            for descending in (True, False):
                order = session.order(sort=sort, descending=descending, where=where)
                places = {one: place for place, one in enumerate(order)}
                key = f"{who} place {number} {sort} {descending}"
                columns[key] = [places.get(one, -len(order)) for one in ids]


def shown(session: Session, names: list[str], who: str, columns: Columns) -> None:
    """The candidate's page, its document and its story."""
    for name in names:
        view, evidence, story = session.view(name), session.stored_evidence(name), session.story(name)
        document = Dossier(session.candidate(name), evidence, view, {}, ()).as_dict()
        told = {f"state {check}": view.states[check] for check in CHECKS}
        told |= {f"owed {check}": check in view.to_rule for check in CHECKS}
        told |= {f"stale {check}": view.stale.get(check, "") for check in CHECKS}
        told |= {"outcome": view.outcome, "reason": view.pending_reason, "cause": view.cause, "done": view.done}
        told |= {"needs": view.needs_me, "others": len(view.others), "own": len(view.own_history)}
        told |= {"story": str([(line.what, line.check, line.text) for line in story])}
        told |= {"since": sum(line.since_mine for line in story), "document": str(document).replace(name, "NAME")}
        for key, value in told.items():
            columns.setdefault(f"{who} view {key}", []).append(value)


def turns(session: Session, names: list[str], columns: Columns) -> None:
    """How late each candidate is offered as the next, when all before it are left."""
    order: list[str] = []
    while (name := session.next_for_me(skip=order)) is not None:
        order.append(name)
    places = {name: place for place, name in enumerate(order)}
    columns["turn"] = [places.get(name, len(order)) for name in names]


def tallied(session: Session, names: list[str], columns: Columns) -> None:
    """In which lines of the desk's tally each candidate is named."""
    for line in session.tally().lines():
        columns[f"tally {line.key}"] = [name in line.names for name in names]


def refused(session: Session, names: list[str], columns: Columns) -> None:
    """What is answered to claims, and to rulings that cannot be made."""
    for name in names:
        columns.setdefault("claimed alone", []).append(session.claim(name))
        session.release(name)
        columns.setdefault("answers", []).append(" ".join(answers(session, name)).replace(name, "NAME"))


def answers(session: Session, name: str) -> Iterable[str]:
    """The messages of refused actions."""
    tries = [
        lambda: session.withdraw(name, "blend"),
        lambda: session.rule(name, "dust", "perhaps", "", "dust-1"),
        lambda: session.rule(name, "dust", "short", "", "no such digest"),
        lambda: session.rule(name, "age", "short", "", "age-1"),
        lambda: others_rulings(session.connection, session.reader_id, name),
    ]
    for one in tries:
        try:
            yield str(one())
        except TuiError as error:
            yield str(error)


def numbers(columns: Columns) -> np.ndarray:
    """Numbers stay, words become columns of 0 and 1; what is the same for all is left out."""
    made = []
    for values in columns.values():
        if isinstance(values[0], str):
            made += [[value == word for value in values] for word in sorted(set(values))[1:]]
        else:
            made.append(np.nan_to_num(np.array(values, dtype=float)))
    return told_apart(np.array(made, dtype=float).T)


def told_apart(table: np.ndarray) -> np.ndarray:
    """The columns that vary, standardised, each only once: a place and the place from the end are the same."""
    table = table[:, np.ptp(table, axis=0) > 0]
    standard = (table - table.mean(axis=0)) / table.std(axis=0)
    alike = np.abs(standard.T @ standard) / len(standard)
    kept: list[int] = []
    for column in range(standard.shape[1]):
        if not kept or alike[column, kept].max() < SAME:
            kept.append(column)
    return standard[:, kept]
