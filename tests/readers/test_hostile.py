"""Files that are damaged, lie, or mean harm: one plain sentence each, and nothing run, fetched or grown."""

from __future__ import annotations

import gzip
import os
import re
import time

import numpy as np
import pytest
from astropy.io import fits
from astropy.table import Table

from tui.errors import TableError

VOTABLE = """<?xml version="1.0"?>{prolog}<VOTABLE version="1.3" xmlns="http://www.ivoa.net/xml/VOTable/v1.3">
<RESOURCE><TABLE>
<FIELD name="name" datatype="char" arraysize="*"/><FIELD name="J_mag" datatype="double" unit="mag"/>
<DATA>{rows}</DATA></TABLE></RESOURCE></VOTABLE>"""
LAUGHS = (
    "<!DOCTYPE l [<!ENTITY a '"
    + "x" * 50
    + "'>"
    + "".join(f"<!ENTITY {chr(98 + i)} '{('&' + chr(97 + i) + ';') * 10}'>" for i in range(9))
    + "]>"
)


def fits_bytes(tmp_path, rows=100):
    path = tmp_path / "good.fits"
    Table({"name": [f"S{i}" for i in range(rows)], "J_mag": np.linspace(5, 9, rows)}).write(path, overwrite=True)
    return path.read_bytes()


def refusal(read, path):
    started = time.monotonic()
    with pytest.raises(TableError) as caught:
        read(path)
    text = str(caught.value)
    assert text.startswith(str(path)) and "\n" not in text and len(text) < 400 and "Traceback" not in text
    assert time.monotonic() - started < 20
    return text


@pytest.mark.parametrize(
    ("content", "word"),
    [
        (b"", "empty"),
        (b"  \n \n", "empty"),
        (b"name,J_mag\nA\x00,8\n", "NUL byte"),
        ("name,J_mag\nA,8\n".encode("utf-16"), "UTF-16"),
        ("name,J_mag\n\xe9toile,8\n".encode("latin-1"), "not UTF-8"),
        (gzip.compress(b"name\n"), "gunzip"),
        (b"PK\x03\x04xx", "spreadsheet"),
        (b"SQLite format 3\x00", "gather"),
        (b"\x89HDF\r\n", "HDF5"),
        (os.urandom(5000).replace(b"\x00", b"\x01") + b"\x00", "text"),
        (b"name,J_mag,J_mag\nA,8,9\n", "two columns"),
        (b"# only\n# comments\n", "column names"),
        (b"\x00" * 5000, "NUL byte"),
        (b'name,J_mag\n"A,8\n' + b"x" * 200_000, "does not close"),
        (b"," * 9000 + b"\n", "column names"),
        (b"%PDF-1.4 ", "PDF"),
    ],
    ids=lambda value: value if isinstance(value, str) else "",
)
def test_text_and_other_files(read, write, content, word):
    text = refusal(read, write(content))
    assert word in text or "UTF-8" in text


def test_things_that_are_no_files(read, tmp_path):
    assert "directory" in refusal(read, tmp_path)
    assert "cannot be opened" in refusal(read, tmp_path / "none.csv")
    os.mkfifo(tmp_path / "pipe")
    assert "no regular file" in refusal(read, tmp_path / "pipe")
    with pytest.raises(TableError):
        read("a\0b.csv")


def test_ecsv_heads(read, write):
    for head in (
        "# %ECSV 1.0\n# ---\n# datatype: [\n",
        "# %ECSV 1.0\n# ---\n# datatype: 3\n",
        "# %ECSV 1.0\n# no yaml\n",
        "# %ECSV 1.0\n# ---\n# datatype:\n# - !!python/object/apply:os.system ['touch hacked']\n",
        "# %ECSV 1.0\n# ---\n# delimiter: x\n# datatype:\n# - {name: name, datatype: string}\n",
        "# %ECSV 1.0\n# ---\n# datatype:\n# - {nom: name}\n",
    ):
        assert "ECSV" in refusal(read, write(head + "name\nA\n", "t.ecsv"))
    assert not os.path.exists("hacked")


def test_an_ecsv_head_that_would_grow_without_end(read, write):
    laughs = ", ".join(["a0: &a0 [x, x]"] + [f"a{i}: &a{i} [{', '.join([f'*a{i - 1}'] * 9)}]" for i in range(1, 12)])
    head = f"# %ECSV 1.0\n# ---\n# meta: {{{laughs}}}\n# datatype:\n# - {{name: *a11, datatype: string}}\n"
    assert "ECSV" in refusal(read, write(head + "name\nA\n", "l.ecsv"))
    unused = head.replace("name: *a11", "name: name")
    started = time.monotonic()
    assert len(read(write(unused + "name\nA\n", "l.ecsv")).candidates) == 1 and time.monotonic() - started < 5


@pytest.mark.parametrize("share", [0.02, 0.4, 0.7, 0.75])
def test_fits_cut_short(read, write, tmp_path, share):
    whole = fits_bytes(tmp_path)
    refusal(read, write(whole[: int(len(whole) * share)], "cut.fits"))


@pytest.mark.parametrize(
    ("card", "value"),
    [
        ("NAXIS2", 2**31),
        ("NAXIS2", 2**62),
        ("NAXIS1", 2**40),
        ("PCOUNT", 2**33),
        ("TFIELDS", 999),
        ("NAXIS2", -5),
        ("TFORM1", "'999999999A'"),
    ],
)
def test_fits_headers_that_lie(read, write, tmp_path, card, value):
    whole = fits_bytes(tmp_path)
    at = whole.index(card.ljust(8).encode(), whole.index(b"XTENSION"))
    text = f"{card:8}= {value!s:>20}".ljust(80).encode()
    refusal(read, write(whole[:at] + text + whole[at + 80 :], "lies.fits"))


def test_fits_bytes_changed_at_random_never_end_in_a_traceback(read, write, tmp_path):
    whole = bytearray(fits_bytes(tmp_path, rows=5))
    generator = np.random.default_rng(5)
    for _ in range(60):
        broken = bytearray(whole)
        for at in generator.integers(0, len(broken), 12):
            broken[at] = int(generator.integers(0, 256))
        path = write(bytes(broken), "r.fits")
        try:
            read(path)
        except TableError as error:
            assert str(error).startswith(str(path))


def test_fits_without_a_table_and_with_an_image_only(read, tmp_path):
    fits.PrimaryHDU(np.zeros((4, 4))).writeto(tmp_path / "i.fits")
    assert "no table" in refusal(read, tmp_path / "i.fits")


@pytest.mark.parametrize(
    ("prolog", "rows", "word"),
    [
        (LAUGHS, "<TABLEDATA><TR><TD>&j;</TD><TD>8</TD></TR></TABLEDATA>", "entities"),
        (
            "<!DOCTYPE x [<!ENTITY e SYSTEM 'file:///etc/passwd'>]>",
            "<TABLEDATA><TR><TD>&e;</TD><TD>8</TD></TR></TABLEDATA>",
            "entities",
        ),
        ("", "<BINARY><STREAM href='file:///etc/passwd'/></BINARY>", "another file"),
        ("", "<BINARY><STREAM\n encoding='base64' href = 'http://127.0.0.1:1/x'/></BINARY>", "another file"),
        ("", "<FITS><STREAM href='http://127.0.0.1:1/x.fits'/></FITS>", "another file"),
        ("", "<TABLEDATA><TR><TD>A</TD><TD>8</TD></TR>", "damaged"),
        ("", "<TABLEDATA><TR><TD>A", "damaged"),
    ],
)
def test_votables(read, write, prolog, rows, word):
    content = VOTABLE.format(prolog=prolog, rows=rows)
    if word == "damaged":
        content = content.replace("</VOTABLE>", "")
    assert word in refusal(read, write(content, "t.vot"))


def test_votables_in_other_codes(read, write):
    content = VOTABLE.format(prolog="", rows="<TABLEDATA><TR><TD>A</TD><TD>8</TD></TR></TABLEDATA>")
    assert len(read(write(content, "t.vot")).candidates) == 1
    refusal(read, write(content.encode("utf-16"), "t.vot"))
    assert "no table" in refusal(read, write('<?xml version="1.0"?><VOTABLE version="1.3"></VOTABLE>', "e.vot"))
    refusal(read, write('<?xml version="1.0"?><html></html>', "h.vot"))


def test_everything_masked(read, tmp_path):
    star = Table({"name": ["A", "B"], "J_mag": [8.0, 9.0], "ra": [1.0, 2.0]}, masked=True)
    for column in star.colnames:
        star[column].mask = True
    for name in ("m.ecsv", "m.fits", "m.vot"):
        star.write(tmp_path / name, format="votable" if name == "m.vot" else None)
        contents = read(tmp_path / name)
        assert contents.candidates == [] and [entry.column for entry in contents.refused] == ["name", "name"], name


def test_no_rows(read, tmp_path, write):
    star = Table({"name": np.array([], dtype="U3"), "J_mag": np.array([])})
    for name in ("n.ecsv", "n.fits", "n.vot"):
        star.write(tmp_path / name, format="votable" if name == "n.vot" else None)
        assert read(tmp_path / name).candidates == []
    assert read(write("name,J_mag\n")).candidates == []
    assert read(write("name,band,value,unit\n")).candidates == []


def test_texts_from_a_table_are_kept_as_they_are(read, write):
    contents = read(write('name,J_mag,sp_type\n"[/] =cmd|x!A0",8,"[@click=x]"\n'))
    assert contents.candidates[0].name == "[/] =cmd|x!A0" and contents.candidates[0].facts["sp_type"] == "[@click=x]"


def test_messages_repeat_nothing_that_a_terminal_obeys(read, write):
    contents = read(write("name,J_mag\nA,\x1b[31m8\n"))
    assert "\x1b" not in contents.refused[0].reason


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"<?xml version='1.0'?>\n<VOTABLE><RESOURCE>", "the VOTable is damaged"),
        (b"# %ECSV 1.0\n# ---\n# datatype:\n# - {nam: x}\nx\n1\n", "must name every column"),
        (b"name,J_mag\nA," + b"8" * 200_000 + b"\n", "near line 2 a cell is longer than 131072 characters"),
        (b"name,J_mag\nA,\xff\n", "line 2 is not UTF-8 text"),
    ],
)
def test_a_refusal_speaks_no_words_of_the_language_it_is_written_in(read, tmp_path, content, words):
    (tmp_path / "t").write_bytes(content)
    with pytest.raises(TableError) as refused:
        read(str(tmp_path / "t"))
    assert words in str(refused.value)
    assert not re.search(r"Error|Errno|codec|token|field limit", str(refused.value))


def test_a_column_map_that_is_no_text_is_refused_in_plain_words(read, tmp_path):
    (tmp_path / "t.csv").write_text("name,J_mag\nA,8\n")
    (tmp_path / "map.toml").write_bytes(b"\xff\xfe")
    for path, words in (("map.toml", "not UTF-8 text from byte 1 on"), ("none.toml", "no such file or directory")):
        with pytest.raises(TableError) as refused:
            read(str(tmp_path / "t.csv"), columns=str(tmp_path / path))
        assert words in str(refused.value) and "codec" not in str(refused.value) and "Errno" not in str(refused.value)
