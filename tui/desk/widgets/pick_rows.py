"""Rows of text of which some can be chosen: help, tally, story."""

from __future__ import annotations

from collections.abc import Callable, Hashable
from dataclasses import dataclass, field

from textual import events
from textual.message import Message

from tui.desk.widgets.rows import Row, Span, fit_row
from tui.desk.widgets.rows_view import RowsView

ALL = 10_000  # screens: more than anything takes


@dataclass(frozen=True, slots=True)
class PickRow:
    """One row; those with a target can be chosen. The first two columns are left for the mark."""

    spans: Row = field(default_factory=list)
    target: Hashable | None = None


class PickRows(RowsView):
    """Shows rows and a mark on the chosen one; moving skips rows that cannot be chosen."""

    class Picked(Message):
        """The chosen row was clicked once more."""

    def __init__(self, make: Callable[[int], list[PickRow]], *, id: str | None = None) -> None:
        super().__init__(self._marked_rows, scrolls=True, id=id)
        self.make = make
        self.line = 0
        self._made: list[PickRow] = []
        self._made_for = -1

    def renew(self) -> None:
        """What is shown has changed."""
        self._made_for = -1
        self.rows_from(self._marked_rows)

    @property
    def target(self) -> Hashable | None:
        """What the chosen row stands for."""
        if self.size.width:
            self._redraw()
        return self._made[self.line].target if 0 <= self.line < len(self._made) else None

    def move(self, rows: int) -> None:
        """Choose the next row that can be chosen, so many on; where there is none, scroll."""
        places = self._places
        if not places:
            self.scroll_rows(rows)
            return
        now = min(range(len(places)), key=lambda i: abs(places[i] - self.line))
        wanted = now + rows
        self.choose(places[max(0, min(wanted, len(places) - 1))])
        if wanted < 0 or wanted >= len(places):
            self.scroll_rows(rows)

    def turn(self, screens: int) -> None:
        """Move by whole screens, one row staying in sight, and choose what can be chosen nearest to before."""
        self.scroll_rows(screens * max(1, self.size.height - 1))
        seen = range(self._first, self._first + self.size.height - self.has_above_below[1])
        places = [i for i in self._places if i in seen]
        if places:
            self.line = min(places, key=lambda i: abs(i - self.line))
            self.rows_from(self._marked_rows)

    def choose_nearest(self, line: int) -> None:
        """Choose the row that can be chosen and stands nearest to a line."""
        self._redraw()
        if self._places:
            self.choose(min(self._places, key=lambda i: abs(i - line)))

    @property
    def has_above_below(self) -> tuple[bool, bool]:
        """Whether there are rows above those in sight, and below."""
        if not self.size.height:
            return False, False
        self._redraw()
        return self._first > 0, self._first + self.size.height < len(self._made)

    @property
    def _places(self) -> list[int]:
        return [i for i, made in enumerate(self._made) if made.target is not None]

    def choose(self, line: int) -> None:
        """Choose a row and bring it into sight."""
        self.line = line
        self.rows_from(self._marked_rows)
        if line < self._first + 1:
            self.scroll_rows(line - 1 - self._first)
        elif line > self._first + self.size.height - 3:
            self.scroll_rows(line - self._first - self.size.height + 3)

    def on_click(self, event: events.Click) -> None:
        """Choose the row under the mouse; one already chosen is picked."""
        line = event.y + self._first
        if 0 <= line < len(self._made) and self._made[line].target is not None:
            if line == self.line:
                self.post_message(self.Picked())
            self.choose(line)

    def _marked_rows(self, width: int, height: int) -> list[Row]:
        if self._made_for != width:
            self._made, self._made_for = self.make(width), width
            if self.target is None:
                self.line = next((i for i, made in enumerate(self._made) if made.target is not None), 0)
                self._made = self.make(width)  # a row may look otherwise once it is the chosen one
        return [self._marked(i, made, width) for i, made in enumerate(self._made)]

    def _marked(self, line: int, made: PickRow, width: int) -> Row:
        if made.target is None:
            return made.spans
        if line != self.line:
            return [Span("  "), *made.spans]
        return [Span("> ", "key"), *fit_row(made.spans, width - 2)]
