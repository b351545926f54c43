"""Temperature, log g and [M/H] of a model atmosphere, from a spectrum's header, else from its file's name.

Names are read as `t05772_g4.44_m-0.5` (also `teff5772_logg4.44_mh0.0`), as `lte05800-4.50-0.0` (temperature, log g, then
[M/H] with its sign), or as four to six bare digits for the temperature alone.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

HEADER_NAMES = {
    "teff": ("teff", "t_eff", "phxteff", "effective temperature"),
    "logg": ("logg", "log_g", "log g", "phxlogg"),
    "mh": ("mh", "m_h", "[m/h]", "m/h", "feh", "fe_h", "[fe/h]", "phxm_h", "logz", "log_z", "metallicity"),
    "scale": ("scale",),
}
DECIMAL = r"[+-]?[0-9]+(?:\.[0-9]+)?"
TEFF_IN_NAME = (re.compile(r"(?:^|[^a-z])t(?:eff)?[=_]?([0-9]{4,6})(?![0-9])", re.IGNORECASE),
                re.compile(r"(?<![0-9.])([0-9]{4,6})(?![0-9.])"))  # fmt: skip
LOGG_IN_NAME = re.compile(rf"(?:^|[^a-z])(?:logg|g)[=_]?({DECIMAL})", re.IGNORECASE)
MH_IN_NAME = re.compile(rf"(?:^|[^a-z])(?:mh|feh|m|z)[=_]?({DECIMAL})", re.IGNORECASE)
IN_A_ROW = re.compile(r"[0-9]{4,6}-([0-9]\.[0-9]+)([+-][0-9]\.[0-9]+)")


@dataclass(frozen=True, slots=True)
class Atmosphere:
    """What header and name tell; None where neither does."""

    teff_k: float | None
    logg: float | None
    mh: float | None
    scale: float = 1.0


def atmosphere(stem: str, header: Mapping[str, Any]) -> Atmosphere:
    """What header and file name tell of a model, the header first.

    >>> atmosphere("t05772_g4.44_m-0.5", {}), atmosphere("lte05800-4.50-0.0.x", {"scale": "2 of ours"})
    (Atmosphere(teff_k=5772.0, logg=4.44, mh=-0.5, scale=1.0), Atmosphere(teff_k=5800.0, logg=4.5, mh=0.0, scale=2.0))
    """
    row = IN_A_ROW.search(stem)
    in_name = {
        "teff": next((found[1] for pattern in TEFF_IN_NAME if (found := pattern.search(stem))), None),
        "logg": row[1] if row else first_of(LOGG_IN_NAME, stem),
        "mh": row[2] if row else first_of(MH_IN_NAME, stem),
    }
    told = {name: from_header(header, names) for name, names in HEADER_NAMES.items()}
    found = {name: number(in_name.get(name)) if value is None else value for name, value in told.items()}
    scale = found.pop("scale")
    return Atmosphere(found["teff"], found["logg"], found["mh"], 1.0 if scale is None else scale)


def first_of(pattern: re.Pattern[str], stem: str) -> str | None:
    """What a pattern finds first in a name."""
    found = pattern.search(stem)
    return found[1] if found else None


def from_header(header: Mapping[str, Any], names: tuple[str, ...]) -> float | None:
    """The first of some header entries that is a number."""
    return next((value for name in names if (value := number(header.get(name))) is not None), None)


def number(told: Any) -> float | None:
    """The number that a text begins with; None where it is none."""
    try:
        value = float(str(told).split()[0])
    except (ValueError, IndexError):
        return None
    return value + 0.0 if math.isfinite(value) else None  # + 0.0 takes the sign off a zero
