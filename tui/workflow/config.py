"""The user's config file: handle, theme and keys, in TOML; absent is fine."""

from __future__ import annotations

import os
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from tui.errors import SettingError, TableError, reason_of

NAMES = ("handle", "theme", "keys")


@dataclass(frozen=True, slots=True)
class Config:
    """What a user may set once and for all queues."""

    handle: str | None = None
    theme: str | None = None
    keys: Mapping[str, str] = field(default_factory=dict)  # id of an action, such as candidate.explains -> key


@contextmanager
def named_config() -> Iterator[None]:
    """Within it a refused theme or key says in which file it stands."""
    try:
        yield
    except SettingError as error:
        if str(config_path()) in error.reason:
            raise
        raise TableError(str(config_path()), f"{error.setting}: {error.reason}") from error


def config_path() -> Path:
    """Where the config file is looked for: `PLAINLIGHT_CONFIG`, else the user's config folder."""
    named = os.environ.get("PLAINLIGHT_CONFIG")
    if named:
        return Path(named).expanduser()
    import platformdirs

    return platformdirs.user_config_path("plainlight") / "config.toml"


def read_config() -> Config:
    """Read the config file; defaults where there is none. TableError, naming the place, where it cannot be used."""
    path = config_path()
    try:
        with path.open("rb") as stream:
            import tomllib  # most people have no such file

            found = tomllib.load(stream)
    except FileNotFoundError:
        return Config()
    except (OSError, ValueError) as error:
        why = str(error) if type(error).__name__ == "TOMLDecodeError" else reason_of(error)
        raise TableError(str(path), f"the config file cannot be read: {why}. Mend it or move it away.") from error
    return _config(path, found)


def _config(path: Path, found: dict[str, Any]) -> Config:
    unknown = sorted(set(found) - set(NAMES))
    if unknown:
        raise TableError(str(path), f"unknown entry {unknown[0]!r}; the config file takes {', '.join(NAMES)}.")
    for name in ("handle", "theme"):
        if not isinstance(found.get(name, ""), str):
            raise TableError(str(path), f"{name} must be text in quotes.")
    keys = found.get("keys", {})
    if not isinstance(keys, dict) or not all(isinstance(key, str) for key in keys.values()):
        raise TableError(str(path), 'keys must be a table of texts, such as [keys] "candidate.explains" = "e".')
    return Config(found.get("handle") or None, found.get("theme") or None, dict(keys))
