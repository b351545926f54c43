"""The ready queue: loaded, assessed and ruled with the program's own functions, under a clock and ids of its own."""

from __future__ import annotations

import csv
import random
import sqlite3
from collections.abc import Iterator, Mapping
from contextlib import closing, contextmanager
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from pathlib import Path
from unittest import mock

from making.notes import note

from tui.model import CHECKS, Evidence
from tui.workflow import setting
from tui.workflow.assessing import assess_queue
from tui.workflow.joining import join
from tui.workflow.loading import Loaded, Sidecars, load
from tui.workflow.session import Session

QUEUE = "saltmarsh.db"
TABLES = ("crossmatch.vot", "known.ecsv", "sdss.csv", "further_bands.csv", "archives.csv", "glimpse.csv")
DIPS = ("dips.csv", "light_curves.csv", "windows.csv")
LATER = "spitzer_later.csv"
SEARCHED = 48_000  # stars of the invented survey
BEGIN = datetime(2026, 11, 9, 19, 0, tzinfo=UTC)
DISPUTED = ("look-alikes", "grey dip", "over-luminosity", "RUWE", "non-single flag", "chance alignment")


@dataclass(frozen=True, slots=True)
class Habit:
    """How one reviewer works."""

    handle: str
    share: float  # of the candidates that this one got through
    slips: float  # chance of a ruling that the others would not make
    doubts: float  # chance of `unclear` where a fit is adequate and another explanation is at hand


TEAM = (Habit("heron", 0.54, 0.04, 0.05), Habit("plover", 0.46, 0.10, 0.05), Habit("curlew", 0.38, 0.06, 0.20))


class Clock:
    """Stands in for the wall clock: each look is a little later than the last."""

    def __init__(self, begin: datetime, dice: random.Random) -> None:
        self.moment, self.dice = begin, dice

    def now(self, zone: object = None) -> datetime:
        """The moment, some seconds to a minute after the last."""
        self.moment += timedelta(seconds=self.dice.uniform(7, 55))
        return self.moment


@contextmanager
def own_time_and_ids(clock: Clock, dice: random.Random) -> Iterator[None]:
    """The program under `clock`, with ids from `dice`."""
    ids = mock.patch("secrets.token_hex", lambda size=16: dice.randbytes(size).hex())
    with mock.patch("tui.workflow.clock.datetime", clock), ids:
        yield


def make_queue(folder: Path) -> str:
    """Make `saltmarsh.db` in `folder` from the tables there; a sentence about it."""
    path = folder / QUEUE
    for old in folder.glob(f"{QUEUE}*"):
        old.unlink()
    key = {row["name"]: row for row in csv.DictReader((folder / "key.csv").open(encoding="utf-8"))}
    clock, dice = Clock(BEGIN, random.Random(20261109)), random.Random(20140901)
    with own_time_and_ids(clock, dice):
        done = load_tables(str(path), folder)
        for habit in TEAM:
            join(str(path), habit.handle)
        setting.write(str(path), "n_searched", str(SEARCHED), "heron")
        assess_queue(str(path), jobs=1)
        for evening, habit in enumerate(TEAM, 1):
            clock.moment = max(clock.moment, BEGIN + timedelta(days=evening))
            first_round(str(path), habit, key, dice)
        clock.moment += timedelta(days=3)
        load(str(path), [str(folder / LATER)])
        assess_queue(str(path), jobs=1)
        second_round(str(path), key, dice)
    pack(path)
    return f"{QUEUE}: {len(key)} candidates, {path.stat().st_size / 1e6:.1f} MB. {done.sentence()}"


def load_tables(path: str, folder: Path) -> Loaded:
    """Load all tables but the late one."""
    sides = Sidecars(
        dips=tuple(str(folder / table) for table in DIPS),
        neighbours=(str(folder / "neighbours.ecsv"),),
        spectra=(str(folder / "spectra.fits"),),
        cutouts=str(folder / "cutouts"),
    )
    return load(path, [str(folder / table) for table in TABLES], sidecars=sides)


def pack(path: Path) -> None:
    """One tidy file: small pages suit rows of two kilobytes, and nothing is left beside it."""
    with closing(sqlite3.connect(path)) as connection:
        connection.execute("PRAGMA journal_mode=DELETE")
        connection.execute("PRAGMA page_size=2048")
        connection.execute("VACUUM")


def first_round(path: str, habit: Habit, key: Mapping[str, Mapping[str, str]], dice: random.Random) -> None:
    """One reviewer's evenings: a walk through the candidates that fell to them."""
    with Session.open(path, habit.handle) as session:
        for name, row in key.items():
            chance = 0.9 if must_be_ruled(row) else habit.share
            if dice.random() < chance:
                walk(session, name, row, habit, dice, breaks_off=dice.random() < 0.05)


def must_be_ruled(row: Mapping[str, str]) -> bool:
    """Whether the sample needs rulings on this candidate: what it is to show shows only then."""
    return row["nature"] == "none" or bool(row["late"]) or row["shows"] in DISPUTED


def walk(
    session: Session, name: str, row: Mapping[str, str], habit: Habit, dice: random.Random, *, breaks_off: bool = False
) -> None:
    """Rule the checks in order until one explains, as one does at the desk."""
    candidate, evidence = session.candidate(name), session.evidence(name)
    for place, check in enumerate(CHECKS):
        ruling = judged(check, row, evidence, habit, dice)
        if not ruling or (breaks_off and place == 2):
            continue
        text = note(row["recipe"], candidate, evidence, check, ruling, dice.random())
        session.rule(name, check, ruling, text, evidence[check].digest)
        if ruling == "explains":
            return


def judged(
    check: str, row: Mapping[str, str], evidence: Mapping[str, Evidence], habit: Habit, dice: random.Random
) -> str:
    """What this reviewer makes of one check; "" where nothing can be ruled."""
    adequate, slip = evidence[check].adequate, dice.random()
    if adequate is None:
        return ""
    if row["shows"] == "look-alikes" and habit.handle == "curlew" and check == "instrument":
        return "short"
    if row["shows"] == "chance alignment" and habit.handle == "curlew" and check in ("blend", "dust"):
        return "short"
    if row["nature"] == check and (adequate or row["shows"] in ("neighbour leak", "look-alikes")):
        return "explains" if slip > habit.slips else "unclear"
    if not adequate:
        return "short" if slip > 0.3 * habit.slips else "unclear"
    if check == "star":
        knows_better = row["shows"] in ("over-luminosity", "RUWE", "non-single flag") and habit.handle != "heron"
        return "short" if knows_better else "explains"
    if row["shows"] in ("look-alikes", "chance alignment") and check == "dust":
        return "explains"
    if slip < habit.slips:
        return "explains"
    return "unclear" if slip < habit.slips + habit.doubts else "short"


def second_round(path: str, key: Mapping[str, Mapping[str, str]], dice: random.Random) -> None:
    """Some days later: two splits are ruled again, one late candidate is looked at anew, one slip is taken back."""
    with Session.open(path) as team:
        split = [name for name in key if any(state == "split" for state in team_states(team, name).values())]
    for name in split[:2]:
        settle(path, name, key[name])
    with Session.open(path, "plover") as session:
        late = [name for name, row in key.items() if row["late"]]
        walk(session, late[0], key[late[0]], TEAM[1], dice)
    with Session.open(path, "curlew") as session:
        own = [name for name in key if (ruling := session.view(name).own.get("star")) and ruling.ruling == "explains"]
        session.withdraw(own[-1], "star", "I had the wrong candidate open. Taken back.")
    with Session.open(path, "heron") as session:
        undecided = next(name for name in key if not session.view(name).own)
        session.save_draft(undecided, "star", "Come back to this one with fresh eyes:")


def team_states(session: Session, name: str) -> Mapping[str, str]:
    """Where the team stands with a candidate, whoever looks."""
    from tui.store.team import team_row

    row = team_row(session.connection, session.id_of(name))
    return row.states if row else {}


def settle(path: str, name: str, row: Mapping[str, str]) -> None:
    """Whoever had a split check otherwise than the nature asks rules it again, with the others' notes in view."""
    for habit in TEAM:
        with Session.open(path, habit.handle) as session:
            view = session.view(name)
            if not view.seal_open:
                continue
            for check, own in view.own.items():
                if view.states[check] == "split":
                    right = "explains" if check == row["nature"] else "short"
                    text = "I stay with it." if own.ruling == right else "The others' notes convince me. Changed."
                    session.rule(name, check, right, text)
