"""Styles of parts of a widget, looked up in the style sheet when they are first drawn.

Textual looks up all that `COMPONENT_CLASSES` declares whenever a widget is styled, twice while a screen opens; a
widget that can draw in forty styles but uses six pays for eighty look-ups, and a page of five such widgets for
four hundred, which was two fifths of what opening it took.
"""

from __future__ import annotations

from textual.css.styles import RenderStyles
from textual.dom import DOMNode
from textual.widget import Widget


class LateStyles(Widget):
    """A widget whose `get_component_styles` takes any class that the style sheet knows, declared or not."""

    def get_component_styles(self, *names: str) -> RenderStyles:
        """The style sheet's styles of some classes, as if a part of this widget had them."""
        for name in names:
            if name not in self._component_styles:
                part = DOMNode(classes=name)
                part._attach(self)
                self.app.stylesheet.apply(part)
                self._component_styles[name] = part.styles
        return super().get_component_styles(*names)

    def notify_style_update(self) -> None:
        """Colours changed: what was looked up is out of date, and so is what was drawn."""
        self._component_styles.clear()
        super().notify_style_update()
        self.refresh()
