"""The desk as an app: one session, the screens on top of one another, colours, signals."""

from __future__ import annotations

import asyncio
import os
import signal
import sys
from collections.abc import Mapping
from typing import TYPE_CHECKING

from textual import events
from textual.app import App
from textual.binding import Binding

from tui.desk.keys import checked_keymap
from tui.desk.text import clock
from tui.desk.theme import DEFAULT_THEME, THEME_NAMES, describe, theme_name, themes
from tui.errors import SettingError, TuiError

if TYPE_CHECKING:
    from tui.workflow.session import Session

SMALLEST = (80, 24)


class Desk(App[None], inherit_bindings=False):
    """Everything a reader sees; what a key does to the queue is the session's work."""

    TITLE = "Plainlight"
    CSS_PATH = "desk.tcss"
    ENABLE_COMMAND_PALETTE = False
    HORIZONTAL_BREAKPOINTS = [(0, "-narrow"), (165, "-wide"), (230, "-widest")]
    BINDINGS = [  # these two do what they always do in a terminal
        Binding("ctrl+c", "quit", show=False, priority=True),
        Binding("ctrl+z", "suspend_process", show=False, priority=True),
    ]

    def __init__(
        self,
        session: Session,
        *,
        thin: bool = False,
        theme: str | None = None,
        keys: Mapping[str, str] | None = None,
    ) -> None:
        """Make the desk ready to run.

        Args:
            session: an open queue; the desk never closes it.
            thin: for slow lines: no animation, rarer looks at what others wrote, nothing drawn beside the list.
            theme: one of `THEME_NAMES`.
            keys: action id -> keys, in place of the desk's own.
        Raises:
            SettingError: no such theme or action, or a key that cannot be used.
        """
        self.keys_of = checked_keymap(keys or {})
        if theme is not None and theme not in THEME_NAMES:
            raise SettingError("theme", f"there is no {theme!r}. They are {', '.join(THEME_NAMES)}.")
        super().__init__()
        self.session = session
        self.thin = thin
        self.saved = ""  # hours and minutes of the last ruling recorded here
        self.rulings_made = 0
        if thin:
            self.animation_level = "none"
        for one in themes():
            self.register_theme(one)
        self.theme = theme_name(theme or DEFAULT_THEME)
        self.set_keymap(self.keys_of)

    def on_mount(self) -> None:
        """Show the queue, and end in order when the line is cut."""
        from tui.desk.screens.queue import QueueScreen

        loop = asyncio.get_running_loop()
        for number in (signal.SIGTERM, signal.SIGHUP):
            loop.add_signal_handler(number, self.exit)
        self.push_screen(QueueScreen(self.session))

    def on_resize(self, event: events.Resize) -> None:
        """Below the smallest size a plain sentence stands in for everything, until there is room again."""
        from tui.desk.screens.small import SmallScreen

        is_small = event.size.width < SMALLEST[0] or event.size.height < SMALLEST[1]
        if is_small and not isinstance(self.screen, SmallScreen):
            self.push_screen(SmallScreen())
        elif not is_small and isinstance(self.screen, SmallScreen):
            self.pop_screen()

    def next_theme(self) -> str:
        """Take the next set of colours; returns what it is, in words."""
        now = THEME_NAMES.index(self.theme.removeprefix(theme_name("")))
        short = THEME_NAMES[(now + 1) % len(THEME_NAMES)]
        self.theme = theme_name(short)
        return f"Colours: {short}, {describe(short)}. To keep them: theme = \"{short}\" in the config file."

    def note_ruling(self, utc: str) -> None:
        """A ruling was recorded at `utc`."""
        self.saved = clock(utc)
        self.rulings_made += 1


def run_desk(
    session: Session, *, thin: bool = False, theme: str | None = None, keys: Mapping[str, str] | None = None
) -> None:
    """Run the desk in this terminal until the reader leaves.

    Raises:
        TuiError: this is no terminal that the desk can draw on.
        SettingError: as `Desk`.
    """
    if not sys.stdin.isatty() or not sys.stdout.isatty():
        raise TuiError("The desk needs a terminal. Without one, use plainlight list, show, rule.")
    if os.environ.get("TERM", "dumb") in {"dumb", "unknown", ""}:
        raise TuiError("This terminal (TERM=dumb) cannot be drawn on. Use plainlight list, show, rule.")
    desk = Desk(session, thin=thin, theme=theme, keys=keys)
    start_helpers()
    desk.run(mouse=not thin)


def start_helpers() -> None:
    """Start what worker processes will need, before the app owns the terminal's files."""
    from multiprocessing import resource_tracker

    resource_tracker.ensure_running()
