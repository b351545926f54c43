"""What the queue shows and in which order: the reader's wishes, as one value."""

from __future__ import annotations

from dataclasses import dataclass, replace

from tui.model import CHECK_TITLES
from tui.workflow.records import Filter

ORDERS = ("oddness", "name", "ruled", "outcome")
_ORDER_WORDS = {
    ("oddness", True): "oddness",
    ("oddness", False): "oddness, least first",
    ("name", False): "name",
    ("name", True): "name, last first",
    ("ruled", True): "yours, most ruled first",
    ("ruled", False): "yours, least ruled first",
    ("outcome", False): "outcome",
    ("outcome", True): "outcome, last first",
}


@dataclass(frozen=True, slots=True)
class QueueView:
    """A filter, an order and, while a search stands, what was typed."""

    unresolved: str | None = None
    needs_me: bool = False
    counted: str = ""  # the line of the tally whose candidates are listed
    names: frozenset[str] | None = None  # those candidates
    unnamed: int = 0  # others that it counts, still sealed to the reader
    sort: str = "oddness"
    descending: bool = True
    find: str = ""

    @property
    def where(self) -> Filter:
        """The filter as the store takes it."""
        return Filter(unresolved=self.unresolved, needs_me=self.needs_me, names=self.names)

    @property
    def is_whole(self) -> bool:
        """True where every candidate is listed."""
        return self.unresolved is None and not self.needs_me and self.names is None and not self.find

    def toggled(self, check: str) -> QueueView:
        """Only the candidates unresolved in `check`; all again when that is what is shown."""
        return replace(self, unresolved=None if self.unresolved == check else check, find="")

    def next_order(self) -> QueueView:
        """The next order; numbers start with the greatest, words with A."""
        sort = ORDERS[(ORDERS.index(self.sort) + 1) % len(ORDERS)]
        return replace(self, sort=sort, descending=sort == "oddness")

    def whole(self) -> QueueView:
        """Every candidate, in the same order."""
        return QueueView(sort=self.sort, descending=self.descending)

    def filter_words(self) -> str:
        """What is listed, in words."""
        if self.find:
            return f"names like {self.find!r}"
        said = [f"{CHECK_TITLES[self.unresolved]} unresolved"] if self.unresolved else []
        said += ["needs you"] if self.needs_me else []
        sealed = f" ({self.unnamed} sealed)" if self.unnamed else ""
        said += [self.counted + sealed] if self.names is not None else []
        return ", ".join(said) or "all"

    def order_words(self) -> str:
        """The order, in words."""
        return _ORDER_WORDS[self.sort, self.descending]

    def empty_words(self) -> str:
        """Why nothing is listed, and the way out."""
        if self.is_whole:
            return "The queue is empty. plainlight load QUEUE TABLE puts candidates into it."
        if self.find:
            return f"No name begins with or holds {self.find!r}. Type another, or leave the line empty for all."
        return f"Nothing to list: {self.filter_words()}. 0 shows every candidate."
