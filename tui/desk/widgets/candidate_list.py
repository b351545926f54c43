"""A list of any length that draws only the lines in sight; it is given ids and a way to get their rows."""

from __future__ import annotations

from array import array
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from rich.segment import Segment
from rich.style import Style
from textual import events
from textual.cache import LRUCache
from textual.geometry import Size
from textual.message import Message
from textual.reactive import reactive
from textual.scroll_view import ScrollView
from textual.strip import Strip

from tui.desk.text import fit, wrap
from tui.desk.widgets.late_styles import LateStyles
from tui.desk.widgets.queue_columns import Cell, columns_for, row_cells

if TYPE_CHECKING:
    from tui.workflow.records import QueueRow

ROWS_KEPT = 4096  # rows of the queue, some 1 kB each
STRIPS_KEPT = 1024  # drawn lines
STYLES = (
    "plain", "name", "quiet", "attention", "key", "active",
    "todo", "open", "split", "explains", "short", "unclear", "nodata",
    "ordinary", "explained", "unexplained", "pending", "sealed",
)  # fmt: skip


class CandidateList(LateStyles, ScrollView, can_focus=True):
    """The queue's rows in a given order, with one of them chosen.

    `fetch` is called on the interface's thread for the lines in sight only and must be quick.
    """

    cursor: reactive[int] = reactive(0, repaint=False)

    @dataclass
    class Chosen(Message):
        """Another candidate is chosen, or the chosen one's row was read anew; None when the list is empty."""

        row: QueueRow | None

    class Opened(Message):
        """The chosen candidate was clicked once more."""

    def __init__(self, fetch: Callable[[Sequence[int]], list[QueueRow]], *, id: str | None = None) -> None:
        super().__init__(id=id)
        self.fetch = fetch
        self.ids: array[int] = array("q")
        self.empty_text = ""
        self._rows: LRUCache[int, QueueRow] = LRUCache(ROWS_KEPT)
        self._strips: LRUCache[tuple[int, bool, int], Strip] = LRUCache(STRIPS_KEPT)
        self._styles: dict[tuple[str, bool], Style] = {}

    # --- what is listed ---

    def show(self, ids: array[int], cursor: int, empty_text: str = "") -> None:
        """List these candidates; keep the chosen line where it was on the screen, if it can be."""
        above = self.cursor - self.scroll_offset.y
        self.ids, self.empty_text = ids, empty_text
        self._resize()
        self.set_reactive(CandidateList.cursor, max(0, min(cursor, len(ids) - 1)))
        self.scroll_to(y=max(0, self.cursor - max(0, min(above, self._page - 1))), animate=False)
        self._see_cursor()
        self.forget_rows()

    def forget_rows(self) -> None:
        """Read the rows in sight anew: somebody wrote."""
        self._rows.clear()
        self._strips.clear()
        self.refresh()
        self._tell()

    @property
    def chosen(self) -> QueueRow | None:
        """The chosen candidate's row."""
        return self.row_at(self.cursor)

    def row_at(self, line: int) -> QueueRow | None:
        """The row on a line, fetched with its neighbours in sight if need be; None where it is gone."""
        if not 0 <= line < len(self.ids):
            return None
        candidate_id = self.ids[line]
        row = self._rows.get(candidate_id)
        if row is None:
            first = min(line, self.scroll_offset.y)
            last = max(line + 1, self.scroll_offset.y + self._page)
            if last - first > 3 * self._page:
                first, last = line, line + self._page
            for found in self.fetch(self.ids[first:last]):
                self._rows[found.id] = found
            row = self._rows.get(candidate_id)
        return row

    # --- moving ---

    def move(self, lines: int) -> None:
        """Choose the candidate so many lines below (above, when negative)."""
        self.choose(self.cursor + lines)

    def choose(self, line: int) -> None:
        """Choose the candidate on a line, as near as there is one."""
        self.cursor = max(0, min(line, len(self.ids) - 1))

    @property
    def page(self) -> int:
        """Lines to move by when a screen is turned: one stays in sight."""
        return max(1, self._page - 1)

    def watch_cursor(self, old: int, new: int) -> None:
        """Draw the two lines that changed, and scroll if the new one is out of sight."""
        self.refresh_line(old)
        self.refresh_line(new)
        self._see_cursor()
        self._tell()

    def on_click(self, event: events.Click) -> None:
        """Choose the line under the mouse; one already chosen is opened."""
        line = event.y + self.scroll_offset.y
        if not 0 <= line < len(self.ids):
            return
        if line == self.cursor:
            self.post_message(self.Opened())
        self.choose(line)

    def on_resize(self) -> None:
        """Keep the chosen line in sight."""
        self._strips.clear()
        self._resize()
        self._see_cursor()

    def notify_style_update(self) -> None:
        """Colours changed: every drawn line is out of date."""
        super().notify_style_update()
        self._styles.clear()
        self._strips.clear()

    # --- drawing ---

    def render_line(self, y: int) -> Strip:
        """The strip for a line of the screen."""
        width = self.size.width
        line = y + self.scroll_offset.y
        if not self.ids:
            return self._empty_line(y, width)
        if line >= len(self.ids):
            return Strip.blank(width, self._style("plain", False))
        key = (self.ids[line], line == self.cursor, width)
        strip = self._strips.get(key)
        if strip is None:
            strip = self._draw(line, width)
            self._strips[key] = strip
        return strip

    def _draw(self, line: int, width: int) -> Strip:
        row = self.row_at(line)
        chosen = line == self.cursor
        if row is None:
            return self._strip([("  gone from the queue", "quiet")], width, chosen)
        return self._strip(row_cells(row, columns_for(width), chosen), width, chosen)

    def _strip(self, cells: list[Cell], width: int, chosen: bool) -> Strip:
        strip = Strip([Segment(text, self._style(name, chosen)) for text, name in cells])
        return strip.adjust_cell_length(width, self._style("plain", chosen))

    def _empty_line(self, y: int, width: int) -> Strip:
        lines = wrap(self.empty_text, max(20, width - 6))
        text = lines[y - 1] if 1 <= y <= len(lines) else ""
        return self._strip([("   " + fit(text, width - 3), "plain")], width, False)

    def _style(self, name: str, chosen: bool) -> Style:
        """The style of a cell; never None, which a monochrome terminal's filter cannot take."""
        style = self._styles.get((name, chosen))
        if style is None:
            known = name if name in STYLES else "plain"
            style = self.rich_style + self.get_component_rich_style(f"candidate-list--{known}", partial=True)
            if chosen:
                style += self.get_component_rich_style("candidate-list--cursor", partial=True)
            self._styles[name, chosen] = style
        return style

    # --- inside ---

    @property
    def _page(self) -> int:
        return max(1, self.size.height)

    def _resize(self) -> None:
        self.virtual_size = Size(self.size.width, max(1, len(self.ids)))

    def _see_cursor(self) -> None:
        top = self.scroll_offset.y
        if self.cursor < top:
            self.scroll_to(y=self.cursor, animate=False)
        elif self.cursor >= top + self._page:
            self.scroll_to(y=self.cursor - self._page + 1, animate=False)

    def _tell(self) -> None:
        self.post_message(self.Chosen(self.chosen))
