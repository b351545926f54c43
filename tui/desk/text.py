"""Text on its way to a terminal: made safe, cut to cells, and the signs, words and numbers of every screen."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable
from types import MappingProxyType
from typing import Literal

from rich.cells import cell_len, split_graphemes

from tui.workflow.safe_text import safe

CHECK_KEYS = MappingProxyType({"s": "star", "i": "instrument", "x": "extinction", "b": "blend", "d": "dust"})
KEY_OF_CHECK = MappingProxyType({check: key for key, check in CHECK_KEYS.items()})
SHORT_CHECKS = MappingProxyType(
    {"star": "star", "instrument": "instr", "extinction": "extin", "blend": "blend", "dust": "wdust"}
)
# The sign compares the model with the data; sign and word stand together, so that nothing rests on colour.
SIGNS = MappingProxyType(
    {"explains": "=", "short": "<", "unclear": "~", "split": "/", "open": ":", "todo": "."}
    | {"nodata": "-", "sealed": "."}
)
STATE_WORDS = MappingProxyType(
    {"explains": "expl", "short": "short", "unclear": "uncl", "split": "split", "open": "open", "todo": "todo"}
    | {"nodata": "nodata", "sealed": "sealed"}
)
RULING_WORDS = MappingProxyType(
    {"explains": "explains", "short": "falls short", "unclear": "unclear", "withdrawn": "withdrawn"}
)
RULING_MEANINGS = MappingProxyType(  # what each says of a check: for help, keys and practice alike
    {
        "explains": "the check can make these fluxes, and more than free parameters speaks for it",
        "short": "the check cannot make these fluxes, or nothing but free parameters speaks for it",
        "unclear": "these data cannot tell",
    }
)

SPECTRUM_POINT = "spectrum:"  # how evidence names a point of the candidate's own spectrum, before its micron
OFTEN, FEW = 0.1, 1e-9  # p from which a share reads better than odds, and up to which odds need an exponent
LEAST_P = 1e-300  # doubles end a little below (IEEE 754: 4.9e-324), and their last digits are lost before

# Terminals differ in how wide they draw what these join or select (UAX 11, UTS 51); in columns they are left out.
_JOINERS = re.compile("[\u200d\ufe0e\ufe0f]")
_LINE_ENDS = re.compile("\r\n|\r|\n")


def safe_lines(text: str) -> list[str]:
    """The lines of a note, each made safe; the line ends themselves are kept as such."""
    return [safe(line) for line in _LINE_ENDS.split(text)]


def fit(
    text: str, width: int, *, align: Literal["left", "right"] = "left", cut: Literal["end", "middle"] = "end"
) -> str:
    """`text`, already safe, in exactly `width` cells: padded, or cut where a catalogue name can spare it.

    Args:
        text: one line; wide and combining characters count as the cells they take.
        width: cells.
        align: where the text lies when it is shorter.
        cut: what goes when it is longer: the end, or the middle (names differ in their last digits).

    >>> fit("Gaia DR3 4472832130942575872", 14, cut="middle")
    'Gai..942575872'
    """
    if width <= 0:
        return ""
    text = _JOINERS.sub("", text)
    length = cell_len(text)
    if length > width:
        text = _shortened(text, width, cut)
        length = cell_len(text)
    padding = " " * (width - length)
    return padding + text if align == "right" else text + padding


def wrap(text: str, width: int) -> list[str]:
    """Lines of at most `width` cells, broken at spaces, a longer word cut where it must be."""
    lines: list[str] = []
    line = ""
    for word in text.split(" "):
        trial = f"{line} {word}" if line else word
        if cell_len(trial) <= width:
            line = trial
            continue
        if line:
            lines.append(line)
        while cell_len(word) > width > 0:
            head = _head(word, width) or word[:1]
            lines.append(head)
            word = word[len(head) :]
        line = word
    return [*lines, line] if line or not lines else lines


def state_text(state: str, stale: bool = False) -> str:
    """Sign, word and, where stale, the star: at most 7 cells.

    >>> state_text("short", stale=True)
    '<short*'
    """
    return SIGNS.get(state, "?") + STATE_WORDS.get(state, safe(state)) + ("*" if stale else "")


def outcome_text(outcome: str) -> str:
    """An outcome in its own word; `sealed` carries the sign of what is not yet open."""
    return ".sealed" if outcome == "sealed" else safe(outcome)


def short_band(band: str) -> str:
    """A band's shortest unmistakable name, as the tables that go in may call it too.

    >>> [short_band(b) for b in ("Gaia_BP", "SDSS_u", "PS1_g", "W3", "spectrum:0.55")]
    ['BP', 'u', 'PS1_g', 'W3', 'spectrum 0.55']
    """
    if band.startswith(SPECTRUM_POINT):
        return safe(f"spectrum {band.removeprefix(SPECTRUM_POINT):.6}")
    prefix, _, rest = band.partition("_")
    return safe(rest if rest and prefix in {"Gaia", "SDSS", "GALEX", "AKARI"} else band)


def band_names(bands: Iterable[str]) -> list[str]:
    """Bands to be read, in their order; points of a spectrum, of which there are tens, as one.

    >>> band_names(["W3", "spectrum:0.5", "Gaia_BP", "spectrum:0.52"])
    ['W3', '2 points of the spectrum', 'BP']
    """
    bands = list(bands)
    points = [band for band in bands if band.startswith(SPECTRUM_POINT)]
    grouped = plural(len(points), "point") + " of the spectrum"
    return [grouped if band in points else short_band(band) for band in bands if band not in points[1:]]


def signed(value: float | None, decimals: int = 1) -> str:
    """A number that always shows its sign; `--` for none; beyond 9999 without decimals."""
    if value is None or math.isnan(value):
        return "--"
    if math.isinf(value):
        return "+inf" if value > 0 else "-inf"
    return f"{value:+.0f}" if abs(value) >= 9999 else f"{value:+.{decimals}f}"


def number(value: float | None, digits: int = 3) -> str:
    """A number to `digits` significant ones, plain where it is readable, with an exponent where not.

    >>> number(0.000123456), number(5612.4, 4), number(1.5)
    ('1.23e-4', '5612', '1.50')
    """
    if value is None or math.isnan(value):
        return "--"
    if math.isinf(value):
        return "inf" if value > 0 else "-inf"
    if value == 0:
        return "0"
    exponent = math.floor(math.log10(abs(float(f"{value:.{digits - 1}e}"))))
    if -3 <= exponent < max(digits, 6):
        return f"{value:.{max(digits - 1 - exponent, 0)}f}"
    mantissa, _, power = f"{value:.{digits - 1}e}".partition("e")
    return f"{mantissa}e{int(power)}"


def thousands(count: int) -> str:
    """A count with its thousands parted."""
    return f"{count:,}"


def plural(count: int, word: str, many: str = "") -> str:
    """A count with its word.

    >>> plural(1, "band"), plural(12, "band")
    ('1 band', '12 bands')
    """
    return f"{thousands(count)} {word if count == 1 else many or word + 's'}"


def p_text(p: float | None, digits: int = 1) -> str:
    """A chance probability; one too small for the machine's numbers reads as below them, never as 0.

    >>> p_text(0.6, 2), p_text(2.31e-44), p_text(0.0), p_text(None)
    ('0.60', '2e-44', '<1e-300', '--')
    """
    if p is not None and p < LEAST_P:
        return f"<{LEAST_P:.0e}"
    return number(p, digits)


def once_in(p: float | None) -> str:
    """How often chance does as badly where the model is right: a share of the cases, or once in how many.

    >>> once_in(0.94), once_in(0.00105), once_in(8e-24), once_in(None)
    ('94 %', 'once in 950', 'once in 1e23', '--')
    """
    if p is None or math.isnan(p):
        return "--"
    if p < LEAST_P:
        return "practically never"
    if p >= OFTEN:
        return f"{100 * min(p, 1.0):.0f} %"
    if p > FEW:
        return f"once in {thousands(int(float(f'{1 / p:.1e}')))}"
    power = math.floor(-math.log10(p))  # of 1/p, which would overflow at the end of the doubles
    mantissa = round(10 ** (-math.log10(p) - power))
    return f"once in {f'1e{power + 1}' if mantissa == 10 else f'{mantissa}e{power}'}"


def decimal_aligned(numbers: Iterable[str]) -> list[str]:
    """Numbers as text, padded so that their decimal points (or their last digits) stand under one another.

    >>> decimal_aligned(["121.4", "8", "0.02"])
    ['121.4 ', '  8   ', '  0.02']
    """
    parts = [re.fullmatch(r"([^.e]*)(.*)", text) for text in numbers]
    halves = [(part.group(1), part.group(2)) if part else ("", "") for part in parts]
    left = max((len(head) for head, _ in halves), default=0)
    right = max((len(tail) for _, tail in halves), default=0)
    return [f"{head:>{left}}{tail:<{right}}" for head, tail in halves]


def listed(words: Iterable[str]) -> str:
    """Words joined as a sentence joins them.

    >>> listed(["W3"]), listed(["W1", "W2", "W3"])
    ('W3', 'W1, W2 and W3')
    """
    words = list(words)
    return " and ".join([", ".join(words[:-1]), words[-1]]) if len(words) > 1 else "".join(words)


def clock(utc: str) -> str:
    """Hours and minutes of an ISO time: `14:02 UTC`; empty where there is none."""
    found = re.search(r"T(\d\d:\d\d)", utc)
    return f"{found.group(1)} UTC" if found else ""


def _head(text: str, width: int) -> str:
    """The longest beginning of `text` of at most `width` cells, no character torn from its marks."""
    spans, _ = split_graphemes(text)
    used = end = 0
    for _, stop, cells in spans:
        if used + cells > width:
            break
        used, end = used + cells, stop
    return text[:end]


def _tail(text: str, width: int) -> str:
    """The longest end of `text` of at most `width` cells."""
    spans, _ = split_graphemes(text)
    used, start = 0, len(text)
    for begin, _, cells in reversed(spans):
        if used + cells > width:
            break
        used, start = used + cells, begin
    return text[start:]


def _shortened(text: str, width: int, cut: str) -> str:
    if width < 5:
        return _head(text, width)
    if cut == "end":
        return _head(text, width - 2) + ".."
    head = _head(text, (width - 2) // 4)
    return head + ".." + _tail(text, width - 2 - cell_len(head))
