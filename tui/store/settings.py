"""The settings of a queue: an append-only log, of which the newest value of each name holds."""

from __future__ import annotations

import math
import re
import secrets
import sqlite3
from collections.abc import Callable, Mapping
from dataclasses import replace
from difflib import get_close_matches
from typing import Any

from tui.errors import SettingError
from tui.model import Settings
from tui.store.connect import immediate
from tui.store.names import checked_utc, later_utc
from tui.store.records import SettingLine

DEFAULT = "default"  # the word that brings back a default
LAWS = ("g23", "f99", "ccm89", "wc19")
R_V_RANGE = (2.3, 5.6)  # where Gordon et al. 2023, ApJ 950, 86, holds
STANDING_NAMES = frozenset({"quorum", "agree_share", "walk_all"})  # those that check states and outcomes hang on
FAMILIES = {"floor": "floors", "common": "common"}  # prefix -> the mapping of Settings that it fills


def whole(least: int) -> Callable[[str], int]:
    """A parser of whole numbers from `least` on."""

    def parse(text: str) -> int:
        if not re.fullmatch(r"[0-9]{1,18}", text) or int(text) < least:
            raise ValueError(f"a whole number from {least} on")
        return int(text)

    return parse


def between(low: float, high: float, *, low_too: bool = False, high_too: bool = True) -> Callable[[str], float]:
    """A parser of numbers in a range; whether its ends belong to it."""
    words = f"a number {'from' if low_too else 'above'} {low:g} {'up to' if high_too else 'and below'} {high:g}"

    def parse(text: str) -> float:
        try:
            value = float(text)
        except ValueError:
            raise ValueError(words) from None
        inside = (value > low or (low_too and value == low)) and (value < high or (high_too and value == high))
        if not inside or not math.isfinite(value):
            raise ValueError(words)
        return value

    return parse


def yes_or_no(text: str) -> bool:
    """yes or no."""
    if text.lower() not in ("yes", "no"):
        raise ValueError("yes or no")
    return text.lower() == "yes"


def one_of(*words: str) -> Callable[[str], str]:
    """A parser of one of some words."""

    def parse(text: str) -> str:
        if text not in words:
            raise ValueError("one of " + ", ".join(words))
        return text

    return parse


def photosphere(text: str) -> str:
    """dwarfs, planck, or grid and where its spectra are kept."""
    if text in ("dwarfs", "planck") or re.fullmatch(r"grid[ :]\S.*", text):
        return text
    raise ValueError("dwarfs, planck, or grid DIR")


def templates(text: str) -> str:
    """Where the queue keeps the spectra of a folder."""
    if re.fullmatch(r"templates:[0-9a-f]{16,64}( .*)?", text):
        return text
    raise ValueError("a folder of spectra")


def r_v(text: str) -> str:
    """free, or a number in the range of the law."""
    if text == "free":
        return text
    try:
        between(*R_V_RANGE, low_too=True)(text)
    except ValueError as error:
        raise ValueError(f"free, or {error}") from None
    return text


def av_prior(text: str) -> str:
    """A number of magnitudes."""
    between(0, 100, low_too=True)(text)
    return text


PARSERS: Mapping[str, Callable[[str], Any]] = {
    "quorum": whole(1),
    "agree_share": between(0.5, 1.0),
    "walk_all": yes_or_no,
    "photosphere": photosphere,
    "law": one_of(*LAWS),
    "r_v": r_v,
    "av_prior": av_prior,
    "p_min": between(0, 1, high_too=False),
    "source_floor": between(0, 1, low_too=True),
    "ruwe_max": between(0, 1000),
    "n_searched": whole(0),
    "templates": templates,
}
fraction = between(0, 1, low_too=True)


def checked_name(name: str) -> str:
    """The name itself. SettingError, naming near ones, where no setting is called so."""
    family, dot, member = name.partition(".")
    if name in PARSERS or (dot and family in FAMILIES and re.fullmatch(r"[^\s.][^\s]{0,63}", member)):
        return name
    known = [*PARSERS, "floor.BAND", "common.INSTRUMENT"]
    near = get_close_matches(name.lower(), known, n=3) or known
    where = "near it" if len(near) < len(known) else "there"
    verb = "is" if len(near) == 1 else "are"
    raise SettingError(name, f"there is no such setting; {where} {verb} {', '.join(near)}.")


def parse_setting(name: str, text: str) -> Any:
    """The typed value of a setting's text.

    Raises:
        SettingError: no such setting, or a value outside its range, saying what it may be.

    >>> parse_setting("walk_all", "yes")
    True
    """
    parse: Callable[[str], Any] = PARSERS.get(checked_name(name), fraction)
    try:
        return parse(text)
    except ValueError as error:
        raise SettingError(name, f"{text!r} is not {error}.") from None


def read_settings(connection: sqlite3.Connection) -> Settings:
    """Today's value of every setting; defaults where none was ever set."""
    return settings_from(newest(connection))


def newest(connection: sqlite3.Connection) -> dict[str, str]:
    """Name -> text of the newest value: latest UTC, then greater id."""
    return dict(connection.execute("SELECT name, value FROM setting ORDER BY utc, id").fetchall())


def settings_from(texts: Mapping[str, str]) -> Settings:
    """Settings with some values given as text; `default` stands for the default."""
    plain: dict[str, Any] = {}
    members: dict[str, dict[str, float]] = {field: {} for field in FAMILIES.values()}
    for name, text in texts.items():
        if text == DEFAULT:
            continue
        family, dot, member = name.partition(".")
        if dot:
            members[FAMILIES[family]][member] = parse_setting(name, text)
        else:
            plain[name] = parse_setting(name, text)
    return replace(Settings(), **plain, **members)


def write_setting(connection: sqlite3.Connection, name: str, value: str, utc: str, by: str = "") -> SettingLine:
    """Set a value from now on, and bring states and outcomes up to date where they hang on it.

    Args:
        value: as text; `default` brings the default back. The value that holds already adds no row.
        by: reviewer id of who sets it, or empty.
    Raises:
        SettingError: no such setting, or a value outside its range.
    """
    from tui.store import deriving

    value = value.strip()
    if value != DEFAULT or name not in PARSERS:
        parse_setting(name, "0" if value == DEFAULT else value)
    with immediate(connection):
        if newest(connection).get(name, DEFAULT) == value:
            return SettingLine(name, value, utc, by)
        last = connection.execute("SELECT COALESCE(MAX(utc), '') FROM setting WHERE name = ?", (name,)).fetchone()[0]
        utc = later_utc(checked_utc(utc), last)
        connection.execute(
            "INSERT INTO setting (id, name, value, utc, reviewer_id) VALUES (?, ?, ?, ?, ?)",
            (secrets.token_hex(16), name, value, utc, by),
        )
        if name in STANDING_NAMES:
            deriving.refresh(connection, touched(connection))
    return SettingLine(name, value, utc, by)


def touched(connection: sqlite3.Connection) -> list[int]:
    """Ids of the candidates on which anybody ruled."""
    return [row[0] for row in connection.execute("SELECT id FROM queue_row WHERE touched = 1").fetchall()]


def setting_history(connection: sqlite3.Connection, name: str | None = None) -> list[SettingLine]:
    """Every value ever set, oldest first, of one setting or of all, with the handle of who set it."""
    from tui.store.reviewers import handles

    by = handles(connection)
    query = "SELECT name, value, utc, reviewer_id FROM setting WHERE ?1 IS NULL OR name = ?1 ORDER BY utc, id"
    return [
        SettingLine(found, value, utc, by.get(reviewer_id, reviewer_id))
        for found, value, utc, reviewer_id in connection.execute(query, (name,)).fetchall()
    ]
