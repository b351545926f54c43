"""One line to search in: what is typed is looked for at once."""

from __future__ import annotations

from textual.app import ComposeResult
from textual.binding import Binding
from textual.containers import Horizontal
from textual.message import Message
from textual.widgets import Input, Static


class FindInput(Input):
    """A text line that the Enter, Tab and arrow keys leave."""

    BINDINGS = [
        Binding("enter,tab,down,up", "leave", show=False),
        Binding("escape", "give_up", show=False),  # never needed: on slow lines it may be taken for another key's start
    ]
    LEAVES = ("Enter", "ends the line; Esc drops it; letters are text here")

    def action_leave(self) -> None:
        """Back to the list."""
        self.post_message(FindLine.Left())

    def action_give_up(self) -> None:
        """Back to the whole list."""
        self.value = ""
        self.post_message(FindLine.Left(is_given_up=True))


class FindLine(Horizontal):
    """Shown while the reader searches."""

    DEFAULT_CSS = """
    FindLine { height: 1; display: none; }
    FindLine Static { width: auto; }
    FindLine Input { width: 1fr; height: 1; border: none; padding: 0; background: transparent; }
    """

    class Left(Message):
        """The reader is done typing; `is_given_up`: and wants nothing of it."""

        def __init__(self, is_given_up: bool = False) -> None:
            super().__init__()
            self.is_given_up = is_given_up

    def __init__(self, prompt: str = " find ", hint: str = "  Enter: to the list ", *, id: str | None = None) -> None:
        super().__init__(id=id)
        self.prompt, self.hint = prompt, hint

    def compose(self) -> ComposeResult:
        """The word, the line, the way out."""
        yield Static(self.prompt, markup=False, classes="prompt")
        entry = FindInput(compact=True, select_on_focus=False)
        entry.cursor_blink = False  # a blink is a repaint, on slow lines too
        yield entry
        yield Static(self.hint, markup=False, classes="hint")

    def open(self, text: str) -> None:
        """Show the line with a text in it, ready to type."""
        self.display = True
        entry = self.query_one(FindInput)
        entry.value = text
        entry.cursor_position = len(text)
        entry.focus()

    @property
    def text(self) -> str:
        """What stands in the line."""
        return self.query_one(FindInput).value

    def close(self) -> None:
        """Hide it."""
        self.display = False
