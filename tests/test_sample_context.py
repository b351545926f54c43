"""The sample's context: who looks alike and why, where a centroid points, what pictures show, how f is bounded."""

from __future__ import annotations

import csv
import json
import shutil
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner

from tui.cli.group import cli
from tui.data.load import bands
from tui.workflow.session import Session

SAMPLE = Path(__file__).parent.parent / "sample_db"


@pytest.fixture(scope="module")
def key():
    with (SAMPLE / "key.csv").open(encoding="utf-8") as stream:
        return list(csv.DictReader(stream))


@pytest.fixture(scope="module")
def copy(tmp_path_factory):
    """Path of a copy of the sample queue."""
    return shutil.copyfile(SAMPLE / "saltmarsh.db", tmp_path_factory.mktemp("sample") / "saltmarsh.db").as_posix()


@pytest.fixture(scope="module")
def session(copy):
    with Session.open(copy, write=False) as opened:
        yield opened


def built(key, shows):
    return [row["name"] for row in key if row["shows"] == shows]


@pytest.mark.parametrize(
    ("shows", "shared", "words"),
    [
        ("look-alikes", ("magnitude",), "They share magnitude too, as a fault of calibration would."),
        ("look-alikes in epoch and place", ("epoch", "place"), "They share epoch and place too, as a fault"),
    ],
)
def test_look_alikes_share_what_their_fault_gave_them(shows, shared, words, key, session):
    members = set(built(key, shows))
    assert len(members) == 5
    for name in members:
        found = session.look_alikes(name)
        assert members - {name} <= {one.name for one in found.candidates}
        assert found.p <= 0.01 and all(found.shared[quantity] <= 0.01 for quantity in shared)
        assert found.points_to_calibration and words in found.sentence


def test_stars_of_one_class_look_alike_and_share_nothing_else(key, session):
    """Hot dust looks the same wherever it is: the sentence must not call it a fault."""
    for row in key:
        if row["recipe"] == "hot dust":
            found = session.look_alikes(row["name"])
            assert found.p <= 0.01 and not found.points_to_calibration
            assert "a class of stars does that" in found.sentence


def test_the_centroid_points_to_where_the_galaxy_was_put(key, session):
    """Made with AllWISE 0.42 and 0.26 arcsec off, sigma 0.05, and a power law of 35 % of the star at 3.4 micron."""
    (name,) = built(key, "centroid shift")
    (shift,) = session.stored_evidence(name)["blend"].facts["centroid_shifts"]
    assert shift["catalogue"] == "AllWISE" and shift["shift"] == pytest.approx(np.hypot(0.42, 0.26), abs=3 * 0.05)
    assert shift["share"] == pytest.approx(0.35 / 1.35, abs=0.12)  # W2 and W3 have more of the galaxy than W1
    for row in key:
        if row["recipe"] in ("warm disc", "hot dust"):
            for other in session.stored_evidence(row["name"])["blend"].facts["centroid_shifts"]:
                assert other["within"] < 4 and other["p"] > 1e-4, row["name"]


def test_the_curve_of_the_largest_fraction_has_its_floor_where_the_bands_are(key, session):
    """Bands from 22 to 100 micron bound dust of some 80 to 300 K best; colder and hotter dust may hide more."""
    (name,) = built(key, "too cold to see")
    dust = session.stored_evidence(name)["dust"]
    limits = dict(zip(dust.facts["limit_temperature_k"], dust.facts["limit_fractional_luminosity"], strict=True))
    assert len(limits) == 9 and min(limits.values()) > 0
    lowest = min(limits, key=limits.__getitem__)
    assert 80 <= lowest <= 300
    assert limits[30.0] > 1000 * limits[lowest] and limits[1200.0] > 5 * limits[lowest]
    told = f"95 % limits on f: {limits[300.0]:.1g} at 300 K, {limits[80.0]:.1g} at 80 K"
    assert any(told in text for text in dust.cautions)


def test_pictures_show_the_neighbour_and_the_beam(key, session):
    """The star in the WISE beam with pictures: at the neighbour's place is more light than across from it."""
    (name,) = [n for n in built(key, "neighbour leak") if session.cutouts(n)]
    candidate = session.candidate(name)
    near = min(candidate.neighbours, key=lambda one: one.separation_arcsec)
    pictures = {cutout.band: cutout for cutout in session.cutouts(name)}
    assert set(pictures) == {"W1", "W2"}
    for band, cutout in pictures.items():
        scale = cutout.arcsec_per_pixel
        assert scale == pytest.approx(1.375) and bands()[band].beam_fwhm_arcsec > scale
        angle, pixels = np.radians(near.position_angle_deg), near.separation_arcsec / scale
        middle = (cutout.image.shape[0] - 1) / 2
        step = np.array([np.cos(angle), -np.sin(angle)]) * pixels  # rows to the north, columns to the west
        there, across = (cutout.image[tuple(np.rint(middle + sign * step).astype(int))] for sign in (1, -1))
        assert there > 1.3 * across


def test_show_and_json_tell_all_of_it(key, copy):
    """The command line and programs see what the desk sees."""
    (shifted,), (flagged,) = built(key, "centroid shift"), built(key, "IRAS flag")
    shown = CliRunner().invoke(cli, ["show", copy, shifted])
    assert shown.exit_code == 0 and "pulls it there" in " ".join(shown.output.split())
    told = json.loads(CliRunner().invoke(cli, ["show", copy, flagged, "--json"]).output)
    (flag,) = [one for one in told["checks"]["instrument"]["facts"]["flags"] if one["catalogue"] == "IRAS"]
    assert (flag["band"], flag["cause"], flag["severity"]) == ("IRAS12", "confusion", "suspicion")
    (curve,) = built(key, "light curves")
    told = json.loads(CliRunner().invoke(cli, ["show", copy, curve, "--json"]).output)
    (event,) = told["dips"]
    assert event["event"] == "2015 May" and event["stands"] and len(event["depths"]) == 5 and len(event["fits"]) == 3
