"""Natural classes without a check of their own, read from spectral type, object type, age and gravity."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

DISC_AGE_MYR = 10.0  # gas-rich discs are mostly gone by then (Haisch, Lada & Lada 2001, ApJ 553, L153)
DEBRIS_AGE_MYR = 100.0  # warm debris is common up to here (Wyatt 2008, ARA&A 46, 339)
GIANT_LOGG = 3.5  # cm s-2 in dex: dwarfs of all masses lie above (Pecaut & Mamajek 2013 radii and masses)
COMPACT_LOGG = 6.0  # dwarfs lie below; white dwarfs near 8


@dataclass(frozen=True, slots=True)
class ClassRow:
    """One pattern of object or spectral type and what it means for an excess."""

    field: str
    name: str
    pattern: re.Pattern[str]
    sentence: str


def class_rows(rows: Sequence[Mapping[str, str]]) -> tuple[ClassRow, ...]:
    """The rows of the packaged table `natural_classes`."""
    return tuple(ClassRow(row["field"], row["class"], re.compile(row["pattern"]), row["sentence"]) for row in rows)


def class_cautions(facts: Mapping[str, Any], classes: Sequence[ClassRow]) -> tuple[str, ...]:
    """Cautions from `otype` and `sp_type`: one sentence a class, naming what it was read from."""
    said: dict[str, str] = {}
    for row in classes:
        text = str(facts.get(row.field) or "").strip()
        found = text and (row.pattern.fullmatch(text) if row.field == "otype" else row.pattern.search(text))
        if found:
            said.setdefault(row.name, f"Catalogued as {row.name} ({row.field} {text[:40]}): {row.sentence}.")
    return tuple(said.values())


def age_and_gravity_cautions(facts: Mapping[str, Any]) -> tuple[str, ...]:
    """Cautions from `age_myr` and `logg`; none where they are missing."""
    age, logg = _number(facts.get("age_myr")), _number(facts.get("logg"))
    said = []
    if 0 <= age < DISC_AGE_MYR:
        said.append(f"{age:.3g} Myr old: at this age gas-rich discs and accretion are ordinary.")
    elif age < DEBRIS_AGE_MYR:
        said.append(f"{age:.3g} Myr old: at this age warm debris is common.")
    if logg < GIANT_LOGG:
        said.append(f"log g {logg:.2f}: a giant or subgiant; the dwarf photospheres do not hold for it.")
    elif logg > COMPACT_LOGG:
        said.append(f"log g {logg:.2f}: a compact star; the dwarf photospheres do not hold for it.")
    return tuple(said)


def natural_cautions(facts: Mapping[str, Any], classes: Sequence[ClassRow]) -> tuple[str, ...]:
    """All cautions about natural classes."""
    return class_cautions(facts, classes) + age_and_gravity_cautions(facts)


def _number(value: Any) -> float:
    try:
        return float(value)
    except (TypeError, ValueError):
        return math.nan
