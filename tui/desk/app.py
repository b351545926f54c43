"""The desk as an app: one session, the screens on top of one another, colours, signals."""

from __future__ import annotations

import asyncio
import gc
import os
import select
import signal
import threading
from collections.abc import Mapping
from time import monotonic
from typing import TYPE_CHECKING, Any

from textual import events
from textual.binding import Binding
from textual.screen import Screen

from tui.desk.guard import Guarded
from tui.desk.help import BREAK_AFTER_S, BREAK_LINE
from tui.desk.keys import checked_keymap
from tui.desk.text import clock
from tui.desk.theme import DEFAULT_THEME, THEME_NAMES, describe, theme_name, themes
from tui.errors import SettingError

if TYPE_CHECKING:
    from tui.workflow.session import Session

SMALLEST = (80, 24)
GRACE_S = 2.0  # after a signal, for putting the terminal back as it was
INPUT, LOOK_S = 0, 2.0  # the terminal's file, and how often we see whether it is still there


class Desk(Guarded, inherit_bindings=False):
    """Everything a reader sees; what a key does to the queue is the session's work."""

    TITLE = "Plainlight"
    CSS_PATH = ["desk.tcss", "screens/queue.tcss"]  # the first screen's too: one parsing before the first rows, not two
    ENABLE_COMMAND_PALETTE = False
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
        self._is_small = False
        self._watch: threading.Timer | None = None
        self._sat_down: float | None = None  # monotonic seconds; None before the first ruling
        if thin:
            self.animation_level = "none"
        for one in themes():
            self.register_theme(one)
        self.theme = theme_name(theme or DEFAULT_THEME)
        self.set_keymap(self.keys_of)

    def get_default_screen(self) -> Screen[None]:
        """The queue lies under everything else."""
        from tui.desk.screens.queue import QueueScreen

        return QueueScreen(self.session)

    def on_mount(self) -> None:
        """End in order when the line is cut; come back from ctrl+z whole, though nothing has changed meanwhile."""
        self.app_resume_signal.subscribe(self, lambda app: app.refresh())
        loop = asyncio.get_running_loop()
        for number in (signal.SIGTERM, signal.SIGHUP):
            loop.add_signal_handler(number, self.leave_at_once, number)
        if not self.is_headless and os.isatty(INPUT):
            self.set_interval(LOOK_S, self.leave_a_gone_terminal)

    def leave_a_gone_terminal(self) -> None:
        """End where the terminal is gone and nobody was told, as under nohup; reading on would spin for ever."""
        watch = select.poll()
        watch.register(INPUT, 0)
        if any(happened & (select.POLLHUP | select.POLLERR) for _, happened in watch.poll(0)):
            self.leave_at_once(signal.SIGHUP)

    def on_ready(self) -> None:
        """The first screen is drawn: what was imported for it stays for good, and is not looked through for garbage.

        Each look would take some 10 ms, in the midst of some key.
        """
        if not gc.isenabled():  # whoever started the desk saw to it
            gc.freeze()
            gc.enable()

    def leave_at_once(self, number: int) -> None:
        """Leave in order; where the terminal is gone and its writer would wait for ever, leave without.

        Whatever was ruled or typed is in the file already.
        """
        self._watch = threading.Timer(GRACE_S, os._exit, (128 + number,))
        self._watch.daemon = True
        self._watch.start()
        self.exit()

    def on_resize(self, event: events.Resize) -> None:
        """Below the smallest size a plain sentence stands in for everything, until there is room again."""
        is_small = event.size.width < SMALLEST[0] or event.size.height < SMALLEST[1]
        if is_small and not self._is_small:
            from tui.desk.screens.small import SmallScreen

            self.push_screen(SmallScreen())
        elif self._is_small and not is_small:
            self.pop_screen()
        self._is_small = is_small

    def run(self, **options: Any) -> None:
        """Run in this terminal; on a slow line without following the mouse."""
        try:
            super().run(**{"mouse": not self.thin} | options)
        finally:
            if self._watch is not None:
                self._watch.cancel()

    def next_theme(self) -> str:
        """Take the next set of colours; returns what it is, in words."""
        now = THEME_NAMES.index(self.theme.removeprefix(theme_name("")))
        short = THEME_NAMES[(now + 1) % len(THEME_NAMES)]
        self.theme = theme_name(short)
        return f"Colours: {short}, {describe(short)}. To keep them: theme = \"{short}\" in the config file."

    def note_ruling(self, utc: str) -> None:
        """A ruling was recorded at `utc`."""
        self.saved = clock(utc)
        if self._sat_down is None:
            self._sat_down = monotonic()

    def break_line(self) -> str:
        """Once in a long round, a word about a break; else empty."""
        sat = 0.0 if self._sat_down is None else monotonic() - self._sat_down
        if sat < BREAK_AFTER_S:
            return ""
        self._sat_down = None
        return BREAK_LINE.format(minutes=round(sat / 60))
