"""Names of keys as the configuration file may give them: which there are, and which stand near a mistyped one."""

from __future__ import annotations

import unicodedata
from collections.abc import Collection
from difflib import get_close_matches

from textual.keys import KEY_NAME_REPLACEMENTS, Keys

MODIFIERS = ("alt", "ctrl", "shift")
PRINTED = "!\"#$%&'()*+,-./:;<=>?@[\\]^_`{|}~"  # ASCII beside letters and digits
NEAREST = 3


def canonical(key: str) -> str:
    """A key as the desk's own tables name it: a sign by its name, all else as it was typed.

    >>> canonical("?"), canonical("e"), canonical(" Q "), canonical("ctrl+up")
    ('question_mark', 'e', 'Q', 'ctrl+up')
    """
    key = key.strip()
    if len(key) != 1 or key.isalnum():
        return key
    name = unicodedata.name(key, key).lower().replace("-", "_").replace(" ", "_")
    return KEY_NAME_REPLACEMENTS.get(name, name)


def canonical_list(keys: str) -> str:
    """Several keys parted by commas, each by its name; a comma that stands alone is the key of that name.

    >>> canonical_list("n, ?"), canonical_list(",")
    ('n,question_mark', 'comma')
    """
    return canonical(keys) if keys.strip() == "," else ",".join(canonical(key) for key in keys.split(","))


def is_key(name: str) -> bool:
    """Whether a terminal can send such a key.

    >>> [is_key(name) for name in ("e", "f5", "question_mark", "shift+tab", "notakey", "ctrl + c", "")]
    [True, True, True, True, False, False, False]
    """
    *modifiers, base = name.split("+")
    plain = len(base) == 1 and base.isalnum()
    return (plain or base in named_keys()) and sorted(set(modifiers)) == modifiers and set(modifiers) <= set(MODIFIERS)


def named_keys() -> frozenset[str]:
    """Keys that have a name of more than one letter."""
    from_terminal = {key.value.split("+")[-1] for key in Keys}
    return frozenset(
        {name for name in from_terminal if len(name) > 1 and name.replace("_", "").isalnum() and name != "ignore"}
        | {canonical(sign) for sign in PRINTED}
    )


def nearest(name: str, known: Collection[str]) -> list[str]:
    """The names most like one that there is not, the most alike first."""
    return get_close_matches(name, sorted(known), n=NEAREST, cutoff=0.0)


def nearest_keys(name: str) -> list[str]:
    """The same for a key, its modifiers kept where they are known."""
    *modifiers, base = [part.strip() for part in name.split("+")]
    lead = "".join(f"{one}+" for one in sorted({one for one in modifiers if one in MODIFIERS}))
    known = named_keys() | ({base} if len(base) == 1 and base.isalnum() else set())
    return [lead + key for key in nearest(base, known)]
