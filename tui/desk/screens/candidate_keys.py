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
    ("next", "next star", "next_for_me()"),
    ("split", "all notes", "split()"),
    ("note", "note", "note()"),
    ("next_check", "next check", "next_check()"),
    ("checks", "checks", ""),
    ("views", "views", "views()"),
    ("plot", "plot", "plot()"),
    ("hand", "by hand", "hand()"),
    ("compare", "compare", "compare()"),
    ("left right", "points", ""),
    ("withdraw", "withdraw", "withdraw()"),
    ("up down", "fits", ""),
    ("zoom_in zoom_out", "zoom", "zoom(1)"),
    ("later", "later", "later()"),
    ("back", "back", "back()"),
    ("help", "help", "help()"),
)
PAGE = (
    ("next", "next star", "next_for_me()"),
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


def offered(walk: Walk, keymap: Mapping[str, str], can_rule: bool = True, scrolls: bool = True) -> list[Entry]:
    """The entries of the key line, as things stand.

    Args:
        can_rule: the reader has a handle.
        scrolls: the page on view holds more rows than the screen.
    """
    if walk.asking_compare:
        return [
            (_keys("checks", keymap), "draw that check's best fit too", ""),
            (_keys("compare", keymap), "none", "compare()"),
        ]
    if walk.hand is not None:
        return _hand(walk, keymap)
    table = PAGE if walk.page else PLOT if walk.plot_only else READING
    entries = []
    for ids, label, action in table:
        ids = _zoom_ids(ids, walk)
        if _works(ids, walk, can_rule, scrolls):
            words = f"without {CHECK_TITLES[walk.compared]}" if walk.compared and label == "compare" else label
            entries.append((_keys(ids, keymap), words, action))
    return entries


def _zoom_ids(ids: str, walk: Walk) -> str:
    """Farther only where one has come nearer."""
    return "zoom_in" if ids == "zoom_in zoom_out" and walk.plot_view.x_range is None else ids


def _works(ids: str, walk: Walk, can_rule: bool, scrolls: bool) -> bool:
    """Whether keys do something as things stand."""
    if ids == "up down":
        return scrolls if walk.page else walk.fits > 1
    if ids == "withdraw":
        return can_rule and walk.loaded is not None and walk.check in walk.loaded.view.own
    if ids == "next":
        return can_rule and walk.is_done
    if ids == "split":
        return walk.is_split
    if ids in ("note", "later"):
        return can_rule
    if ids == "pan_left pan_right":
        return walk.plot_view.x_range is not None
    if ids in ("hand", "left right"):
        return walk.fit is not None if ids == "hand" else bool(walk.drawn.points)
    return True


def writing(message: str = "") -> list[Entry]:
    """While a note is being written; what has to be said then stands in place of the keys."""
    if message:
        return [("Tab", "leaves the note", ""), ("", message, "")]
    return [
        ("Tab", "leaves the note", ""),
        ("Enter", "begins a new line", ""),
        ("", "kept as you type; recorded with the ruling", ""),
    ]


def _hand(walk: Walk, keymap: Mapping[str, str]) -> list[Entry]:
    hand = walk.hand
    param = walk.fit.params.get(hand.param) if walk.fit and hand.param else None
    held, drops = hand.param in hand.fixed, walk.plot_view.cursor is not None
    wanted = (
        (param is not None, "up down", param_name(hand.param, param).short if param is not None else "", ""),
        (len(hand.params) > 1, "next_check", "next number", "next_check()"),
        (held, "release", "fit it", "release()"),
        (bool(walk.drawn.points), "left right", "points", ""),
        (drops, "drop", "drop the band", "drop()"),
        (hand.touched, "reset", "all as fitted", "reset()"),
        (True, "hand", "leave", "hand()"),
        (True, "help", "help", "help()"),
    )
    return [(_keys(ids, keymap), label, action) for works, ids, label, action in wanted if works]


def _keys(ids: str, keymap: Mapping[str, str]) -> str:
    if ids == "checks":
        ids = "check_star check_instrument check_extinction check_blend check_dust"
    if ids == "digits":
        return "1-9"
    return " ".join(_key(part, keymap) for part in ids.split())


def _key(name: str, keymap: Mapping[str, str]) -> str:
    place = {"back": "leave.back", "help": "desk.help"}.get(name, f"candidate.{name}")
    return shown(keymap.get(place, _DEFAULTS[place].keys))
