"""Make text from data fit for a terminal: nothing in it may move the cursor, ring, recolour or reorder the line."""

from __future__ import annotations

REPLACEMENT = "\ufffd"

_CONTROLS = (
    *range(0x00, 0x20),  # C0
    0x7F,  # DEL
    *range(0x80, 0xA0),  # C1
    0x061C,  # Arabic letter mark
    *range(0x200E, 0x2010),  # left-to-right and right-to-left marks
    *range(0x2028, 0x202F),  # line and paragraph separators, embeddings and overrides
    *range(0x2066, 0x206A),  # isolates
    *range(0xD800, 0xE000),  # lone surrogates: no stream can encode them
    0xFEFF,  # byte order mark
    *range(0xFFF9, 0xFFFC),  # interlinear annotations
    *range(0xE0000, 0xE0080),  # tags: text that shows as nothing
)
_LINE = dict.fromkeys(_CONTROLS, REPLACEMENT)
_BLOCK = {code: glyph for code, glyph in _LINE.items() if code != 0x0A}


def safe(text: object, *, newlines: bool = False) -> str:
    """`text` with every control character, C0, DEL, C1, bidi, U+2028/9 and BOM, shown as U+FFFD.

    Args:
        text: anything; `str()` of it is taken.
        newlines: keep line feeds, for a note that may have several lines.

    >>> safe("SM-1\\x1b[2J")
    'SM-1\ufffd[2J'
    >>> safe("a\\nb"), safe("a\\nb", newlines=True)
    ('a\ufffdb', 'a\\nb')
    """
    return str(text).translate(_BLOCK if newlines else _LINE)
