"""The names of candidates: one spelling each, or a plain reason why not."""

from __future__ import annotations

import unicodedata

LONGEST_NAME = 200  # characters


def clean_name(text: str) -> tuple[str, str]:
    """A name as the queue keeps it, and "" or the reason why it cannot be kept.

    Blanks at both ends go, the rest is normalised to NFC; case is kept.

    >>> clean_name("  HD 1234 ")
    ('HD 1234', '')
    >>> clean_name("a\\x1bb")
    ('', 'the name holds the control character U+001B')
    """
    name = unicodedata.normalize("NFC", text.strip())
    if not name:
        return "", "the name is empty"
    if len(name) > LONGEST_NAME:
        return "", f"the name has {len(name)} characters, more than {LONGEST_NAME}"
    for character in name:
        if character == "\ufffd":
            return "", "the name holds bytes that are no UTF-8 text"
        if unicodedata.category(character) in ("Cc", "Cs") or character in "\u2028\u2029\ufeff":
            return "", f"the name holds the control character U+{ord(character):04X}"
    return name, ""


def clean_names(texts: list[str]) -> tuple[list[str], dict[int, str]]:
    """`clean_name` of many: names, and the reason for each index that has none."""
    names: list[str] = []
    reasons: dict[int, str] = {}
    for index, text in enumerate(texts):
        if text.isascii() and text.isprintable() and 0 < len(text) <= LONGEST_NAME:
            name, reason = text.strip(), ""  # the usual case, many times faster
            if not name:
                reason = "the name is empty"
        else:
            name, reason = clean_name(text)
        names.append(name)
        if reason:
            reasons[index] = reason
    return names, reasons
