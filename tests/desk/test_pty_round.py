"""A round by keys alone, told by the screen alone: the real command in a terminal, on a copy of the sample queue."""

from __future__ import annotations

import re
import shutil
import signal
from contextlib import closing, contextmanager
from pathlib import Path

import pytest
from astropy.table import Table

from tests.desk.terminal import ENTER, ROOT, TAB, UP, Terminal
from tui.model import CHECKS
from tui.store.connect import open_queue
from tui.store.reviewers import reviewer_by_handle
from tui.store.rulings import rulings_of
from tui.workflow.joining import join
from tui.workflow.session import Session

SAMPLE = Path(ROOT) / "sample_db" / "saltmarsh.db"
ABBREVIATED = dict(zip(("STAR", "INSTR", "EXTIN", "BLEND", "WDUST"), CHECKS, strict=True))
ABBREVIATION = {check: short for short, check in ABBREVIATED.items()}
CHI2 = r"chi2 +([\d.]+)"


@pytest.fixture
def queue(tmp_path, monkeypatch) -> Path:
    """A copy of the sample queue, which a newcomer has joined; no configuration but the program's own."""
    monkeypatch.setenv("PLAINLIGHT_CONFIG", str(tmp_path / "none.toml"))
    path = tmp_path / "saltmarsh.db"
    shutil.copy(SAMPLE, path)
    join(str(path), "visitor")
    return path


@contextmanager
def desk(queue: Path, handle: str, columns: int, lines: int):
    """The command in its terminal, open at the queue; nothing of it is left afterwards."""
    opened = Terminal("review", queue.name, "--as", handle, columns=columns, lines=lines, folder=str(queue.parent))
    try:
        opened.until(r"\d+ NEEDS? YOU")
        yield opened
    finally:
        opened.close()


def made(queue: Path, handle: str, name: str):
    """What one reviewer ruled on one candidate, as the store has it, in time order."""
    with closing(open_queue(str(queue), write=False)) as connection:
        own = reviewer_by_handle(connection, handle).id
        return [ruling for ruling in rulings_of(connection, name) if ruling.reviewer_id == own]


def name_on(terminal: Terminal) -> str:
    """The candidate that the first line names."""
    return terminal.text.split()[0]


def check_on(terminal: Terminal) -> str:
    """The check that stands in brackets on the second line."""
    return ABBREVIATED[terminal.until(r"\[([A-Z]+) ").group(1)]


def to_untouched(terminal: Terminal) -> str:
    """The next candidate on which all five checks can be ruled; its name."""
    terminal.press("m", "next, fewest finished", r"RULE +e explains")
    while terminal.shows("-nodata"):
        terminal.press("l", "later", rf"Left for later: {name_on(terminal)}")
        terminal.until(r"RULE +e explains")
    return name_on(terminal)


def test_five_checks_from_a_cold_start_at_80_by_24(queue):
    with desk(queue, "visitor", 80, 24) as terminal:
        terminal.until("m: the star that the fewest have finished")
        name = to_untouched(terminal)
        for number, check in enumerate(CHECKS):
            terminal.until(rf"\[{ABBREVIATION[check]} ")  # a frame may arrive in pieces, its last lines first
            assert name_on(terminal) == name
            terminal.press("f", "falls short", "> falls short <")
            if check == "extinction":
                terminal.press("a", "note", "Tab leaves the note")
                terminal.type("Too blue for any law.")
                terminal.press(TAB, "leaves the note", "note: Too blue")
            last = number == len(CHECKS) - 1
            said = f"You are done with {name}; the seal is open" if last else r"Recorded: [a-z ]+ falls short"
            terminal.press(ENTER, "records it", said)
            terminal.until(r"RULE +e explains")
        terminal.until("rulings of others")  # pieces of one frame again
        assert name_on(terminal) == name
        terminal.press("q", "to the plot", "LOOK AT")
        terminal.press("q", "back", "NEED YOU")
        terminal.press("q", "quit", "q again leaves; everything is kept")
        terminal.type_key("q")
        assert terminal.status() == 0 and terminal.is_as_before()
    rulings = made(queue, "visitor", name)
    assert [(one.check, one.ruling) for one in rulings] == [(check, "short") for check in CHECKS]
    assert [one.note for one in rulings] == ["", "", "Too blue for any law.", "", ""]
    assert not any(one.seen_others for one in rulings)


def probe(terminal: Terminal) -> None:
    """Change a number by hand: chi-square follows; reset: it is as it was."""
    fitted = terminal.until(CHI2).group(1)
    terminal.press("h", "by hand", "by hand: ")
    terminal.press(UP, "T star", rf"chi2 +(?!{re.escape(fitted)}\b)[\d.]+")
    terminal.press("0", "all as fitted", rf"chi2 +{re.escape(fitted)}\b")
    terminal.press("h", "leave", "h by hand")


def rule_and_withdraw(terminal: Terminal) -> str:
    """The first of what is unresolved in blend: filter, open, probe, rule with a note, withdraw; its name."""
    terminal.press("b", "unresolved", "showing blend unresolved")
    terminal.press(ENTER, "open", r"RULE +e explains")
    name = name_on(terminal)
    probe(terminal)
    terminal.press("f", "falls short", "> falls short <")
    terminal.press("a", "note", "Tab leaves the note")
    terminal.type("W3 to W4 rise.")
    terminal.press(TAB, "leaves the note", r"note: W3 to W4 rise\.")
    terminal.press(ENTER, "records it", "Recorded: star falls short")
    terminal.press("s", "checks", r"\[STAR <short\]")
    terminal.press("w", "withdraw", "> withdraw <")
    terminal.press(ENTER, "records it", "Withdrawn: your ruling on star")
    terminal.press("q", "back", "NEED YOU")
    return name


def settle_split(terminal: Terminal) -> str:
    """The first candidate whose rulings part: find it, read all notes, rule once more; its name."""
    name = terminal.until(r"(SM-\d{4}) .* /split ").group(1)
    terminal.press("/", "find", "Esc drops it")
    terminal.type(name)
    terminal.until(rf"> {name} ")
    terminal.type_key(ENTER)
    terminal.cursor_on(f"> {name} ")
    terminal.press("v", "split: all notes", "choose once more")
    assert terminal.shows("before the seal opened") and terminal.shows(r"heron \(you\)")
    terminal.press("u", "unclear", "> unclear <")
    terminal.press(ENTER, "records it", "Recorded: unclear, with the others in view")
    terminal.press("q", "back", "NEED YOU")
    return name


def write_list(terminal: Terminal) -> None:
    """The tally, and the vetted list beside the queue."""
    terminal.press("t", "tally", "1 IS IT DONE +1[0-9]+ candidates")
    terminal.press("w", "write out", r"write the list into .*\n\s*saltmarsh-vetted\.ecsv")
    terminal.type_key(ENTER)
    terminal.until(r"Wrote \d+ candidates to saltmarsh-vetted\.ecsv")
    terminal.press("q", "back", "NEED YOU")


def test_a_whole_round_by_keys_at_200_by_60(queue):
    with desk(queue, "heron", 200, 60) as terminal:
        name = rule_and_withdraw(terminal)
        split = settle_split(terminal)
        write_list(terminal)
        terminal.press("q", "quit", "q again leaves; everything is kept")
        terminal.type_key("q")
        assert terminal.status() == 0 and terminal.is_as_before()
    first, second = made(queue, "heron", name)[-2:]
    assert (first.check, first.ruling, first.note) == ("star", "short", "W3 to W4 rise.")
    assert (second.check, second.ruling, second.replaces) == ("star", "withdrawn", first.id)
    again = made(queue, "heron", split)[-1]
    assert (again.ruling, again.seen_others) == ("unclear", True)
    with Session.open(str(queue), "heron") as session:
        assert session.view(split).own[again.check] == again
        listed = len(session.order())
    table = Table.read(queue.parent / "saltmarsh-vetted.ecsv")
    assert len(table) == listed
    row = table[table["name"] == split][0]
    assert row[f"{again.check}_unclear"] >= 1 and row[f"{again.check}_revised"] >= 1


@pytest.mark.parametrize("number", [signal.SIGTERM, signal.SIGHUP], ids=lambda one: one.name)
def test_cut_off_amid_a_note_it_leaves_the_terminal_whole_and_keeps_the_note(queue, number):
    with desk(queue, "visitor", 80, 24) as terminal:
        terminal.press("m", "next, fewest finished", r"RULE +e explains")
        name, check = name_on(terminal), check_on(terminal)
        terminal.press("a", "note", "Tab leaves the note")
        terminal.type("half a thou")
        terminal.process.send_signal(number)
        assert terminal.status() == 0 and terminal.is_as_before()
    with Session.open(str(queue), "visitor") as session:
        assert session.draft(name, check) == "half a thou"
        assert session.position() == (name, check)
