"""Loading, which only adds, and reading today's state."""

from __future__ import annotations

import math

import numpy as np
import pytest

from tests.store.making import star, utc
from tui.errors import InputError, UnknownNameError
from tui.model import Candidate, Dip, Measurement, Neighbour, Spectrum
from tui.store.candidates import (
    candidate_count,
    candidate_digests,
    candidate_name,
    candidate_names,
    get_candidate,
    get_candidates,
    name_pages,
    save_candidates,
)
from tui.store.digests import queue_digest
from tui.store.records import Cutout, LoadCounts, LoadRecord
from tui.store.sides import MAX_PIXELS, attach, attachment, attachments, cutouts, save_cutout


def load(connection, *candidates, source="table", second=0.0):
    return save_candidates(connection, [LoadRecord(one, source) for one in candidates], utc(second))


def full_candidate(name="SM-1"):
    wave = np.array([1.0, 1.5, 2.5])
    return Candidate(
        name,
        (
            Measurement("J", 1.0, 0.1, source="2MASS", flags={"ph_qual": "A"}, value=10.0, value_error=0.1, unit="mag"),
            Measurement("W4", 0.3, math.nan, limit=True, nsigma=2.0, source="AllWISE", epoch="2010.5"),
        ),
        {"ra": 10.0, "dec": -3.0, "sp_type": "K2V", "age_myr": 120.0},
        (Neighbour(4.5, 120.0, {"J": 0.01}, "2MASS"), Neighbour(9.0)),
        (Dip("first", "g", 0.2, 0.01, "57000"), Dip("first", "r", 0.15, 0.02, "57000")),
        Spectrum(wave, wave * 2, wave * 0.1),
    )


def same(left, right):
    """Equality in which NaN equals NaN and spectra are compared by their numbers."""
    return repr(left) == repr(right)


def test_what_is_loaded_is_read(queue):
    given = full_candidate()
    assert load(queue, given) == LoadCounts(candidates=1, measurements=2, side_tables=3)
    read = get_candidate(queue, "SM-1")
    assert same(read, Candidate(given.name, given.measurements, dict(sorted(given.facts.items())), *(
        getattr(given, field) for field in ("neighbours", "dips", "spectrum"))))  # fmt: skip


def test_loading_the_same_again_adds_nothing(queue):
    load(queue, full_candidate(), star("SM-2"))
    before = queue_digest(queue), queue.execute("SELECT COUNT(*) FROM load").fetchone()
    again = load(queue, full_candidate(), star("SM-2"), second=500)
    assert again == LoadCounts(same=5)
    assert (queue_digest(queue), queue.execute("SELECT COUNT(*) FROM load").fetchone()) == before


def test_a_correction_and_a_repeat_are_counted(queue):
    load(queue, star("SM-1", J=1.0, H=1.0))
    assert load(queue, star("SM-1", J=1.1, H=1.0), second=1) == LoadCounts(corrections=1, same=1)
    repeat = Candidate("SM-1", (Measurement("J", 1.3, 0.1, source="UKIDSS"),))
    assert load(queue, repeat, second=2) == LoadCounts(repeats=1)
    read = get_candidate(queue, "SM-1")
    assert [(one.band, one.source, one.flux_jy) for one in read.measurements] == [
        ("H", "2MASS", 1.0),
        ("J", "2MASS", 1.1),
        ("J", "UKIDSS", 1.3),
    ]


def test_of_two_lines_in_one_load_the_later_is_the_newer(queue):
    for first, second, name in ((1.0, 2.0, "a"), (2.0, 1.0, "b")):
        load(queue, star(name, J=first), star(name, J=second))
        assert get_candidate(queue, name).measurements[0].flux_jy == second


def test_a_load_is_later_than_all_before_it_whatever_the_clock_says(queue):
    load(queue, star("SM-1", J=1.0), second=100)
    load(queue, star("SM-1", J=2.0), second=5)
    assert get_candidate(queue, "SM-1").measurements[0].flux_jy == 2.0


def test_facts_of_several_tables_lie_over_one_another(queue):
    load(queue, Candidate("SM-1", facts={"ra": 1.0, "ruwe": 1.1}), source="gaia")
    load(queue, Candidate("SM-1", facts={"ra": 1.5, "av_max": 0.3}), source="dust map", second=1)
    assert load(queue, Candidate("SM-1"), source="photometry", second=2) == LoadCounts()
    assert get_candidate(queue, "SM-1").facts == {"ra": 1.5, "ruwe": 1.1, "av_max": 0.3}
    load(queue, Candidate("SM-1", facts={"ra": 1.25}), source="gaia", second=3)
    assert get_candidate(queue, "SM-1").facts == {"ra": 1.25, "av_max": 0.3}


def test_facts_that_are_no_number_are_left_out(queue):
    facts = {"ra": np.float64(1.0), "parallax": math.nan, "sp_type": None, "binary": np.True_}
    load(queue, Candidate("SM-1", facts=facts))
    assert get_candidate(queue, "SM-1").facts == {"ra": 1.0, "binary": True}


def test_another_set_of_neighbours_takes_the_place_of_the_first(queue):
    load(queue, Candidate("SM-1", neighbours=(Neighbour(1.0), Neighbour(2.0))), source="gaia")
    load(queue, Candidate("SM-1", neighbours=(Neighbour(3.0),)), source="gaia", second=1)
    load(queue, Candidate("SM-1", neighbours=(Neighbour(9.0),)), source="2mass", second=2)
    assert [one.separation_arcsec for one in get_candidate(queue, "SM-1").neighbours] == [9.0, 3.0]


def test_names_keep_their_case_and_are_one_in_every_form_of_unicode(queue):
    load(queue, star("Ångström 1"), star("ångström 1"))
    decomposed = "A\u030angstro\u0308m 1"
    assert load(queue, star(decomposed)).candidates == 0
    assert candidate_count(queue) == 2
    assert get_candidate(queue, decomposed).name == "Ångström 1"


@pytest.mark.parametrize("name", ["", "  ", "x" * 201, "a\0b", "\ud800"])
def test_names_that_cannot_be_kept_are_refused(queue, name):
    with pytest.raises(InputError):
        load(queue, star(name))
    assert candidate_count(queue) == 0


@pytest.mark.parametrize("name", ["[/]", "'; DROP TABLE ruling; --", "\x1b[2J", "𝛼 Cen", "=1+1", "x" * 200])
def test_hostile_names_are_only_names(queue, name):
    load(queue, star(name))
    assert get_candidate(queue, name).name == name


def test_an_unknown_name_is_said(queue):
    for name in ("SM-9", "", "\ud800", "x" * 300):
        with pytest.raises(UnknownNameError):
            get_candidate(queue, name)
    with pytest.raises(UnknownNameError):
        candidate_name(queue, 99)


def test_many_at_once_in_the_order_asked(queue):
    names = [f"SM-{number}" for number in range(1200)]
    load(queue, *(star(name) for name in names))
    asked = names[::-7]
    assert [one.name for one in get_candidates(queue, asked)] == asked
    assert [one.name for one in get_candidates(queue, [3, 1, 3])] == ["SM-2", "SM-0", "SM-2"]
    with pytest.raises(UnknownNameError):
        get_candidates(queue, [1, 99_999])
    assert [name for page in name_pages(queue, 500) for name in page] == names == candidate_names(queue)


def test_a_load_that_fails_keeps_the_whole_records_before_it(queue):
    def records():
        for number in range(700):
            yield LoadRecord(star(f"SM-{number}"))
        raise InputError("the table ends in the middle of a line")

    with pytest.raises(InputError):
        save_candidates(queue, records(), utc())
    assert candidate_count(queue) == 500
    assert queue.execute("SELECT COUNT(*) FROM candidate WHERE input_digest = ''").fetchone() == (0,)
    load(queue, *(star(f"SM-{number}") for number in range(700)))
    assert candidate_count(queue) == 700


def test_the_input_digest_follows_all_that_fits_read(queue):
    seen = set()
    changes = (
        star("SM-1"),
        Candidate("SM-1", facts={"ra": 11.0}),
        star("SM-1", J=9.0),
        Candidate("SM-1", neighbours=(Neighbour(1.0),)),
        Candidate("SM-1", dips=(Dip("e", "g", 0.1, 0.1),)),
        Candidate("SM-1", spectrum=full_candidate().spectrum),
    )
    for second, change in enumerate(changes):
        load(queue, change, second=second)
        seen.add(candidate_digests(queue, ["SM-1", "nobody"])["SM-1"])
    assert len(seen) == len(changes)


def test_the_input_digest_does_not_depend_on_the_way_there(queue, tmp_path):
    from tui.store.connect import open_queue

    other = open_queue(tmp_path / "other.db", create=True)
    load(queue, star("SM-0"), star("SM-1", J=1.0, H=2.0))
    load(other, star("SM-1", J=1.0), second=50)
    load(other, star("SM-1", H=2.0), second=60)
    assert candidate_digests(queue, ["SM-1"]) == candidate_digests(other, ["SM-1"])
    other.close()


def test_cutouts_are_kept_once_and_read_by_band(queue):
    load(queue, star("SM-1"))
    image = np.arange(12.0).reshape(3, 4)
    assert save_cutout(queue, "SM-1", Cutout("W3", image, 2.75, "AllWISE", {"survey": "x"}), utc(1))
    assert not save_cutout(queue, "SM-1", Cutout("W3", image, 2.75, "AllWISE", {"survey": "x"}), utc(2))
    assert save_cutout(queue, "SM-1", Cutout("W3", image + 1, 2.75, "AllWISE"), utc(3))
    (found,) = cutouts(queue, "SM-1")
    assert np.array_equal(found.image, image + 1)
    assert (found.band, found.arcsec_per_pixel) == ("W3", 2.75)


@pytest.mark.parametrize("shape", [(0, 0), (5,), (2, 2, 2), (1, MAX_PIXELS + 1)])
def test_what_is_no_cutout_is_refused(queue, shape):
    load(queue, star("SM-1"))
    with pytest.raises(InputError):
        save_cutout(queue, "SM-1", Cutout("J", np.zeros(shape), 1.0), utc())


def test_attachments_are_kept_by_content(queue):
    digest = attach(queue, "grid", "mine", b"spectra")
    assert attach(queue, "grid", "another name", b"spectra") == digest
    assert attachment(queue, digest).content == b"spectra"
    assert [one.name for one in attachments(queue, "grid")] == ["mine"]
    with pytest.raises(UnknownNameError):
        attachment(queue, "0" * 64)
