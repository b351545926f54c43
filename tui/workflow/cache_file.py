"""Files of the user's cache: written whole or not at all, the oldest thrown away."""

from __future__ import annotations

import contextlib
import os
import tempfile
from collections.abc import Iterable
from pathlib import Path
from typing import Any


def cache_folder() -> Path:
    """Where grids are kept: `PLAINLIGHT_CACHE`, else the user's cache folder."""
    named = os.environ.get("PLAINLIGHT_CACHE")
    if named:
        return Path(named).expanduser()
    import platformdirs

    return platformdirs.user_cache_path("plainlight")


def write_cached(target: Path, parts: Iterable[Any], most: int) -> None:
    """Write a file of the cache, then leave only the newest of its kind; one that cannot be written costs only time.

    Args:
        target: `KIND-KEY.bin`.
        parts: what it holds, one after another: bytes, or arrays as they lie in memory.
        most: files of that kind to leave.
    """
    kind = target.name.partition("-")[0]
    with contextlib.suppress(OSError):
        target.parent.mkdir(parents=True, exist_ok=True)
        handle, scratch = tempfile.mkstemp(prefix=f".{kind}-", dir=target.parent)
        try:
            with os.fdopen(handle, "wb") as stream:
                for part in parts:
                    stream.write(part)
            os.replace(scratch, target)
        except BaseException:
            with contextlib.suppress(OSError):
                os.unlink(scratch)
            raise
        make_room(target.parent, kind, most)


def make_room(folder: Path, kind: str, most: int) -> None:
    """Remove all but the newest files of one kind; another process may be doing the same."""
    dated = []
    for path in folder.glob(f"{kind}-*.bin"):
        with contextlib.suppress(OSError):
            dated.append((path.stat().st_mtime, path))
    for _, path in sorted(dated, reverse=True)[most:]:
        path.unlink(missing_ok=True)
