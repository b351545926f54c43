"""Where a note is written: several lines, Tab leaves, every keystroke is reported so that it can be kept."""

from __future__ import annotations

from dataclasses import dataclass

from textual import events
from textual.message import Message
from textual.widgets import TextArea

from tui.workflow.records import MAX_NOTE
from tui.workflow.safe_text import safe

TOO_LONG = f"A note holds {MAX_NOTE:,} characters: {{left_out:,}} more were left out."


class NoteEditor(TextArea):
    """A plain text area that gives Tab back and keeps a note to a sane length."""

    @dataclass
    class Typed(Message):
        """The note reads so now."""

        text: str

    @dataclass
    class Full(Message):
        """More was typed or pasted than a note holds."""

        left_out: int

    @dataclass
    class Left(Message):
        """The reviewer is done writing."""

    def __init__(self, *, id: str | None = None) -> None:
        super().__init__(
            id=id, soft_wrap=True, show_line_numbers=False, tab_behavior="focus", highlight_cursor_line=False
        )

    def open(self, text: str) -> None:
        """Show a note to go on with, the cursor at its end."""
        self._show(tame(text)[:MAX_NOTE])
        self.focus()

    async def _on_key(self, event: events.Key) -> None:
        if event.key in ("tab", "shift+tab", "escape"):
            event.stop()
            event.prevent_default()
            self.post_message(self.Left())
            return
        await super()._on_key(event)

    async def _on_paste(self, event: events.Paste) -> None:
        """What is pasted goes in whole and in order, made tame before, as far as there is room."""
        event.prevent_default()
        event.stop()
        room = MAX_NOTE - len(self.text) + len(self.selected_text)
        pasted = tame(event.text)
        if len(pasted) > room:
            self.post_message(self.Full(len(pasted) - room))
        if pasted[:room] and (result := self._replace_via_keyboard(pasted[:room], *self.selection)):
            self.move_cursor(result.end_location)

    def on_text_area_changed(self, event: TextArea.Changed) -> None:
        """Tell at every keystroke, paste included; what could steer a terminal is made visible at once."""
        event.stop()
        tamed = tame(self.text)
        if len(tamed) > MAX_NOTE:
            self.post_message(self.Full(len(tamed) - MAX_NOTE))
            tamed = tamed[:MAX_NOTE]
        if tamed != self.text:
            self._show(tamed)
        self.post_message(self.Typed(tamed))

    def _show(self, text: str) -> None:
        with self.prevent(TextArea.Changed):
            self.load_text(text)
        self.move_cursor(self.document.end)


def tame(text: str) -> str:
    """A note fit for a terminal: its line ends kept, each as one, tabs as spaces, control characters shown.

    >>> tame("one\\r\\ntwo\\tthree\\x1b[2J")
    'one\\ntwo three�[2J'
    """
    lines = text.replace("\r\n", "\n").replace("\r", "\n").expandtabs(4)
    return safe(lines, newlines=True)
