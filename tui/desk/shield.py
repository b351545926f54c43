"""Around each widget of the desk: nothing that fails in its drawing or in its handlers gets out and ends the app."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import TYPE_CHECKING, Any

from rich.segment import Segment
from textual.content import Content
from textual.dom import DOMNode
from textual.geometry import Region, Size
from textual.strip import Strip
from textual.visual import Visual, visualize
from textual.widget import Widget
from textual.widgets import Static

if TYPE_CHECKING:
    from tui.desk.guard import Guarded

INSTEAD = "could not be drawn"


def shield(app: Guarded, widget: Widget) -> None:
    """Put the guard of the app around a widget's handlers, its measures and its drawing; once is enough."""
    if "_dispatch_message" in vars(widget):
        return
    dispatch = widget._dispatch_message
    widget._dispatch_message = lambda message: app.dispatched(dispatch, message, widget)
    for name, instead in INSTEADS.items():
        setattr(widget, name, shielded(app, widget, getattr(widget, name), instead))


def shielded(app: Guarded, widget: Widget, draw: Callable[..., Any], instead: Callable[..., Any]) -> Callable[..., Any]:
    """One of a widget's ways to draw or to measure itself, with something else where it fails."""

    def attempt(*args: Any) -> Any:
        try:
            return draw(*args)
        except Exception as error:  # whatever it is: all else on the screen can be drawn
            if not app.is_guarded:
                raise
            app.caught_drawing(error, thing_of(widget))
            return instead(widget, *args)

    return attempt


def thing_of(node: DOMNode) -> str:
    """What a part of the desk is called: a `SpectrumPlot` is the spectrum plot, plain text what its id says."""
    name = node.id if node.id and type(node) is Static else type(node).__name__
    return re.sub(r"(?<=[a-z])(?=[A-Z])", " ", name).lower()


def words(widget: Widget) -> Visual:
    """In place of a drawing: that it lacks."""
    return visualize(widget, Content(INSTEAD))


def line(widget: Widget, y: int) -> Strip:
    """The same on one line of a widget that draws line by line."""
    style = widget.rich_style  # never None, which a monochrome terminal's filter cannot take
    return Strip([Segment(f"  {INSTEAD}", style)]).adjust_cell_length(widget.size.width, style)


def nothing(widget: Widget, crop: Region) -> list[Strip]:
    """Blank lines, as many and as long as were asked for."""
    return [Strip.blank(crop.width, widget.rich_style)] * crop.height


def whole_width(widget: Widget, container: Size, viewport: Size) -> int:
    """All the room there is, where what is needed cannot be told."""
    return container.width


def one_line(widget: Widget, container: Size, viewport: Size, width: int) -> int:
    """Room for the words."""
    return 1


INSTEADS: dict[str, Callable[..., Any]] = {
    "_render": words,
    "render_line": line,
    "render_lines": nothing,
    "get_content_width": whole_width,
    "get_content_height": one_line,
}
