"""Help: what a place is for, every key with its reason, every sign; any action can be found by its name and done."""

from __future__ import annotations

from collections.abc import Iterable

from rich.cells import cell_len
from textual import on
from textual.app import ComposeResult
from textual.widgets import Input, Static

from tui.desk.help import WHAT_FOR, WORDS
from tui.desk.keys import PLACE_TITLES, PLACES, Key, bindings, shown
from tui.desk.screens.base import DeskScreen
from tui.desk.text import fit, wrap
from tui.desk.widgets.find_line import FindLine
from tui.desk.widgets.key_line import KeyLine
from tui.desk.widgets.pick_rows import PickRow, PickRows
from tui.desk.widgets.rows import Row, Span, hanging, row

KEYS_WIDE = 13
LABEL_MOST = 24  # cells of an action's name; the longest there is takes 22
WIDEST = 96  # columns of reading text


class HelpScreen(DeskScreen[str | None]):
    """The help of one place; dismissed with the action that was chosen, if any."""

    PLACE = "help"
    CSS_PATH = "rows.tcss"
    BINDINGS = bindings("help")

    def __init__(self, place: str) -> None:
        super().__init__()
        self.about = place
        self.wanted = ""

    def compose(self) -> ComposeResult:
        """Title, text, search line, keys."""
        yield Static(f" {PLACE_TITLES[self.about].upper()}   what it is for, and its keys", id="title", markup=False)
        yield PickRows(self.make_rows, id="rows")
        yield FindLine(" find an action ", "  Enter: to the list ", id="find")
        yield Static("", id="message", markup=False)
        yield self.key_line(1)

    def make_rows(self, width: int) -> list[PickRow]:
        """The whole text for a width, or what was searched for."""
        width = min(width, WIDEST)
        if self.wanted:
            return found_rows(self.wanted, self.about, self.app.keys_of, width)
        rows = [PickRow(line) for text in WHAT_FOR[self.about] for line in [*_text_rows(text, width), []]]
        rows.append(PickRow(row((" THE KEYS HERE", "head"), ("   Enter does the chosen one", "quiet"))))
        rows += key_rows(self.about, self.app.keys_of, width)
        rows += [PickRow(), PickRow(row((" SIGNS AND WORDS", "head")))]
        rows += [PickRow(line) for sign, text in WORDS for line in _entry(sign, "strong", text, width, KEYS_WIDE)]
        return [*rows, PickRow(), *elsewhere_rows(self.about)]

    def offers(self, action_id: str) -> bool:
        """Enter where an action of this place is chosen."""
        return action_id != "help.do" or any(isinstance(rows.target, Key) for rows in self.query(PickRows))

    def on_mount(self) -> None:
        """The keys that work stand on the last line once there are rows to choose from."""
        self.call_after_refresh(self.query_one(KeyLine).renew)

    def action_up(self) -> None:
        """The action above."""
        self.query_one(PickRows).move(-1)

    def action_down(self) -> None:
        """The action below."""
        self.query_one(PickRows).move(1)

    def action_page_up(self) -> None:
        """One screen up."""
        rows = self.query_one(PickRows)
        rows.scroll_rows(1 - rows.size.height)

    def action_page_down(self) -> None:
        """One screen down."""
        rows = self.query_one(PickRows)
        rows.scroll_rows(rows.size.height - 1)

    def action_find(self) -> None:
        """Type part of what one wants to do."""
        self.query_one(FindLine).open(self.wanted)

    @on(Input.Changed)
    def find_as_typed(self, message: Input.Changed) -> None:
        """Show the actions that speak of it."""
        message.stop()
        self.wanted = message.value.strip()
        self.query_one(PickRows).renew()
        self.call_after_refresh(self.query_one(KeyLine).renew)

    @on(FindLine.Left)
    def leave_find(self) -> None:
        """Letters are keys again."""
        self.set_focus(None)

    @on(PickRows.Picked)
    def action_do(self) -> None:
        """Back, and do the chosen action there."""
        target = self.query_one(PickRows).target
        if isinstance(target, Key):
            self.dismiss(target.action)

    def action_help(self) -> None:
        """Help on help would lead nowhere."""
        self.dismiss(None)


def key_rows(place: str, keymap: dict[str, str], width: int) -> list[PickRow]:
    """One action after the other, each with its keys, its name and its reason."""
    rows: list[PickRow] = []
    label_wide = _label_wide(PLACES[place])
    for key in PLACES[place]:
        rows += _key_rows(key, keymap, width, key, label_wide)
    return rows


def found_rows(wanted: str, place: str, keymap: dict[str, str], width: int) -> list[PickRow]:
    """The actions whose name, key or reason holds every word searched for; those of other places say where."""
    words = wanted.casefold().split()
    rows: list[PickRow] = []
    for other in (place, *(name for name in PLACES if name != place)):
        hits = [key for key in PLACES[other] if _speaks_of(key, words) and (other == place or key not in PLACES[place])]
        if hits:
            where = "here" if other == place else f"in {PLACE_TITLES[other]}"
            rows += [PickRow(), PickRow(row((f" {where}", "head")))]
            label_wide = _label_wide(hits)
            for key in hits:
                rows += _key_rows(key, keymap, width, key if other == place else None, label_wide)
    return rows or [PickRow(), PickRow(row((f" No action speaks of {wanted!r}.", "")))]


def elsewhere_rows(place: str) -> list[PickRow]:
    """Where the rest is told."""
    others = ", ".join(title for name, title in PLACE_TITLES.items() if name not in {place, "help"})
    return [PickRow(row((f" Each place has its own help: {others}.", "quiet")))]


def _speaks_of(key: Key, words: list[str]) -> bool:
    text = f"{key.id} {key.label} {key.why}".casefold()
    return all(word in text for word in words)


def _label_wide(keys: Iterable[Key]) -> int:
    """Cells for the names of these actions, a gap behind the longest."""
    return min(LABEL_MOST, 2 + max(cell_len(key.label) for key in keys))


def _key_rows(key: Key, keymap: dict[str, str], width: int, target: Key | None, label_wide: int) -> list[PickRow]:
    names = " ".join(shown(name) for name in keymap.get(key.id, key.keys).split(","))
    head = [Span(fit(names, KEYS_WIDE - 1) + " ", "key"), Span(fit(key.label, label_wide - 1) + " ", "strong")]
    margin = Span("  ")  # where the mark of a row that can be chosen would stand
    first, *rest = hanging(head, key.why, width - 4)
    spans = first if target is not None else [margin, *first]
    return [PickRow(spans, target), *(PickRow([margin, *line]) for line in rest)]


def _entry(head: str, style: str, text: str, width: int, head_wide: int) -> list[Row]:
    return hanging([Span("  " + fit(head, head_wide), style)], text, width - 2)


def _text_rows(text: str, width: int) -> list[Row]:
    return [[Span(f" {line}")] for line in wrap(text, width - 2)]
