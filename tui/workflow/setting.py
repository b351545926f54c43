"""The settings of a queue: read, write, and every value they ever had."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import closing

from tui.model import Settings
from tui.store.connect import open_queue
from tui.store.settings import DEFAULT, read_settings, setting_history, write_setting
from tui.workflow.clock import utc_now

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

RULES = ("quorum", "agree_share", "walk_all")  # of consensus: no evidence rests on them


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
        write_setting(connection, name, value, utc_now(), by)
        now = dict(row[:2] for row in overview_rows(read_settings(connection)))
    text = f"{name} is now {now.get(name) or 'the default'}."
    if name in RULES:
        return f"{text} States and outcomes follow it."
    return f"{text} Evidence that rests on it is outdated until: plainlight assess {path}"


def history(path: str, name: str) -> list[tuple[str, str, str]]:
    """When, by whom and to what a setting was set, oldest first."""
    with closing(open_queue(path, write=False)) as connection:
        return [(line.utc, line.by, line.value) for line in setting_history(connection, name)]
