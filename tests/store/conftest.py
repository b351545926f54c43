"""Queues in a temporary folder for the tests of the store: made once, copied for each test."""

from __future__ import annotations

import shutil

import pytest

from tests.store.making import fill, utc
from tui.store.connect import open_queue
from tui.store.reviewers import add_reviewer, reviewer_by_handle

HANDLES = ("heron", "plover", "curlew")


@pytest.fixture(scope="session")
def templates(tmp_path_factory):
    """Files to copy: an empty queue, one of twelve candidates with evidence, the same with three reviewers."""
    folder = tmp_path_factory.mktemp("templates")
    connection = open_queue(folder / "empty.db", create=True)
    connection.close()
    shutil.copy(folder / "empty.db", folder / "filled.db")
    connection = open_queue(folder / "filled.db")
    fill(connection, [f"SM-{number:04d}" for number in range(1, 13)])
    for number, handle in enumerate(HANDLES, 1):
        add_reviewer(connection, handle, utc(number))
    connection.close()
    return folder


@pytest.fixture
def path(tmp_path):
    return str(tmp_path / "queue.db")


@pytest.fixture
def queue(path, templates):
    """An empty queue."""
    shutil.copy(templates / "empty.db", path)
    connection = open_queue(path)
    yield connection
    connection.close()


@pytest.fixture
def filled(path, templates):
    """Twelve candidates SM-0001 to SM-0012 with evidence on every check, and three reviewers who ruled nothing."""
    shutil.copy(templates / "filled.db", path)
    connection = open_queue(path)
    yield connection
    connection.close()


@pytest.fixture
def team(filled):
    """The reviewers of `filled`."""
    return [reviewer_by_handle(filled, handle) for handle in HANDLES]
