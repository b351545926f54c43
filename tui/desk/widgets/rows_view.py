"""The widget that shows rows of styled text: it asks for them at its own size and turns style names into colours."""

from __future__ import annotations

from collections.abc import Callable

from rich.segment import Segment
from rich.style import Style
from textual.geometry import Size
from textual.selection import Selection
from textual.strip import Strip

from tui.desk.widgets.late_styles import LateStyles
from tui.desk.widgets.rows import Row, Span, fit_row, fit_rows, row_text

Draw = Callable[[int, int], list[Row]]

# Style name -> component class of the style sheet. The order is that of importance only.
NAMES = (
    "grid", "axis", "zero", "spectrum", "component-a", "component-b", "component-c", "component-d", "other", "total",
    "width", "bar", "stem", "label", "limit", "dropped", "point", "far", "cursor", "cursor-line", "name", "now",
    "explains", "short",
    "unclear", "split", "open", "todo", "nodata", "sealed", "question", "quiet", "caution", "head", "key", "chosen",
    "strong", "message",
)  # fmt: skip


class RowsView(LateStyles):
    """Rows made anew for each size; `rows_from` draws, `scroll_rows` moves where there are more than fit."""

    ALLOW_SELECT = True

    def __init__(self, draw: Draw | None = None, *, scrolls: bool = False, id: str | None = None) -> None:
        super().__init__(id=id)
        self._scrolls = scrolls
        self._draw = draw
        self._rows: list[Row] = []
        self._drawn_for: Size | None = None
        self._first = 0
        self._styles: dict[str, Style] = {}
        self._strips: list[Strip] = []
        self._strips_for: tuple[Size, int] | None = None

    def rows_from(self, draw: Draw) -> None:
        """Show what `draw(width, height)` gives; more rows than fit can be scrolled."""
        self._draw = draw
        self._drawn_for = None
        self.refresh()

    def redraw(self) -> None:
        """Ask for the rows anew: what they tell of has changed."""
        self._drawn_for = None
        self.refresh()

    def to_top(self) -> None:
        """Show the first rows again."""
        self._first = 0
        self.refresh()

    def scroll_rows(self, lines: int) -> None:
        """Move by some rows, never past the ends."""
        self._redraw()
        self._first = min(max(self._first + lines, 0), max(0, len(self._rows) - self.size.height))
        self.refresh()

    @property
    def has_more(self) -> bool:
        """Whether there are more rows than fit."""
        self._redraw()
        return len(self._rows) > self.size.height

    @property
    def text(self) -> str:
        """All rows as plain text, those below the edge included."""
        self._redraw()
        return "\n".join(row_text(spans).rstrip() for spans in self._rows)

    def shown_rows(self) -> list[Row]:
        """What stands on the screen: exactly the widget's size, the last row saying when there is more."""
        self._redraw()
        width, height = self.size
        rows = fit_rows(self._rows[self._first :], width, height)
        if height and len(self._rows) - self._first > height:
            below = len(self._rows) - self._first - height + 1
            rows[-1] = fit_row([Span(f"-- {below} more: Down --" if self._scrolls else "..", "key")], width)
        return rows

    def render_line(self, y: int) -> Strip:
        """One line of the screen, from rows kept until size, contents or place change."""
        self._redraw()
        key = (self.size, self._first)
        if self._strips_for != key:
            self._strips = [self._strip(spans) for spans in self.shown_rows()]
            self._strips_for = key
        if y >= len(self._strips):
            return Strip.blank(self.size.width, self.rich_style)
        return self._selected(self._strips[y], y).apply_offsets(0, y) if self.ALLOW_SELECT else self._strips[y]

    def _strip(self, spans: Row) -> Strip:
        return Strip([Segment(span.text, self.style_of(span)) for span in spans], self.size.width)

    def _selected(self, strip: Strip, y: int) -> Strip:
        """The strip with what the mouse marked standing out."""
        span = self.text_selection.get_span(y) if self.text_selection is not None else None
        if span is None:
            return strip
        start, end = span[0], self.size.width if span[1] == -1 else span[1]
        marked = strip.crop(start, end).apply_style(Style(reverse=True))
        return Strip.join([strip.crop(0, start), marked, strip.crop(end)])

    def style_of(self, span: Span) -> Style:
        """The terminal's style of a span, with what a click on it does."""
        style = self._styles.get(span.style)
        if style is None:
            base = self.rich_style
            if span.style.startswith("#"):  # a colour by itself: a pixel of a picture
                style = base + Style.parse(span.style)
            elif span.style in NAMES:
                style = base + self.get_component_rich_style(f"rows--{span.style}", partial=True)
            else:
                style = base
            self._styles[span.style] = style
        return style + Style(meta={"@click": f"screen.{span.action}"}) if span.action else style

    def notify_style_update(self) -> None:
        super().notify_style_update()
        self._styles.clear()
        self._strips_for = None

    def get_selection(self, selection: Selection) -> tuple[str, str] | None:
        """What the mouse marked, as plain text."""
        return selection.extract("\n".join(row_text(spans) for spans in self.shown_rows())), "\n"

    def _redraw(self) -> None:
        if self._drawn_for != self.size:
            self._rows = self._draw(*self.size) if self._draw else []
            self._drawn_for = self.size
            self._first = min(self._first, max(0, len(self._rows) - self.size.height))
            self._strips_for = None
