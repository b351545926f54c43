"""What a reader may see of a queue, as records: the store's, offered here to the desk and the command line."""

from __future__ import annotations

from tui.store.records import SORTS, CandidateView, Cutout, Filter, QueueRow, RulingLine, StoryLine
from tui.store.rulings import MAX_NOTE

__all__ = ["MAX_NOTE", "SORTS", "CandidateView", "Cutout", "Filter", "QueueRow", "RulingLine", "StoryLine"]
