"""The settings of a queue: read, write, and every value they ever had."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import closing
from difflib import get_close_matches

from tui.errors import SettingError
from tui.model import Settings
from tui.store.candidates import candidate_count
from tui.store.connect import open_queue
from tui.store.settings import DEFAULT, checked_name, read_settings, setting_history, write_setting
from tui.workflow.basis import read_basis
from tui.workflow.clock import utc_now
from tui.workflow.digests import RELEVANT, settings_digest

MEANINGS = {
    "quorum": "sure rulings that settle a check",
    "agree_share": "share of them that must agree",
    "walk_all": "every check must be ruled even after one explains",
    "photosphere": "dwarfs, planck, or grid DIR (logg=4.5 mh=0 behind it choose among its spectra)",
    "law": "extinction law: g23, f99, ccm89, wc19",
    "r_v": "A(V)/E(B-V), a number or free",
    "av_prior": "largest A(V) in mag; empty: av_max of the candidate, else 1.8 mag/kpc, else 5 mag",
    "p_min": "a fit with a smaller p is not adequate",
    "source_floor": "spread of stars around the photosphere source, fraction; empty: its own table",
    "ruwe_max": "RUWE above which a parallax is a limit only",
    "n_searched": "stars searched to make this queue; empty: not known",
    "templates": "folder of spectra that the mixture bound takes for natural sources too, or default: none",
}


def shown(value: object) -> str:
    """A setting's value as it is typed.

    >>> shown(True), shown(None), shown(2)
    ('yes', '', '2')
    """
    if isinstance(value, bool):
        return "yes" if value else "no"
    return "" if value is None else str(value)


def overview(path: str) -> list[tuple[str, str, str]]:
    """Name, value and meaning of every setting."""
    with closing(open_queue(path, write=False)) as connection:
        return list(overview_rows(read_settings(connection)))


def overview_rows(settings: Settings) -> Iterator[tuple[str, str, str]]:
    """Name, value and meaning of every setting, those of single bands and instruments at the end."""
    for name, meaning in MEANINGS.items():
        yield name, shown(getattr(settings, name)), meaning
    for band, floor in sorted(settings.floors.items()):
        yield f"floor.{band}", shown(floor), "calibration floor of the band, fraction"
    for instrument, common in sorted(settings.common.items()):
        yield f"common.{instrument}", shown(common), "common error of the instrument, fraction"


def write(path: str, name: str, value: str, handle: str | None) -> str:
    """Set a value, as `handle` where one is given; the sentence that says so.

    Raises:
        SettingError: no such setting, or a value out of its range.
        TableError: the spectra of `grid DIR`, or of the templates' folder, cannot be used.
        HandleError: nobody joined under `handle`.
    """
    from tui.workflow.session import reviewer_named

    with closing(open_queue(path)) as connection:
        by = reviewer_named(connection, handle).id if handle else ""
        if name == "photosphere" and value.startswith("grid "):
            from tui.workflow.grid_photosphere import keep_grid

            value = keep_grid(connection, value.removeprefix("grid ").strip())
        if name == "templates" and value.strip() != DEFAULT:
            from tui.workflow.own_templates import KEY, keep_templates

            value = value if KEY.match(value) else keep_templates(connection, value.strip())
        refuse_pointless(connection, name, value.strip())
        before = read_settings(connection)
        write_setting(connection, name, value, utc_now(), by)
        after = read_settings(connection)
    now = dict(row[:2] for row in overview_rows(after))
    return f"{name} is now {now.get(name) or 'the default'}. {consequence(path, before, after)}"


def refuse_pointless(connection: sqlite3.Connection, name: str, value: str) -> None:
    """SettingError for a value that is in the setting's range and yet cannot be meant in this queue."""
    family, _, member = name.partition(".")
    if family == "floor" and member and value != DEFAULT:
        known = read_basis(connection).bands()
        if member not in known:
            near = [band for band in known if band.lower() == member.lower()] or get_close_matches(member, known, n=3)
            mend = f"near it: {', '.join(near)}" if near else "bands are named as in: plainlight show"
            raise SettingError(name, f"there is no band {member!r}; {mend}.")
    if name == "n_searched" and value.isdigit():
        held = candidate_count(connection)
        if int(value) < held:
            raise SettingError(
                name, f"{value} stars searched cannot have given {held} candidates; give at least {held}."
            )


def consequence(path: str, before: Settings, after: Settings) -> str:
    """What follows from a change of settings: which evidence is outdated, or that none is."""
    if before == after:
        return "It was so before."
    kinds = [kind for kind in RELEVANT if settings_digest(kind, before) != settings_digest(kind, after)]
    if not kinds:
        return "States and outcomes follow it."
    what = "All evidence" if len(kinds) == len(RELEVANT) else f"Evidence on {', '.join(kinds)}"
    return f"{what} is outdated until: plainlight assess {path}"


def history(path: str, name: str) -> list[tuple[str, str, str]]:
    """When, by whom and to what a setting was set, oldest first. SettingError where no setting is called so."""
    checked_name(name)
    with closing(open_queue(path, write=False)) as connection:
        return [(line.utc, line.by, line.value) for line in setting_history(connection, name)]
