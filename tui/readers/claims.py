"""Which public catalogue owns which column of a table, cross-match suffixes included.

A join numbers the columns whose names two catalogues share: `ra_1`, `ra_2`. Who owns which is told by where the
column stands: joins keep each catalogue's columns together, in order.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field

from tui.readers.archives import Archive, Entry

SUFFIX = re.compile(r"^(?P<stem>.+?)_(?P<digit>[1-9])$")
MEASURED = ("mag", "flux", "error")


@dataclass(slots=True)
class Claim:
    """One catalogue found in the table: its own column names -> the table's."""

    archive: Archive
    columns: dict[str, str] = field(default_factory=dict)

    def find(self, entry: Entry) -> str:
        """The table's column of an entry, "" where the table has none of its names."""
        return next((self.columns[name] for name in entry.columns if name in self.columns), "")


@dataclass(frozen=True, slots=True)
class Claims:
    """All catalogues found, and what could not be told apart."""

    found: tuple[Claim, ...]
    cautions: tuple[str, ...]


def stem_of(name: str, known: Iterable[str] = ()) -> str:
    """A column's name without the suffix of a cross-match.

    >>> stem_of("ra_2"), stem_of("f_1", {"f_1"})
    ('ra', 'f_1')
    """
    match = SUFFIX.match(name)
    return match["stem"] if match and name not in known else name


def claim_columns(
    names: Sequence[str],
    archives: Sequence[Archive],
    letters: Callable[[str], int],
    taken: frozenset[str] = frozenset(),
) -> Claims:
    """Share the columns of a table out among the catalogues.

    Args:
        names: all columns, in the table's order.
        letters: how many letters the cells of a column usually have, for flags of one letter a band.
        taken: columns that already have a use; they still tell the catalogue by their names.
    """
    place = {name: index for index, name in enumerate(names)}
    offers = _offers(names, archives)
    active = [archive for archive in archives if _is_marked(archive, offers[archive.label])]
    middle = {archive.label: _middle(archive, active, offers, place) for archive in active}
    found = {archive.label: Claim(archive) for archive in active}
    cautions: list[str] = []
    for name in dict.fromkeys(name for archive in active for name in offers[archive.label]):
        columns = [column for column in _columns_of(name, active, offers) if column not in taken]
        owners = [
            archive
            for archive in active
            if name in offers[archive.label] and _uses(archive, name, offers[archive.label])
        ]
        if columns and owners:
            cautions += _share(name, columns, owners, found, middle, place, letters)
    return Claims(tuple(found.values()), tuple(cautions))


def _offers(names: Sequence[str], archives: Sequence[Archive]) -> dict[str, dict[str, list[str]]]:
    """For each archive: its own column name -> the table's columns that bear it, suffix or not."""
    known = {name for archive in archives for name in archive.column_names}
    folded: dict[str, set[str]] = {}
    for name in known:
        folded.setdefault(name.lower(), set()).add(name)
    offers: dict[str, dict[str, list[str]]] = {archive.label: {} for archive in archives}
    for column in names:
        stem = stem_of(column, known)
        alike = folded.get(stem.lower(), set())
        meant = {stem} if stem in alike else (alike if len(alike) == 1 else set())
        for archive in archives:
            for name in meant & archive.column_names:
                offers[archive.label].setdefault(name, []).append(column)
    return offers


def _is_marked(archive: Archive, offered: Mapping[str, list[str]]) -> bool:
    return any(all(column in offered for column in mark) for mark in archive.marks)


def _uses(archive: Archive, name: str, offered: Mapping[str, list[str]]) -> bool:
    """Whether some entry takes this name, given what else is there, or has it for a condition."""
    return any(
        name == entry.option("with")
        or (name in entry.columns and (not entry.option("with") or entry.option("with") in offered))
        for entry in archive.entries
    )


def _columns_of(name: str, active: Sequence[Archive], offers: Mapping[str, Mapping[str, list[str]]]) -> list[str]:
    return next(offers[archive.label][name] for archive in active if name in offers[archive.label])


def _middle(
    archive: Archive, active: Sequence[Archive], offers: Mapping[str, Mapping[str, list[str]]], place: Mapping[str, int]
) -> tuple[int, int]:
    """First and last place of the columns that only this archive can own."""
    others = {name for other in active if other is not archive for name in offers[other.label]}
    places = [
        place[columns[0]] for name, columns in offers[archive.label].items() if name not in others and len(columns) == 1
    ]
    return (min(places), max(places)) if places else (0, 0)


def _share(
    name: str,
    columns: list[str],
    owners: list[Archive],
    found: Mapping[str, Claim],
    middle: Mapping[str, tuple[int, int]],
    place: Mapping[str, int],
    letters: Callable[[str], int],
) -> list[str]:
    """Give the columns of one name to those who can own them; the sentences that this needs."""

    def give(archive: Archive, column: str) -> None:
        found[archive.label].columns[name] = column

    in_order = sorted(owners, key=lambda archive: sum(middle[archive.label]))
    if len(columns) == len(owners):
        for archive, column in zip(in_order, columns, strict=True):
            give(archive, column)
        return (
            [f"{', '.join(columns)}: taken as {', '.join(a.label for a in in_order)} by their places"]
            if len(columns) > 1
            else []
        )
    if len(owners) == 1:
        within = [
            column for column in columns if middle[owners[0].label][0] <= place[column] <= middle[owners[0].label][1]
        ]
        chosen = (within or columns)[0]
        give(owners[0], chosen)
        left = [column for column in columns if column != chosen]
        return [f"{', '.join(left)}: {owners[0].label} already gave {chosen}; not read"]
    split = [archive for archive in owners if _split_width(archive, name) in (letters(columns[0]), 0)]
    if len(columns) == 1 and any(_split_width(archive, name) for archive in owners) and len(split) == 1:
        give(split[0], columns[0])
        return []
    if any(name in entry.columns and entry.role in MEASURED for archive in owners for entry in archive.entries):
        labels = " or ".join(archive.label for archive in owners)
        return [f"{', '.join(columns)}: may be {labels}; not read. Say which in the column map, as a band's own column"]
    within = [
        archive for archive in owners if middle[archive.label][0] <= place[columns[0]] <= middle[archive.label][1]
    ]
    give((within if len(within) == 1 else owners)[0], columns[0])
    return []


def _split_width(archive: Archive, name: str) -> int:
    """How many letters a flag of this name has, 0 where it is not split."""
    return next((len(e.targets) for e in archive.entries if name in e.columns and e.how == "split"), 0)
