"""What a reader may see of a queue, as records: the store's, offered here to the desk and the command line."""

from __future__ import annotations

from tui.store.records import CandidateView, Filter, QueueRow, RulingLine, StoryLine

__all__ = ["CandidateView", "Filter", "QueueRow", "RulingLine", "StoryLine"]
