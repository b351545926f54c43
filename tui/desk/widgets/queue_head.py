"""The lines above the list: whose queue, what needs the reader, what is listed; and the heads of the columns."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from rich.cells import cell_len
from textual import events
from textual.content import Content
from textual.message import Message

from tui.desk.queue_view import QueueView
from tui.desk.text import KEY_OF_CHECK, fit, safe, thousands
from tui.desk.widgets.late_styles import LateStyles
from tui.desk.widgets.queue_columns import Cell, columns_for, count_cells, head_cells
from tui.model import CHECKS

HEAD_STYLES = ("name", "quiet", "attention", "key", "active", "plain")


@dataclass(frozen=True, slots=True)
class HeadFacts:
    """Everything that the lines above the list say."""

    queue_name: str = ""
    handle: str = ""
    saved: str = ""
    view: QueueView = field(default_factory=QueueView)
    counts: Mapping[str, int] = field(default_factory=dict)
    line: int = 0
    listed: int = 0
    is_ordering: bool = False
    letters: Mapping[str, str] = field(default_factory=lambda: KEY_OF_CHECK)  # the key that filters by each check


class HeadLines(LateStyles):
    """Draws lines made of cells in named styles."""

    facts = HeadFacts()

    def show(self, facts: HeadFacts) -> None:
        """Draw these facts, if they are others."""
        if facts != self.facts:
            self.facts = facts
            self.refresh()

    def lines(self, width: int) -> list[list[Cell]]:
        """The lines, each `width` cells wide."""
        return []

    def render(self) -> Content:
        """The lines in their colours."""
        style = {name: self.get_visual_style(f"head--{name}") for name in HEAD_STYLES}
        return Content("\n").join(
            Content.assemble(*((text, style[name]) for text, name in line)) for line in self.lines(self.size.width)
        )


class QueueTitle(HeadLines):
    """Two lines: the queue and the reader; what needs the reader, what is listed and how it is ordered."""

    DEFAULT_CSS = "QueueTitle { height: 2; }"

    def lines(self, width: int) -> list[list[Cell]]:
        """First the queue and the reader, then the reader's work."""
        facts = self.facts
        reader = f"you: {safe(facts.handle)}" if facts.handle else "reading, not ruling"
        right = [*([f"saved {facts.saved}"] if facts.saved else []), reader]
        end = "   ".join(right) + " "
        name = fit(" " + safe(facts.queue_name), max(10, width - cell_len(end)))
        return [[(name, "name"), (end, "quiet")], self._work_line(width)]

    def _work_line(self, width: int) -> list[Cell]:
        facts = self.facts
        cells: list[Cell] = []
        needs = facts.counts.get("needs_me") if facts.handle else None
        if needs is not None:
            text = f" {thousands(needs)} NEED{'S' if needs == 1 else ''} YOU   " if needs else " nothing needs you   "
            cells.append((text, "attention" if needs else "quiet"))
        listed = f"{thousands(facts.line)} of {thousands(facts.listed)}"
        cells.append((" showing ", "quiet"))
        cells.append((facts.view.filter_words(), "active" if not facts.view.is_whole else "plain"))
        cells.append((f"  {listed}", "quiet"))
        order = "ordering ..." if facts.is_ordering else f"order: {facts.view.order_words()}"
        room = width - sum(cell_len(text) for text, _ in cells) - 1
        cells.append((fit("  " + order, room, align="right") + " ", "quiet"))
        return cells


class ColumnHead(HeadLines):
    """Two lines over the list's own columns: their names, and how many candidates each check is unresolved for."""

    DEFAULT_CSS = "ColumnHead { height: 2; }"

    @dataclass
    class CheckClicked(Message):
        """The head of a check's column was clicked."""

        check: str

    def lines(self, width: int) -> list[list[Cell]]:
        """Names and counts, cell by cell over the list's columns."""
        view, columns = self.facts.view, columns_for(width)
        unresolved = {check: self.facts.counts.get(f"unresolved:{check}") for check in CHECKS}
        return [
            head_cells(columns, view.sort, view.unresolved, self.facts.letters),
            count_cells(columns, {check: n for check, n in unresolved.items() if n is not None}, view.unresolved),
        ]

    def on_click(self, event: events.Click) -> None:
        """A click in a check's column filters by it."""
        columns = columns_for(self.size.width)
        start = 2 + columns.name + columns.oddness + columns.band + columns.pull + 2 * columns.gap
        place = (event.x - start) // columns.check
        if event.x >= start and place < len(CHECKS):
            self.post_message(self.CheckClicked(CHECKS[place]))
