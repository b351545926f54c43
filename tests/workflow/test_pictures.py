"""Cutouts: good ones hang on their candidate, hostile ones cost a line each."""

from __future__ import annotations

import bz2
import gzip
import lzma
import math
import tracemalloc

import numpy as np
import pytest
from astropy.io import fits

from tui.errors import TableError
from tui.workflow.loading import Sidecars, load
from tui.workflow.pictures import arcsec_per_pixel, name_and_band
from tui.workflow.session import Session


def write(path, image, **cards):
    hdu = fits.PrimaryHDU(image)
    hdu.header.update({name.replace("__", "-"): value for name, value in cards.items()})
    hdu.writeto(path)


@pytest.fixture
def folder(tmp_path):
    (tmp_path / "cutouts").mkdir()
    return tmp_path / "cutouts"


def loaded(queue, folder):
    return load(queue, [], sidecars=Sidecars(cutouts=str(folder)))


def test_a_picture_hangs_on_its_candidate_in_its_band(queue, folder):
    write(folder / "SM-0001_W3.fits", np.arange(12.0).reshape(3, 4), CDELT1=-0.001, CDELT2=0.001, TELESCOP="WISE")
    write(folder / "SM-0001_K.fits", np.ones((2, 2)))
    done = loaded(queue, folder)
    assert (done.counts["cutouts"], done.refused) == (2, [])
    with Session.open(queue) as session:
        first, second = session.cutouts("SM-0001")
    assert (first.band, second.band, second.image.shape) == ("Ks", "W3", (3, 4))
    assert second.arcsec_per_pixel == pytest.approx(3.6) and second.facts["telescop"] == "WISE"
    assert loaded(queue, folder).counts["cutouts"] == 0


def test_hostile_files_cost_a_line_each(queue, folder):
    write(folder / "SM-0001_W1.fits", np.full((3, 3), np.nan))
    write(folder / "SM-0001_W2.fits", np.ones((2, 2, 2, 2, 2)))
    write(folder / "SM-0001_J.fits", np.ones((40, 40)))
    whole = (folder / "SM-0001_J.fits").read_bytes()
    (folder / "SM-0001_H.fits").write_bytes(whole[:4000])
    huge = fits.PrimaryHDU(np.ones((2, 2), dtype=np.uint8)).header
    huge["NAXIS1"] = huge["NAXIS2"] = 20_000
    (folder / "SM-0001_W3.fits").write_bytes(huge.tostring().encode() + b"\0" * 2880)
    (folder / "SM-0001_W4.fits").write_bytes(gzip.compress(b"\0" * 10_000_000))
    (folder / "SM-0001_B.fits").write_bytes(b"SIMPLE  = T nonsense")
    (folder / "SM-0001_V.fits").write_bytes(b"")
    (folder / "nobody_W3.fits").write_bytes(whole)
    (folder / "SM-0001.fits").write_bytes(whole)
    fits.HDUList([fits.PrimaryHDU()]).writeto(folder / "SM-0001_U.fits")
    empty = fits.PrimaryHDU(np.ones((2, 2), dtype=np.uint8)).header
    empty["NAXIS1"] = empty["NAXIS2"] = 0
    (folder / "SM-0001_Rc.fits").write_bytes(empty.tostring().encode() + b"\0" * 2880)
    done = loaded(queue, folder)
    assert done.counts["cutouts"] == 1
    said = "\n".join(map(str, done.refused))
    assert len(done.refused) == 11 and all("\n" not in str(line) for line in done.refused)
    for words in ("no number", "5 axes", "20000 x 20000", "gunzip", "no candidate 'nobody'", "_BAND", "no picture"):
        assert words in said


BOMBS = {
    "gzip": (gzip.compress, "gunzip"),
    "bzip2": (bz2.compress, "bunzip2"),
    "xz": (lambda whole: lzma.compress(whole, format=lzma.FORMAT_XZ), "unxz"),
}


@pytest.mark.parametrize("packer", BOMBS)
def test_a_bomb_is_not_unpacked(queue, folder, packer):
    """Some kilobytes that hold a FITS file of 30 MB: refused by their first bytes, in no memory at all."""
    pack, mend = BOMBS[packer]
    head = fits.PrimaryHDU(np.ones((2, 2), dtype=np.uint8)).header.tostring().encode()
    (folder / "SM-0001_W3.fits").write_bytes(pack(head + b"\0" * 30_000_000))
    tracemalloc.start()
    done = loaded(queue, folder)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert len(done.refused) == 1 and mend in str(done.refused[0])
    assert peak < 10_000_000


def head_of(axes, more=()):
    """The head of a FITS file of bytes with such axes, whatever follows it."""
    cards = ["SIMPLE  =                    T", "BITPIX  =                    8", f"NAXIS   = {len(axes):20d}"]
    cards += [f"NAXIS{number:<3}= {size:20d}" for number, size in enumerate(axes, 1)]
    text = "".join(card.ljust(80) for card in (*cards, *more, "END"))
    return text.ljust(-(-len(text) // 2880) * 2880).encode()


HOSTILE = {
    "20,000 squared": head_of((20_000, 20_000)),
    "five axes": head_of((3,) * 5) + b"\0" * 2880,
    "999 axes": head_of((1,) * 999),
    "no pixels": head_of((0, 0)),
    "beyond any disk": head_of((2**31 - 1, 2**31 - 1)),
    "fewer than none": head_of((-5, 5)),
    "truncated": head_of((900, 900)) + b"\0" * 100,
    "counts that lie": head_of((2, 2), ("PCOUNT  =        9999999999", "GCOUNT  =        9999999999")),
    "a head without end": head_of((9, 9), ["COMMENT"] * 200_000),
    "blanks": b"SIMPLE".ljust(20_000_000),
}


@pytest.mark.parametrize("kind", HOSTILE)
def test_hostile_files_take_no_memory(queue, folder, kind):
    (folder / "SM-0001_W3.fits").write_bytes(HOSTILE[kind])
    tracemalloc.start()
    done = loaded(queue, folder)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert done.counts["cutouts"] == 0 and len(done.refused) == 1 and "\n" not in str(done.refused[0])
    assert peak < 10_000_000


def test_tiles_compressed_inside_the_file_are_not_unpacked_either(queue, folder):
    packed = fits.CompImageHDU(np.zeros((500, 500), dtype=np.int32), compression_type="GZIP_1")
    fits.HDUList([fits.PrimaryHDU(), packed]).writeto(folder / "SM-0001_W3.fits")
    done = loaded(queue, folder)
    assert done.counts["cutouts"] == 0 and "funpack" in str(done.refused[0])


def test_a_missing_folder_is_refused(queue, folder):
    with pytest.raises(TableError, match="no such folder"):
        loaded(queue, folder / "none")


def test_the_longest_band_that_ends_the_stem_is_the_band():
    assert name_and_band("A_B_Gaia_G", ["G", "Gaia_G", "B"]) == ("A_B", "Gaia_G")
    assert name_and_band("SM%20ü%2F1_W3", ["W3"]) == ("SM ü/1", "W3")
    assert name_and_band("_W3", ["W3"]) == ("_W3", "")


# FITS standard: CD in degrees a pixel; a rotation leaves the area, 1 arcsec by 1 arcsec, as it is.
def test_the_scale_does_not_depend_on_the_rotation():
    c, s = math.cos(0.3) / 3600, math.sin(0.3) / 3600
    assert arcsec_per_pixel({"CD1_1": -c, "CD1_2": s, "CD2_1": s, "CD2_2": c}) == pytest.approx(1.0, rel=1e-12)
    assert math.isnan(arcsec_per_pixel({})) and math.isnan(arcsec_per_pixel({"CDELT1": "x", "CDELT2": 1}))
