"""The keys of a place, on one or two lines; what is bound is what is shown, and a click does the same."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace

from rich.cells import cell_len
from textual import events
from textual.content import Content
from textual.geometry import Size
from textual.widget import Widget

from tui.desk.keys import Key, shown


@dataclass(frozen=True, slots=True)
class Entry:
    """One piece of the line: keys as people read them, what they do, and the action of a click."""

    keys: str
    label: str
    action: str
    rank: int

    @property
    def width(self) -> int:
        """Cells, with the gap after it."""
        return cell_len(self.keys) + 1 + cell_len(self.label) + 2


def entries(keys: tuple[Key, ...], keymap: Mapping[str, str]) -> list[Entry]:
    """The pieces for these actions under this key map; neighbours with one label share a piece.

    >>> keys = Key("a.one", "s", "", "check", ""), Key("a.two", "i", "", "check", "")
    >>> [(entry.keys, entry.label) for entry in entries(keys, {"a.two": "7"})]
    [('s 7', 'check')]
    """
    found: list[Entry] = []
    for key in keys:
        if key.rank == 0:
            continue
        name = shown(keymap.get(key.id, key.keys))
        if found and found[-1].label == key.label:
            found[-1] = Entry(f"{found[-1].keys} {name}", key.label, "", key.rank)
        else:
            found.append(Entry(name, key.label, key.action, key.rank))
    return found


def chosen_lines(pieces: list[Entry], width: int, lines: int) -> list[list[Entry]]:
    """The pieces that fit, in their order, those of the greatest rank left out first."""
    for rank in sorted({piece.rank for piece in pieces}, reverse=True):
        placed = _placed([piece for piece in pieces if piece.rank <= rank], width)
        if len(placed) <= lines:
            return placed
    return _placed([piece for piece in pieces if piece.rank <= 1], width)[:lines]


def _placed(pieces: list[Entry], width: int) -> list[list[Entry]]:
    lines: list[list[Entry]] = [[]]
    used = 0
    for piece in pieces:
        if used + piece.width - 2 > width and lines[-1]:
            lines.append([])
            used = 0
        lines[-1].append(piece)
        used += piece.width
    return lines


IN_NOTE = ("Tab", "leaves the note; Enter begins a new line")  # the key that leaves, and what is said of it


class KeyLine(Widget):
    """Draws the keys of a place; told again whenever what can be done changes."""

    COMPONENT_CLASSES = {"key-line--key", "key-line--label"}
    DEFAULT_CSS = "KeyLine { height: auto; padding: 0 1; }"

    def __init__(
        self,
        keys: tuple[Key, ...],
        keymap: Mapping[str, str],
        lines: int = 2,
        offers: Callable[[str], bool | str] = lambda action: True,
    ) -> None:
        """Made for the keys of a place.

        Args:
            lines: at most so many.
            offers: whether an action, by its id, does something as things stand; or what it does then, in other words.
        """
        super().__init__()
        self.keys, self.keymap, self.lines, self.offers = keys, keymap, lines, offers
        self.pieces = self._pieces_now()

    def renew(self) -> None:
        """Things may stand differently now."""
        pieces = self._pieces_now()
        if pieces != self.pieces:
            self.pieces = pieces
            self.refresh(layout=len(self.placed()) != self.size.height)

    def on_mount(self) -> None:
        """While something is typed letters are no keys: the line says how to leave instead."""
        self.watch(self.screen, "focused", self.renew, init=False)

    def _pieces_now(self) -> list[Entry]:
        typed_in = self.screen.focused if self.is_attached else None
        if typed_in is not None:
            from textual.widgets import Input, TextArea  # the first rows come before there is anything to type in

            if isinstance(typed_in, (Input, TextArea)):
                return [Entry(*getattr(typed_in, "LEAVES", IN_NOTE), "", 1)]
        answers = [(key, self.offers(key.id)) for key in self.keys]
        offered = (replace(key, label=said) if isinstance(said, str) else key for key, said in answers if said)
        return entries(tuple(offered), self.keymap)

    def get_content_height(self, container: Size, viewport: Size, width: int) -> int:
        """As many lines as the keys take at this width, up to the most allowed."""
        return len(chosen_lines(self.pieces, width, self.lines))

    def render(self) -> Content:
        """The lines."""
        key_style, label_style = self.get_visual_style("key-line--key"), self.get_visual_style("key-line--label")
        drawn = []
        for line in self.placed():
            parts = [part for piece in line for part in ((piece.keys, key_style), (f" {piece.label}  ", label_style))]
            drawn.append(Content.assemble(*parts))
        return Content("\n").join(drawn)

    def placed(self) -> list[list[Entry]]:
        """The pieces as they stand on the lines."""
        return chosen_lines(self.pieces, self.size.width or 78, self.lines)

    async def on_click(self, event: events.Click) -> None:
        """A click on a piece does what its key does."""
        place = event.get_content_offset(self)
        if place is None or place.y >= len(self.placed()):
            return
        start = 0
        for piece in self.placed()[place.y]:
            if start <= place.x < start + piece.width - 2 and piece.action:
                await self.screen.run_action(piece.action)
                return
            start += piece.width
