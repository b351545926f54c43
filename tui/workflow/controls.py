"""The truth file: names and natures of the controls, which never enter the queue."""

from __future__ import annotations

from tui.errors import TableError
from tui.model import NATURES

COLUMNS = ("name", "nature")


def read_truth(path: str) -> dict[str, str]:
    """Name -> nature of each control.

    Raises:
        TableError: no table, a column is missing, a nature is none of the words, or a name has two natures.
    """
    from tui.readers.files import open_table
    from tui.readers.names import clean_name

    table = open_table(path)
    for column in COLUMNS:
        if column not in table.columns:
            raise TableError(path, f"there is no column {column}; a truth file has {' and '.join(COLUMNS)}.")
    truth: dict[str, str] = {}
    names, natures = (cell_texts(table.columns[column].cells) for column in COLUMNS)
    for row, (text, nature) in enumerate(zip(names, natures, strict=True), start=1):
        name, reason = clean_name(text)
        if reason:
            raise TableError(path, f"row {row}: {reason}.")
        if nature not in NATURES:
            raise TableError(path, f"row {row}: {nature!r} is no nature; use one of {', '.join(NATURES)}.")
        if truth.setdefault(name, nature) != nature:
            raise TableError(path, f"row {row}: {name} has two natures, {truth[name]} and {nature}.")
    return truth


def cell_texts(cells) -> list[str]:
    """The cells of a column as text without blanks at the ends."""
    return [str(cell).strip() for cell in cells]
