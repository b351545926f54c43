"""The line in which a file is named: the folder it goes to stands above, the name has the whole width."""

from __future__ import annotations

from pathlib import Path

from textual.app import ComposeResult
from textual.binding import Binding
from textual.containers import Vertical
from textual.message import Message
from textual.widgets import Input, Static

from tui.desk.text import fit, safe

FOLDER = " write the list into "


class FileInput(Input):
    """A text line that Enter ends and Escape or Tab leave."""

    BINDINGS = [Binding("enter", "name", show=False), Binding("escape,tab", "leave", show=False)]
    LEAVES = ("Enter", "writes the file; Esc or Tab: nothing is written; letters are text here")

    def action_name(self) -> None:
        """This name it shall be; none is no name."""
        path = self.value.strip()
        self.post_message(FileLine.Named(path) if path else FileLine.Left())

    def action_leave(self) -> None:
        """No file after all."""
        self.post_message(FileLine.Left())


class FileLine(Vertical):
    """Shown while the reader names a file."""

    DEFAULT_CSS = """
    FileLine { height: 2; display: none; }
    FileLine .prompt { height: 1; color: $attention; }
    FileLine Input { height: 1; border: none; padding: 0 1; background: transparent; }
    """

    class Left(Message):
        """The reader wants no file."""

    class Named(Message):
        """The reader wants this file."""

        def __init__(self, path: str) -> None:
            super().__init__()
            self.path = path

    def compose(self) -> ComposeResult:
        """The folder, and the line under it."""
        yield Static("", markup=False, classes="prompt")
        entry = FileInput(compact=True, select_on_focus=False)
        entry.cursor_blink = False  # a blink is a repaint, on slow lines too
        yield entry

    def open(self, name: str) -> None:
        """Show the line with a name in it, ready to type."""
        self.display = True
        folder = fit(safe(str(Path.cwd())), self.app.size.width - len(FOLDER), cut="middle")
        self.query_one(Static).update(FOLDER + folder.rstrip())
        entry = self.query_one(FileInput)
        entry.value = name
        entry.cursor_position = len(name)
        entry.focus()
