"""Questions that nobody waits for any more."""

from __future__ import annotations

import pytest

from tests.store.making import fill
from tui.errors import StoreError
from tui.store import stopping
from tui.store.stopping import while_wanted
from tui.store.views import find_substring, view_order

NAMES = [f"SM-{number:04d}" for number in range(300)]
QUESTIONS = {
    "search": lambda queue: find_substring(queue, "1"),
    "order": lambda queue: view_order(queue, None),
    "sort": lambda queue: view_order(queue, None, sort="outcome"),
}


@pytest.fixture
def long_queue(queue, monkeypatch):
    """Three hundred candidates, and looks so frequent that each question sees several."""
    fill(queue, NAMES)
    monkeypatch.setattr(stopping, "STEPS", 5)
    return queue


@pytest.mark.parametrize("ask", QUESTIONS.values(), ids=QUESTIONS)
def test_a_question_ends_as_soon_as_its_answer_is_not_wanted(long_queue, ask):
    looks = []

    def is_wanted():
        looks.append(1)
        return len(looks) < 3

    answer = ask(long_queue)
    with while_wanted(long_queue, is_wanted), pytest.raises(StoreError):
        ask(long_queue)
    assert not long_queue.in_transaction
    assert len(looks) in (3, 4)  # the end of a transaction looks once more
    assert ask(long_queue) == answer and len(looks) in (3, 4)  # later ones are answered unasked


@pytest.mark.parametrize("ask", QUESTIONS.values(), ids=QUESTIONS)
def test_a_question_that_stays_wanted_is_answered(long_queue, ask):
    answer = ask(long_queue)
    with while_wanted(long_queue, lambda: True):
        assert ask(long_queue) == answer
