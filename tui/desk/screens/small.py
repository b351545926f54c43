"""What stands on a terminal too small for the desk."""

from __future__ import annotations

from textual import events
from textual.app import ComposeResult
from textual.screen import Screen
from textual.widgets import Static

from tui.desk.help import TOO_SMALL


class SmallScreen(Screen[None]):
    """One plain sentence; everything else waits beneath it."""

    AUTO_FOCUS = ""

    def compose(self) -> ComposeResult:
        """The sentence."""
        yield Static("", id="too-small", markup=False)

    def on_resize(self, event: events.Resize) -> None:
        """Say the size as it is now."""
        self.query_one(Static).update(TOO_SMALL.format(width=event.size.width, height=event.size.height))
