"""The last guard: what fails unforeseen while the desk draws or answers a key costs one quiet line, not the desk.

Textual ends the message loop of a widget in which an exception arises, and the app with it. Here the exception
stops at the widget (shield.py): where a drawing fails stand a few words, and a handler that fails is left undone.
It is written to the user's log file once, and said once until the next key, so that what fails anew at every
repaint neither fills the file nor keeps the desk busy. In a test an exception goes its usual way: the test fails.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from rich.text import Text
from textual import events
from textual.app import App
from textual.content import Content
from textual.dom import DOMNode
from textual.message import Message
from textual.widget import Widget
from textual.widgets import Static
from textual.worker import Worker, WorkerFailed, WorkerState

from tui.desk.shield import shield, thing_of
from tui.desk.text import safe
from tui.errors import TuiError

NOT_DRAWN = "The {thing} could not be drawn ({kind}); all else goes on. {where}"
NOT_DONE = "Something went wrong in the {thing} ({kind}); the desk goes on. {where}"
NOT_STARTED = "Plainlight failed through a fault of its own ({kind}). {where}"
FAREWELL = "Not everything could be drawn or done. Please send {path} to whoever maintains Plainlight."
FAULTS = 1  # exit status, as of every command that finds faults
Fault = tuple[str, ...]  # where, what, and the line of the program


class Guarded(App[None]):
    """An app that outlives its faults while it runs in a terminal; in a test, where `is_guarded` is set."""

    is_guarded = False

    def __init__(self, **options: Any) -> None:
        super().__init__(**options)
        self._kept: dict[Fault, str] = {}  # where each was written down
        self._said: set[Fault] = set()  # since the last key
        self._farewell = ""

    def run(self, **options: Any) -> None:
        """Run in this terminal, guarded; where a fault was caught, a word about it at the end."""
        self.is_guarded = True
        super().run(**options)
        if self._farewell:
            self.error_console.print(Text(self._farewell), soft_wrap=True)

    @property
    def return_code(self) -> int | None:
        """The exit status; 1 where a fault was caught."""
        return super().return_code or (FAULTS if self._kept else super().return_code)

    @property
    def _has_screen(self) -> bool:
        """Whether anything can be said; before the first screen and after the last it cannot."""
        return self._running and bool(self._screen_stack)

    # --- where faults are caught ---

    def _register_child(self, parent: DOMNode, child: Widget, before: int | None, after: int | None) -> None:
        shield(self, child)
        super()._register_child(parent, child, before, after)

    async def _dispatch_message(self, message: Message) -> None:
        if isinstance(message, events.Key):
            self._said.clear()
        await self.dispatched(super()._dispatch_message, message, self)

    async def dispatched(self, dispatch: Callable[[Message], Any], message: Message, node: DOMNode) -> None:
        """Hand a message to a node's handlers; what they raise is caught, and what a worker raised before."""
        if isinstance(message, Worker.StateChanged) and message.state is WorkerState.ERROR:
            self._handle_exception(message.worker.error)
        try:
            await dispatch(message)
        except Exception as error:  # whatever it is: the next message can be answered
            if not (self.is_guarded and self._has_screen):
                raise
            self.caught(error, NOT_DONE, thing_of(node))

    def caught_drawing(self, error: Exception, thing: str) -> None:
        """A part of the desk could not be drawn."""
        self.caught(error, NOT_DRAWN, thing)

    def _handle_exception(self, error: BaseException) -> None:
        """What Textual caught itself, of a timer, a worker or a layout; at the start it still ends the app."""
        error = error.error if isinstance(error, WorkerFailed) else error
        if not self.is_guarded:
            super()._handle_exception(error)
        elif self._has_screen:
            self.caught(error, NOT_DONE, "background")
        else:
            self._farewell = self.told(error, NOT_STARTED, "start or the end")
            self._close_messages_no_wait()

    # --- what is made of them ---

    def caught(self, error: BaseException, sentence: str, thing: str) -> None:
        """Say a fault, unless it was said since the last key."""
        fault = fault_of(error, sentence, thing)
        if fault not in self._said:
            self._said.add(fault)
            self.call_later(self.tell, self.told(error, sentence, thing))

    def told(self, error: BaseException, sentence: str, thing: str) -> str:
        """The line about a fault, which is written down if it is new; an error raised on purpose has its own line."""
        if isinstance(error, TuiError):
            return str(error)
        fault = fault_of(error, sentence, thing)
        if fault not in self._kept:
            self._kept[fault] = self._keep(error, thing)
        return sentence.format(thing=thing, kind=type(error).__name__, where=self._kept[fault])

    def _keep(self, error: BaseException, thing: str) -> str:
        from tui.workflow.fault_log import keep_fault

        try:
            path = keep_fault(error, thing)
        except OSError as refused:
            return f"Its details could not be kept ({refused.strerror})."
        self._farewell = FAREWELL.format(path=path)
        return f"Details: {path}"

    async def tell(self, text: str) -> None:
        """A quiet line on the screen in front, which may lack one."""
        screen = self.screen
        if not screen.query("#message"):
            await screen.mount(Static("", id="message", markup=False, classes="docked"))
        line = screen.query_one("#message", Static)
        line.update(Content(safe(text)))
        line.add_class("error")
        line.display = True


def fault_of(error: BaseException, sentence: str, thing: str) -> Fault:
    """What makes two faults the same one: part of the desk, kind of exception, line of the program."""
    trace = error.__traceback__
    while trace is not None and trace.tb_next is not None:
        trace = trace.tb_next
    place = f"{trace.tb_frame.f_code.co_filename}:{trace.tb_lineno}" if trace else ""
    return sentence, thing, type(error).__name__, place
