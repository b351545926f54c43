"""One small table a public catalogue; `archive_texts` hands them out as they lie."""

from __future__ import annotations

from importlib.resources import files


def archive_texts() -> dict[str, str]:
    """File name -> text of every archive table, in the order of their names."""
    found = [entry for entry in files("tui.data.archives").iterdir() if entry.name.endswith(".csv")]
    return {entry.name: entry.read_text(encoding="utf-8") for entry in sorted(found, key=lambda entry: entry.name)}
