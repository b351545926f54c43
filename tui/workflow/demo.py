"""The sample queue: found beside the source or inside the installed package, and copied before anyone opens it."""

from __future__ import annotations

import os
import shutil
import tempfile
from importlib.resources import as_file, files
from importlib.resources.abc import Traversable
from pathlib import Path

from tui.errors import StoreError

VISITOR = "visitor"
SAMPLE = "saltmarsh.db"


def sample_folder() -> Traversable:
    """The folder of the sample: `sample_db` of a clone, else the one that the wheel carries.

    Raises:
        StoreError: neither is there.
    """
    package = files("tui")
    places: list[Traversable] = [package.joinpath("sample_db")]
    if isinstance(package, Path):
        places.insert(0, package.parent / "sample_db")
    for place in places:
        if place.joinpath(SAMPLE).is_file():
            return place
    raise StoreError("The sample queue is not there; install Plainlight again, or clone it whole.")


def sample_copy(folder: Path | None = None) -> Path:
    """Copy the sample queue to `folder` and join it as `visitor`; the path of the copy.

    Args:
        folder: None: a scratch folder of the visitor's own, new each time.
    """
    from tui.workflow.joining import join

    target = (folder or scratch_folder()) / SAMPLE
    with as_file(sample_folder().joinpath(SAMPLE)) as source:
        shutil.copyfile(source, target)
    os.chmod(target, 0o600)
    join(str(target), VISITOR)
    return target


def scratch_folder() -> Path:
    """A new folder that only this user can read, in the system's place for such."""
    return Path(tempfile.mkdtemp(prefix="plainlight-demo-"))
