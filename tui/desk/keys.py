"""Every key of the desk: one table per place, from which bindings, key lines and help are all made.

A reader may give other keys in the configuration file, by the id of the action:

    [keys]
    "queue.next" = "n"
    "candidate.explains" = "1"
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType

from textual.binding import Binding

from tui.desk.text import RULING_MEANINGS
from tui.errors import SettingError
from tui.model import CHECK_TITLES, CHECKS

# What a terminal, its multiplexer or the shell does with these is left to them.
RESERVED = frozenset({"ctrl+a", "ctrl+b", "ctrl+c", "ctrl+d", "ctrl+h", "ctrl+q", "ctrl+s", "ctrl+w", "ctrl+z"})


@dataclass(frozen=True, slots=True)
class Key:
    """One action of one place."""

    id: str  # `place.action`, the name used in the configuration file
    keys: str  # names that Textual gives to keys, separated by commas
    action: str
    label: str  # on the key line: one or two words
    why: str  # in help: what it does and what for, one sentence
    rank: int = 2  # on the key line: 1 stays longest when room is short; 0 never stands there


_CHOOSE = {ruling: f"Choose: {meaning}." for ruling, meaning in RULING_MEANINGS.items()}
_CHECK_KEYS = dict(zip(CHECKS, "sixbd", strict=True))
_PAGE_TITLES = (  # of a candidate's further pages, in the order of their numbers
    "facts", "measured", "all fits", "mixture", "dips", "pictures", "look-alikes", "rulings", "story",
)  # fmt: skip


def _list_keys(place: str) -> tuple[Key, ...]:
    return (
        Key(f"{place}.up", "up,k", "up", "up", "One line up.", 0),
        Key(f"{place}.down", "down,j", "down", "down", "One line down.", 0),
        Key(f"{place}.page_up", "pageup", "page_up", "page up", "One screen up.", 0),
        Key(f"{place}.page_down", "pagedown,space", "page_down", "page down", "One screen down.", 0),
        Key(f"{place}.first", "home,g", "first", "first", "To the first line.", 0),
        Key(f"{place}.last", "end,G", "last", "last", "To the last line.", 0),
    )


_LEAVE = Key("leave.back", "q", "back", "back", "Back to where you came from.", 1)
_HELP = Key("desk.help", "question_mark", "help", "help", "The keys of this place, each with its reason.", 1)
_THEME = Key("desk.theme", "T", "next_theme", "colours", "The next set of colours: dark, light, contrast, terminal.", 0)

QUEUE = (
    Key("queue.next", "m", "next_for_me", "next, fewest finished",
        "Open the star that the fewest have finished, of those that need you and are on nobody's screen.", 1),
    Key("queue.open", "enter", "open", "open", "Open the chosen candidate, at the first check you have not ruled.", 1),
    *(
        Key(f"queue.unresolved_{check}", key, f"unresolved('{check}')", "unresolved",
            f"Only those unresolved in {CHECK_TITLES[check]} to you; again for all.", 2)
        for check, key in _CHECK_KEYS.items()
    ),
    Key("queue.needs_me", "n", "needs_me", "needs me",
        "Only candidates that still need a ruling from you; again for all.", 2),
    Key("queue.all", "0", "all", "all", "Every candidate: drops filter and search.", 2),
    Key("queue.find", "slash", "find", "find",
        "Search the names: those that begin with what you type, then those that hold it.", 2),
    Key("queue.order", "o", "order", "order", "The next order: oddness, name, what you have ruled, outcome.", 2),
    Key("queue.reverse", "O", "reverse", "reverse", "Turn the order around.", 0),
    Key("queue.split", "v", "split", "split: all notes",
        "Where rulings part: everybody's notes on the check side by side, to rule once more.", 3),
    Key("queue.story", "y", "story", "story", "What happened to the chosen candidate, in time order.", 3),
    Key("queue.tally", "t", "tally", "tally", "How far the team is, whether it can be trusted, and what is left.", 2),
    Key("queue.practice", "p", "practice", "practice",
        "Three practice stars with their answers; nothing of it is written.", 3),
    *_list_keys("queue"),
    Key("queue.quit", "q", "quit", "quit",
        "Leave, once q is pressed again; everything is kept. From a count of the tally: back to the tally.", 1),
    Key("queue.quit_now", "Q", "quit_now", "quit at once", "Leave without being asked again.", 0),
)
TALLY = (
    Key("tally.up", "up,k", "up", "up", "The line above.", 0),
    Key("tally.down", "down,j", "down", "down", "The line below.", 0),
    Key("tally.page_down", "pagedown,space", "page_down", "page down", "One screen down.", 2),
    Key("tally.page_up", "pageup", "page_up", "page up", "One screen up.", 2),
    Key("tally.first", "home,g", "first", "top", "To the beginning.", 3),
    Key("tally.last", "end,G", "last", "end", "To the end.", 3),
    Key("tally.left", "left", "left", "left", "The count to the left.", 0),
    Key("tally.right", "right", "right", "right", "The count to the right.", 0),
    Key("tally.list", "enter", "list", "list them",
        "Show the candidates that the line counts, in the queue.", 1),
    Key("tally.reviewers", "r", "reviewers", "reviewers",
        "What each reviewer has done, and back to the tally. There is no ranking.", 2),
    Key("tally.write", "w", "write_out", "write out",
        "Write the team's vetted list to a file: past every seal, for everyone's eyes.", 2),
)
SPLIT = (
    Key("split.explains", "e", "choose('explains')", "explains",
        _CHOOSE["explains"], 1),
    Key("split.short", "f", "choose('short')", "falls short", _CHOOSE["short"], 1),
    Key("split.unclear", "u", "choose('unclear')", "unclear",
        f"{_CHOOSE['unclear']} It is not counted as sure.", 1),
    Key("split.note", "a", "note", "note", "Write a note beside your ruling: what decided it.", 2),
    Key("split.record", "enter", "record", "record",
        "Record what you chose, with the note, as seen with the others' in view.", 1),
    Key("split.up", "up,k", "up", "up", "Scroll up.", 0),
    Key("split.down", "down,j", "down", "down", "Scroll down.", 0),
)
STORY = _list_keys("story")
HELP = (
    Key("help.up", "up", "up", "up", "The line above.", 0),
    Key("help.down", "down", "down", "down", "The line below.", 0),
    Key("help.page_up", "pageup", "page_up", "page up", "One screen up.", 0),
    Key("help.page_down", "pagedown", "page_down", "page down", "One screen down.", 0),
    Key("help.find", "slash", "find", "find an action", "Type part of what you want to do.", 1),
    Key("help.do", "enter", "do", "do it", "Do the chosen action, back where you came from.", 1),
)
CANDIDATE = (
    Key("candidate.explains", "e", "choose('explains')", "explains",
        _CHOOSE["explains"], 1),
    Key("candidate.short", "f", "choose('short')", "falls short", _CHOOSE["short"], 1),
    Key("candidate.unclear", "u", "choose('unclear')", "unclear", _CHOOSE["unclear"], 1),
    Key("candidate.record", "enter", "record", "record",
        "Record what you chose, with its note, and go on to the next check you have to rule.", 1),
    Key("candidate.note", "a", "note", "a note",
        "Write a note beside the ruling. Tab leaves it; it is kept as you type.", 1),
    Key("candidate.reaffirm", "r", "reaffirm", "it stands",
        "Choose your ruling once more: it is stale and still holds, or gets a further note. Enter records it.", 0),
    Key("candidate.withdraw", "w", "withdraw", "withdraw", "Choose: withdraw your ruling on this check.", 2),
    Key("candidate.later", "l", "later", "later", "Leave this candidate for later and take the next.", 2),
    Key("candidate.next", "m", "next_for_me", "next for me",
        "The star that the fewest have finished, of those that still need you.", 2),
    Key("candidate.last", "z", "last_candidate", "the one before", "Back to the candidate you had before this one.", 0),
    Key("candidate.split", "N", "split", "all notes",
        "Where rulings on this check part: everybody's notes side by side, to rule once more.", 0),
    Key("candidate.next_check", "tab", "next_check", "check", "The next check; by hand, the next number.", 1),
    Key("candidate.previous_check", "shift+tab", "previous_check", "check", "The check before.", 0),
    *(
        Key(f"candidate.check_{check}", key, f"check('{check}')", "check", f"Go to the check {CHECK_TITLES[check]}.", 0)
        for check, key in _CHECK_KEYS.items()
    ),
    Key("candidate.left", "left", "point(-1)", "point", "The point to the left, in words.", 0),
    Key("candidate.right", "right", "point(1)", "point", "The point to the right, in words.", 0),
    Key("candidate.up", "up", "up", "up", "The fit before; by hand, more of the chosen number; on a page, up.", 0),
    Key("candidate.down", "down", "down", "down",
        "The next fit; by hand, less of the chosen number; on a page, down.", 0),
    Key("candidate.page_up", "pageup", "page_up", "page up", "One screen up; by hand, a large step up.", 0),
    Key("candidate.page_down", "pagedown", "page_down", "page down", "One screen down; by hand, a large step down.", 0),
    Key("candidate.zoom_in", "plus,equals_sign", "zoom(1)", "zoom", "Closer, about the point under the cursor.", 0),
    Key("candidate.zoom_out", "minus", "zoom(-1)", "zoom", "Farther.", 0),
    Key("candidate.pan_left", "less_than_sign", "pan(-1)", "move", "Zoomed: towards shorter wavelengths.", 0),
    Key("candidate.pan_right", "greater_than_sign", "pan(1)", "move", "Zoomed: towards longer wavelengths.", 0),
    Key("candidate.quantity", "F", "quantity", "F_nu or nu F_nu",
        "Draw nu F_nu, where a black body's share of the light shows, or F_nu.", 0),
    Key("candidate.plot", "p", "plot", "plot", "The plot alone, as large as the screen; again for the numbers.", 2),
    Key("candidate.views", "v", "views", "views",
        f"The next page: {', '.join(_PAGE_TITLES)}.", 2),
    Key("candidate.views_back", "V", "views_back", "page before", "The page before.", 0),
    *(
        Key(f"candidate.page_{n}", str(n), f"page({n})", "page", f"The page {title}.", 0)
        for n, title in enumerate(_PAGE_TITLES, start=1)
    ),
    Key("candidate.stretch", "S", "stretch", "stretch", "Pictures: the faint, the middle or the bright parts.", 0),
    Key("candidate.swap", "n", "swap", "other bands",
        "Pictures: another band in the same place, to see what moves or fades.", 0),
    Key("candidate.hand", "h", "hand", "by hand", "Change numbers by hand: the curve and chi-square follow.", 2),
    Key("candidate.drop", "space", "drop", "drop",
        "By hand: leave the band under the cursor out of the fit, or take it in again.", 0),
    Key("candidate.release", "o", "release", "let it fit", "By hand: let the chosen number be fitted again.", 0),
    Key("candidate.reset", "0", "reset", "reset", "By hand: the program's own fit. Else the whole plot again.", 0),
    Key("candidate.compare", "c", "compare", "compare", "Draw another check's best fit on the same plot.", 2),
)
PLACES: Mapping[str, tuple[Key, ...]] = MappingProxyType(
    {
        "queue": (*QUEUE, _THEME, _HELP),
        "candidate": (*CANDIDATE, _LEAVE, _THEME, _HELP),
        "tally": (*TALLY, _LEAVE, _THEME, _HELP),
        "split": (*SPLIT, _LEAVE, _THEME, _HELP),
        "story": (*STORY, _LEAVE, _THEME, _HELP),
        "help": (*HELP, _LEAVE),
    }
)
PLACE_TITLES = MappingProxyType(
    {"queue": "Queue", "candidate": "Candidate", "tally": "Tally", "split": "Split", "story": "Story", "help": "Help"}
)
_SHOWN = MappingProxyType(
    {"enter": "Enter", "question_mark": "?", "slash": "/", "space": "Space", "tab": "Tab", "up": "Up", "down": "Down"}
    | {"left": "Left", "right": "Right", "pageup": "PgUp", "pagedown": "PgDn", "home": "Home", "end": "End"}
    | {"plus": "+", "minus": "-", "backspace": "Backspace", "escape": "Esc", "comma": ",", "full_stop": "."}
    | {"less_than_sign": "<", "greater_than_sign": ">", "equals_sign": "=", "shift+tab": "Shift+Tab"}
)


def bindings(place: str) -> list[Binding]:
    """The bindings of a place, each with the id by which a reader may remap it."""
    return [Binding(key.keys, key.action, key.label, show=False, id=key.id) for key in PLACES[place]]


def checked_keymap(wanted: Mapping[str, str]) -> dict[str, str]:
    """The keys that a reader asked for, if they can all be had.

    Raises:
        SettingError: an unknown action or key, a key that stays the terminal's, or one key for two actions of a place.
    """
    if not wanted:
        return {}
    from tui.desk.key_names import canonical_list  # most people keep the desk's own keys

    given = {action: canonical_list(keys) for action, keys in wanted.items()}
    for action, keys in given.items():
        _refuse_unknown(action, keys)
    for place, entries in PLACES.items():
        kept = {key.id: key.keys for key in entries if key.id not in given}
        _refuse_clash(place, kept | {key.id: given[key.id] for key in entries if key.id in given})
    return given


def shown(keys: str) -> str:
    """A key as people read it on their keyboard; the first, where an action has several.

    >>> shown("question_mark"), shown("down,j"), shown("G")
    ('?', 'Down', 'G')
    """
    first = keys.split(",")[0]
    return _SHOWN.get(first, first)


def _refuse_unknown(action: str, keys: str) -> None:
    from tui.desk.key_names import is_key, nearest, nearest_keys

    known = {key.id for place in PLACES.values() for key in place}
    if action not in known:
        raise _refusal(action, f"there is no such action. Nearest: {', '.join(nearest(action, known))}.")
    for key in keys.split(","):
        if key in RESERVED:
            raise _refusal(action, f"{key!r} stays the terminal's, as do {', '.join(sorted(RESERVED - {key}))}.")
        if not key:
            raise _refusal(action, "it is given no key.")
        if not is_key(key):
            usable = [name for name in nearest_keys(key) if name not in RESERVED]
            raise _refusal(action, f"there is no key {key!r}. Nearest: {', '.join(usable)}.")


def _refusal(action: str, reason: str) -> SettingError:
    from tui.workflow.config import config_path

    return SettingError(f"keys.{action}", f"{reason} Mend it in {config_path()}.")


def _refuse_clash(place: str, keys_of: Mapping[str, str]) -> None:
    owner: dict[str, str] = {}
    for action, keys in keys_of.items():
        for key in keys.split(","):
            if owner.setdefault(key.strip(), action) != action:
                raise _refusal(action, f"{key!r} is already {owner[key.strip()]} in the place {place}.")
