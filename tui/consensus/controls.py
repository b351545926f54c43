"""What controls tell of each reviewer, and how often the program's lean was followed."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from tui.consensus.proportion import Rate
from tui.model import SURE, Ruling


@dataclass(frozen=True, slots=True)
class ControlRates:
    """One reviewer on the controls they ruled on, by first, sealed rulings.

    `hit`: of rulings on the check that is a control's nature, those that say `explains`; an `unclear` found nothing.
    `false`: of rulings on any other check of a control, those that say `explains`; on a control of nature `none`,
    every check is another.
    """

    hit: Rate
    false: Rate


def control_rates(first: Iterable[Ruling], truth: Mapping[str, str]) -> dict[str, ControlRates]:
    """Reviewer id -> rates.

    Args:
        first: first, sealed rulings, one for each candidate, check and reviewer; others than controls are passed by.
        truth: name of a control -> its nature, a check or `none`.
    """
    seen: dict[str, list[tuple[bool, bool]]] = {}
    for ruling in first:
        if ruling.candidate in truth:
            is_nature = truth[ruling.candidate] == ruling.check
            seen.setdefault(ruling.reviewer_id, []).append((is_nature, ruling.ruling == "explains"))
    return {who: ControlRates(_rate(pairs, True), _rate(pairs, False)) for who, pairs in seen.items()}


def _rate(pairs: list[tuple[bool, bool]], wanted: bool) -> Rate:
    explained = [explains for is_nature, explains in pairs if is_nature is wanted]
    return Rate(sum(explained), len(explained))


def lean_followed(rulings: Iterable[Ruling], adequate: Mapping[str, bool | None]) -> Rate:
    """How often sure rulings said what the program's lean said.

    Args:
        rulings: first, sealed rulings.
        adequate: digest of evidence -> its `adequate`; a ruling whose evidence is untestable or unknown is left out.
    Returns:
        Counted as if independent: the same star ruled by several people counts several times.
    """
    followed = [
        (ruling.ruling == "explains") is adequate[ruling.evidence_digest]
        for ruling in rulings
        if ruling.ruling in SURE and adequate.get(ruling.evidence_digest) is not None
    ]
    return Rate(sum(followed), len(followed))
