"""Which keys a candidate's page offers at this moment: the key line is made from this, so it is always true."""

from __future__ import annotations

from collections.abc import Mapping

from tui.desk.keys import PLACES, shown
from tui.desk.screens.walk import Walk
from tui.desk.widgets.numbers import param_name
from tui.model import CHECK_TITLES

Entry = tuple[str, str, str]  # keys, what they do, the action of a click

_DEFAULTS = {key.id: key for key in PLACES["candidate"]}
READING = (
    ("note", "note", "note()"),
    ("next_check", "next check", "next_check()"),
    ("checks", "checks", ""),
    ("views", "views", "views()"),
    ("plot", "plot", "plot()"),
    ("hand", "by hand", "hand()"),
    ("compare", "compare", "compare()"),
    ("left right", "points", ""),
    ("zoom_in zoom_out", "zoom", "zoom(1)"),
    ("later", "later", "later()"),
    ("back", "back", "back()"),
    ("help", "help", "help()"),
)
PAGE = (
    ("views", "next page", "views()"),
    ("digits", "pages", ""),
    ("up down", "scroll", ""),
    ("plot", "to the plot", "plot()"),
    ("note", "note", "note()"),
    ("next_check", "next check", "next_check()"),
    ("back", "to the plot", "back()"),
    ("help", "help", "help()"),
)
PLOT = (
    ("left right", "points", ""),
    ("zoom_in zoom_out", "zoom", "zoom(1)"),
    ("pan_left pan_right", "move", ""),
    ("quantity", "F_nu or nu F_nu", "quantity()"),
    ("up down", "other fits", ""),
    ("next_check", "next check", "next_check()"),
    ("plot back", "with the numbers again", "plot()"),
    ("help", "help", "help()"),
)


def offered(walk: Walk, keymap: Mapping[str, str]) -> list[Entry]:
    """The entries of the key line, as things stand."""
    if walk.asking_compare:
        return [
            (_keys("checks", keymap), "draw that check's best fit too", ""),
            (_keys("compare", keymap), "none", "compare()"),
        ]
    if walk.hand is not None:
        return _hand(walk, keymap)
    if walk.page:
        table = PAGE
    elif walk.plot_only:
        table = PLOT
    else:
        table = READING
    entries = [(_keys(ids, keymap), label, action) for ids, label, action in table]
    if walk.page == 0 and not walk.plot_only:
        place = next(i for i, entry in enumerate(entries) if entry[1] == "points") + 1
        if walk.fits > 1:
            entries.insert(place, (_keys("up down", keymap), "fits", ""))
        if walk.loaded is not None and walk.check in walk.loaded.view.own:
            entries.insert(place, (_keys("withdraw", keymap), "withdraw", "withdraw()"))
    if walk.compared:
        entries = [
            (keys, f"without {CHECK_TITLES[walk.compared]}" if label == "compare" else label, action)
            for keys, label, action in entries
        ]
    return entries


def writing() -> list[Entry]:
    """While a note is being written."""
    return [
        ("Tab", "leaves the note", ""),
        ("Enter", "begins a new line", ""),
        ("", "kept as you type; recorded with the ruling", ""),
    ]


def _hand(walk: Walk, keymap: Mapping[str, str]) -> list[Entry]:
    hand = walk.hand
    param = walk.fit.params.get(hand.param) if walk.fit and hand.param else None
    label = param_name(hand.param, param).short if param is not None else "nothing"
    entries = [(_keys("up down", keymap), label, "")] if param is not None else []
    if len(hand.params) > 1:
        entries.append((_keys("next_check", keymap), "next number", "next_check()"))
    return [
        *entries,
        (_keys("release", keymap), "fit it", "release()"),
        (_keys("left right", keymap), "points", ""),
        (_keys("drop", keymap), "drop the band", "drop()"),
        (_keys("reset", keymap), "all as fitted", "reset()"),
        (_keys("hand", keymap), "leave", "hand()"),
        (_keys("help", keymap), "help", "help()"),
    ]


def _keys(ids: str, keymap: Mapping[str, str]) -> str:
    if ids == "checks":
        ids = "check_star check_instrument check_extinction check_blend check_dust"
    if ids == "digits":
        return "1-9"
    return " ".join(_key(part, keymap) for part in ids.split())


def _key(name: str, keymap: Mapping[str, str]) -> str:
    place = {"back": "leave.back", "help": "desk.help"}.get(name, f"candidate.{name}")
    return shown(keymap.get(place, _DEFAULTS[place].keys))
