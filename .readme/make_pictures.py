"""The README's pictures, of real screens on a copy of the sample queue: python .readme/make_pictures.py

The same queue, reader, size and clock give the same pictures. What the exporter adds of its own (fonts from
elsewhere, a window's frame) is taken out: a picture holds the screen and nothing else.
"""

from __future__ import annotations

import asyncio
import html
import re
import shutil
import sys
import tempfile
import time
from collections import Counter
from dataclasses import dataclass
from pathlib import Path

HERE = Path(__file__).parent
ROOT = HERE.parent
sys.path.insert(0, str(ROOT))

from tui.desk.app import Desk
from tui.workflow import session as session_module
from tui.workflow.session import Session

READER = "heron"
NOW = "2026-11-20T21:40:00.000000Z"
SIZE = (100, 30)
PATIENCE_S = 120.0
FONT = "ui-monospace, 'DejaVu Sans Mono', Menlo, Consolas, monospace"

CELL = 12.2  # width of a letter, as the exporter draws it
MARGIN = 10
BITS = {(0, 0): 0, (0, 1): 1, (0, 2): 2, (1, 0): 3, (1, 1): 4, (1, 2): 5, (0, 3): 6, (1, 3): 7}  # of a braille letter


@dataclass(frozen=True)
class Picture:
    """One screen: the keys that lead to it from the queue, and words that say that it is complete."""

    name: str
    keys: tuple[tuple[str, str], ...]  # key, and a pattern that the screen holds before the next is pressed
    theme: str = "dark"


FOUND = (*(("slash", "find"),), *((key, "showing +names like") for key in "0096"))
PICTURES = (
    Picture("queue", (("n", "of [0-9]+ +order"), ("down", "SM"), ("down", "sigma: "))),
    Picture("candidate", (("enter", "this large"), ("d", r"\[WARM DUST.*adequate +[a-z]"))),
    Picture("candidate-light", (("enter", "this large"), ("b", r"\[BLEND.*adequate +[a-z]")), theme="light"),
    Picture("split", (*FOUND, ("enter", "SM-0096"), ("v", "choose once more"))),
    Picture("tally", (("t", "WHAT IS LEFT"),)),
)


def main() -> None:
    """Make all of them, or those that are named."""
    session_module.utc_now = lambda: NOW
    for picture in PICTURES:
        if picture.name in (sys.argv[1:] or [picture.name]):
            with tempfile.TemporaryDirectory() as folder:
                path = shutil.copy(ROOT / "sample_db" / "saltmarsh.db", folder)
                with Session.open(str(path), READER) as session:
                    drawn = asyncio.run(draw(session, picture))
            (HERE / f"{picture.name}.svg").write_text(drawn, encoding="utf-8")
            print(f"{picture.name}.svg  {len(drawn) / 1000:.0f} kB")


async def draw(session: Session, picture: Picture) -> str:
    """Drive the desk to a screen; the picture."""
    app = Desk(session, theme=picture.theme)
    async with app.run_test(size=SIZE) as pilot:
        await until(app, pilot, "NEED YOU")
        for key, then in picture.keys:
            await pilot.press(key)
            await until(app, pilot, then)
        before = ""
        while (now := app.export_screenshot()) != before:
            before = now
            await pilot.pause(0.5)
        return bare(now, picture.name)


async def until(app: Desk, pilot, words: str) -> None:
    """Wait until the screen holds what matches; its lines are taken as one."""
    end = time.monotonic() + PATIENCE_S
    while not re.search(words, text_of(app.export_screenshot()), re.DOTALL):
        if time.monotonic() > end:
            sys.exit(f"{words!r} never came:\n{text_of(app.export_screenshot())}")
        await pilot.pause(0.1)


def text_of(drawn: str) -> str:
    """What a picture says."""
    said = re.findall(r"<text[^>]*>([^<]*)</text>", drawn)
    return html.unescape(" ".join(said)).replace("\xa0", " ")


def bare(drawn: str, name: str) -> str:
    """The picture with nothing but the screen: no frame, no title, no font from elsewhere."""
    ground = Counter(re.findall(r'<rect fill="(#[0-9a-f]{6})"', drawn)).most_common(1)[0][0]
    width, height = re.search(r'clip-terminal">\s*<rect x="0" y="0" width="([\d.]+)" height="([\d.]+)"', drawn).groups()
    box = f"{-MARGIN} {-MARGIN} {float(width) + 2 * MARGIN:g} {float(height) + 2 * MARGIN:g}"
    x, y, wide, high = box.split()
    paper = f'<rect fill="{ground}" x="{x}" y="{y}" width="{wide}" height="{high}"/>'
    for part in (r"<!--.*?-->\s*", r"@font-face \{.*?\}\s*", r"\.[\w-]+-title \{.*?\}\s*", r"<defs>.*?</defs>"):
        drawn = re.sub(part, "", drawn, flags=re.DOTALL)
    drawn = re.sub(r"</style>.*?<g transform=[^>]* clip-path=[^>]*>", f"</style>\n{paper}\n<g>", drawn, flags=re.DOTALL)
    drawn = re.sub(r' clip-path="[^"]*"', "", drawn)
    drawn = re.sub(r'viewBox="[^"]*"', f'viewBox="{box}"', drawn, count=1)
    drawn = re.sub(r"<text class=\"([^\"]*)\" x=\"([\d.]+)\" y=\"([\d.]+)\"[^>]*>([^<]*)</text>", placed, drawn)
    drawn = drawn.replace("Fira Code, monospace", FONT).replace("rich-terminal", "screen")
    drawn = re.sub(r"terminal-\d+", name, drawn)
    return "\n".join(line.rstrip() for line in drawn.splitlines() if line.strip()) + "\n"


def placed(found: re.Match[str]) -> str:
    """One run of text, its braille drawn as dots: few fonts have it at the width of a letter."""
    style, x, y, text = found.groups()
    text = html.unescape(text)
    dots = [dot for cell, letter in enumerate(text) for dot in dots_of(letter, float(x) + CELL * cell, float(y))]
    path = f'<path class="{style}" d="{"".join(dots)}"/>' if dots else ""
    letters = "".join("\xa0" if "\u2800" <= letter <= "\u28ff" else letter for letter in text)
    word = letters.strip("\xa0 ")  # spaces at the ends take no room in some viewers: the word is put where it begins
    if not word:
        return path
    begins = float(x) + CELL * letters.index(word[0])
    spaced = html.escape(word).replace("\xa0", "&#160;")
    return f'<text class="{style}" x="{begins:g}" y="{y}" textLength="{CELL * len(word):g}">{spaced}</text>{path}'


def dots_of(letter: str, x: float, y: float) -> list[str]:
    """The dots of a braille letter whose cell begins at `x` and whose base line is `y`; none for another letter."""
    if not "\u2800" < letter <= "\u28ff":
        return []
    bits = ord(letter) - 0x2800
    return [
        f"M{x + 2.6 + 6.1 * column:.1f} {y - 16.2 + 6.1 * line:.1f}h2.4v2.4h-2.4z"
        for (column, line), bit in BITS.items()
        if bits >> bit & 1
    ]


if __name__ == "__main__":
    main()
