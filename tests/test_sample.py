"""The sample: what its queue holds, that it is sound and of today's code, and that its tables make it."""

from __future__ import annotations

import csv
import re
import shutil
from collections import Counter
from contextlib import closing
from pathlib import Path

import pytest
from click.testing import CliRunner

from tui.cli.group import cli
from tui.model import CHECKS, KINDS, NATURES, OUTCOMES
from tui.store.candidates import candidate_digests, candidate_names
from tui.store.connect import open_queue
from tui.store.evidence import current_evidence
from tui.store.rulings import ruling_log
from tui.store.team import team_standing
from tui.workflow import demo
from tui.workflow.assessing import compute, lacking_in, recipes_for
from tui.workflow.auditing import audit_queue
from tui.workflow.basis import read_basis
from tui.workflow.controls import read_truth
from tui.workflow.loading import Sidecars, load
from tui.workflow.session import Session

SAMPLE = Path(__file__).parent.parent / "sample_db"
TEAM = ("curlew", "heron", "plover")
REBUILD = "the sample queue is of other code or tables; make it anew: python sample_db/make_sample.py --queue"
TABLES = (
    "crossmatch.vot", "known.ecsv", "sdss.csv", "further_bands.csv", "archives.csv", "glimpse.csv", "spitzer_later.csv",
)  # fmt: skip
DIPS = ("dips.csv", "light_curves.csv", "windows.csv")


@pytest.fixture(scope="module")
def key():
    """Name -> what the star was made as."""
    with (SAMPLE / "key.csv").open(encoding="utf-8") as stream:
        return {row["name"]: row for row in csv.DictReader(stream)}


@pytest.fixture(scope="module")
def queue(tmp_path_factory):
    """Path of a copy of the sample queue; nothing opens the sample itself."""
    return shutil.copyfile(SAMPLE / "saltmarsh.db", tmp_path_factory.mktemp("sample") / "saltmarsh.db").as_posix()


@pytest.fixture
def connection(queue):
    with closing(open_queue(queue, write=False)) as opened:
        yield opened


def test_the_queue_opens_and_holds_every_star_of_the_key(connection, key):
    names = candidate_names(connection)
    assert len(names) == len(key) >= 140 and names[0] == "SM-0001"
    assert set(names) == set(key)


def test_the_queue_is_sound(queue):
    assert audit_queue(queue).faults == ()


def test_all_natures_are_there_and_the_controls_among_them(key):
    assert {row["nature"] for row in key.values()} == set(NATURES)
    truth = read_truth(str(SAMPLE / "truth.csv"))
    assert set(truth.values()) == set(NATURES)
    assert {name: key[name]["nature"] for name in truth} == truth
    assert len(truth) < len(key) / 5


def test_evidence_is_all_there_and_of_todays_code(connection):
    made_with = recipes_for(KINDS, read_basis(connection))
    lacking = lacking_in(connection, candidate_names(connection), made_with)
    assert not lacking, f"{len(lacking)} candidates lack evidence: {REBUILD}"
    assert set(made_with) == set(KINDS)


def shape(evidence):
    """What is left of evidence when rounding on another machine is taken off."""
    return (
        evidence.adequate,
        evidence.best and evidence.best.model,
        [re.sub(r"[-+0-9.e]+", "0", said) for said in evidence.cautions],
    )


def test_stored_evidence_is_what_todays_code_computes(connection, key):
    """All computed anew in one batch, as the sample was: a change of code without a change of version is caught too."""
    basis = read_basis(connection)
    names = [name for name, row in key.items() if not row["late"]]
    changed = set()
    for name, made in compute(connection, names, KINDS, basis, recipes_for(KINDS, basis)):
        stored = current_evidence(connection, name)[made.kind]
        if shape(made) != shape(stored) or (
            made.best and made.best.chi2 != pytest.approx(stored.best.chi2, rel=0.01, abs=0.1)
        ):
            changed.add(name)
    assert len(changed) <= len(names) // 20, f"{sorted(changed)} have other evidence today: {REBUILD}"


def test_the_team_ruled_a_part_and_left_work_for_a_visitor(connection, key):
    rows = list(team_standing(connection))
    outcomes = Counter(row.outcome for row in rows)
    assert set(outcomes) == set(OUTCOMES) and min(outcomes.values()) >= 4
    reasons = Counter(reason.partition(":")[0] for row in rows for reason in row.pending_reason.split(";"))
    assert reasons["split"] and reasons["nodata"] and reasons["open"]
    assert any(row.cause == "parted" for row in rows)
    assert any(count.stale for row in rows for count in row.counts.values())
    assert any(count.revised for row in rows for count in row.counts.values())
    log = list(ruling_log(connection))
    assert {ruling.ruling for ruling in log} == {"explains", "short", "unclear", "withdrawn"}
    assert any(ruling.seen_others for ruling in log) and not all(ruling.note for ruling in log)


def test_notes_are_sentences_with_all_their_numbers(connection):
    notes = {ruling.note for ruling in ruling_log(connection)} - {""}
    assert len(notes) > 100
    assert not [note for note in notes if set("{}") & set(note) or "nan" in note or note[-1] not in ".:"]


def test_a_visitor_sees_nothing_of_the_others(tmp_path):
    path = str(demo.sample_copy(tmp_path))
    with Session.open(path, demo.VISITOR) as session:
        assert {one.handle for one in session.reviewers()} == {*TEAM, demo.VISITOR}
        counts = session.counts()
        assert counts["all"] > counts["needs_me"] > 40
        name = session.next_for_me()
        view = session.view(name)
        assert view.outcome == "sealed" and not view.others and set(view.states.values()) <= {"todo", "nodata"}


def test_the_demo_without_a_terminal_tells_what_is_in_the_sample(monkeypatch, tmp_path, key):
    monkeypatch.setenv("PLAINLIGHT_CONFIG", str(tmp_path / "none.toml"))
    done = CliRunner().invoke(cli, ["demo"])
    assert done.exit_code == 0
    assert f"{len(key)} candidates" in done.output and "Saltmarsh" in done.output
    assert "curlew, heron, plover" in done.output


def test_the_tables_make_the_same_candidates(connection, tmp_path):
    path = str(tmp_path / "again.db")
    sides = Sidecars(
        dips=tuple(str(SAMPLE / table) for table in DIPS), neighbours=(str(SAMPLE / "neighbours.ecsv"),),
        spectra=(str(SAMPLE / "spectra.fits"),), cutouts=str(SAMPLE / "cutouts"),
    )  # fmt: skip
    done = load(path, [str(SAMPLE / table) for table in TABLES], sidecars=sides)
    assert done.refused == []
    names = candidate_names(connection)
    with closing(open_queue(path, write=False)) as fresh:
        assert candidate_names(fresh) == names
        assert candidate_digests(fresh, names) == candidate_digests(connection, names)


def test_loading_the_tables_again_adds_nothing(queue, tmp_path):
    path = shutil.copyfile(queue, tmp_path / "again.db").as_posix()
    done = load(path, [str(SAMPLE / table) for table in TABLES])
    assert not any(count for name, count in done.counts.items() if name != "same")


def test_the_recipes_follow_from_one_random_state(monkeypatch, key):
    monkeypatch.syspath_prepend(str(SAMPLE))
    from make_sample import STATE
    from making.recipes import all_stars

    again = [(star.nature, star.recipe, star.shows) for star in all_stars(STATE)]
    assert again == [(row["nature"], row["recipe"], row["shows"]) for row in key.values()]


def test_the_sample_stays_small():
    files = [path for path in SAMPLE.rglob("*") if path.is_file() and path.suffix != ".pyc"]
    assert sum(path.stat().st_size for path in files) < 4.6e6


def test_practice_stars_are_in_no_queue(connection):
    from tui.workflow.practice import practice_stars

    assert len(practice_stars()) == 3
    assert not {star.name for star in practice_stars()} & set(candidate_names(connection))


def test_the_practice_answers_agree_with_the_evidence():
    from tui.workflow.practice import practice_evidence, practice_stars

    for star in practice_stars():
        evidence = practice_evidence(star)
        explained = [check for check in CHECKS if star.answers[check].ruling == "explains"]
        assert len(explained) == 1 and evidence[explained[0]].adequate is True, star.name
        assert evidence["star"].adequate is False and all(len(answer.why) > 20 for answer in star.answers.values())
        inadequate = [check for check in CHECKS if evidence[check].adequate is False]
        assert all(star.answers[check].ruling == "short" for check in inadequate), star.name
