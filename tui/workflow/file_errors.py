"""Errors of writing a file, with the file's name, which the operating system leaves out once it is open."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager


@contextmanager
def named(path: str) -> Iterator[None]:
    """Within it an OSError that names no file names this one."""
    try:
        yield
    except OSError as error:
        if error.filename is not None or error.errno is None:
            raise
        raise OSError(error.errno, error.strerror, path) from error
