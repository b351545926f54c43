"""The README's pictures are there, small, and name nothing outside themselves: no address, no place on a disk."""

from __future__ import annotations

import re
from pathlib import Path
from xml.etree import ElementTree

import pytest

ROOT = Path(__file__).parent.parent
FOLDER = ROOT / ".readme"
SVG = "http://www.w3.org/2000/svg"
PICTURES = ("queue", "candidate", "candidate-light", "split", "tally")
LARGEST = 150_000  # bytes


def drawn(name: str) -> str:
    """The picture as it lies there."""
    return (FOLDER / f"{name}.svg").read_text(encoding="utf-8")


@pytest.mark.parametrize("name", PICTURES)
def test_a_picture_is_small_and_whole(name):
    assert len(drawn(name).encode()) < LARGEST
    root = ElementTree.fromstring(drawn(name))
    assert root.tag == f"{{{SVG}}}svg" and len(root.findall(f".//{{{SVG}}}text")) > 50


@pytest.mark.parametrize("name", PICTURES)
def test_a_picture_names_nothing_outside_itself(name):
    text = drawn(name).replace(f'xmlns="{SVG}"', "")
    assert not re.search(r"https?:|www\.|url\(|@font-face|@import|href|<!--|<script|<image", text)
    assert not re.search(r"(?<![<\w])/(?!split|\s|&#160;|>)[\w.-]*/|\\\\|~/", re.sub(r"</\w+>", "", text))


def test_the_script_makes_just_these():
    script = (FOLDER / "make_pictures.py").read_text(encoding="utf-8")
    assert set(re.findall(r'Picture\("([\w-]+)"', script)) == set(PICTURES)
    assert {path.name for path in FOLDER.glob("*.svg")} == {f"{name}.svg" for name in PICTURES}


def test_the_readme_shows_pictures_that_exist():
    shown = re.findall(r"!\[[^\]]+\]\(([^)]+)\)", (ROOT / "README.md").read_text(encoding="utf-8"))
    assert len(shown) >= 2 and all((ROOT / path).is_file() for path in shown)
