"""The plot of one candidate on the screen: `draw_spectrum` at the widget's size, and the mouse on its points."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from textual import events
from textual.message import Message

from tui.desk.widgets.plot_data import PlotData, PlotView
from tui.desk.widgets.plot_draw import draw_spectrum, point_at
from tui.desk.widgets.rows import Row
from tui.desk.widgets.rows_view import RowsView

PLAIN_TERMINALS = frozenset({"linux", "vt100", "vt102", "vt220", "ansi", "cons25"})


def braille_works(environ: Mapping[str, str]) -> bool:
    """Whether this terminal says that it can show more than plain letters; a bare console's font has no braille.

    >>> braille_works({"LANG": "en_GB.UTF-8", "TERM": "xterm-256color"}), braille_works({"LANG": "C"})
    (True, False)
    """
    locale = environ.get("LC_ALL") or environ.get("LC_CTYPE") or environ.get("LANG") or "utf-8"
    is_utf8 = "utf-8" in locale.lower() or "utf8" in locale.lower()
    return is_utf8 and environ.get("TERM", "") not in PLAIN_TERMINALS


class SpectrumPlot(RowsView):
    """Draws what it is given; never computes or queries."""

    ALLOW_SELECT = False  # dots are nothing to copy, and every span would carry its place

    @dataclass
    class PointPicked(Message):
        """The mouse chose a point of the plot."""

        index: int

    @dataclass
    class Zoomed(Message):
        """The mouse wheel asked to come nearer (1) or go farther (-1)."""

        direction: int

    def __init__(self, *, unicode: bool = True, id: str | None = None) -> None:
        super().__init__(self._rows_at, id=id)
        self.unicode = unicode
        self.plot = PlotData()
        self.view = PlotView()

    def show(self, plot: PlotData, view: PlotView) -> None:
        """Draw these points and curves, this part of them."""
        self.plot, self.view = plot, view
        self.rows_from(self._rows_at)

    def _rows_at(self, width: int, height: int) -> list[Row]:
        return draw_spectrum(width, height, self.plot, self.view, self.unicode)

    def on_click(self, event: events.Click) -> None:
        index = point_at(*self.size, self.plot, self.view, event.x, event.y)
        if index is not None:
            self.post_message(self.PointPicked(index))

    def on_mouse_scroll_up(self, event: events.MouseScrollUp) -> None:
        event.stop()
        self.post_message(self.Zoomed(1))

    def on_mouse_scroll_down(self, event: events.MouseScrollDown) -> None:
        event.stop()
        self.post_message(self.Zoomed(-1))
