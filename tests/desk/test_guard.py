"""The last guard: faults of the program cost a line on the screen, an entry in the log, and nothing else."""

from __future__ import annotations

import asyncio

import pytest
from textual.screen import Screen
from textual.widgets import Static

from tui.desk.app import Desk
from tui.desk.screens import queue as queue_module
from tui.desk.screens.queue import QueueScreen
from tui.desk.widgets import candidate_list
from tui.errors import StoreError


class BrokenDrawing(Static):
    """Fails at every repaint."""

    def render(self):
        raise ZeroDivisionError("no width")


class BrokenMeasure(Static):
    """Cannot say how high it is."""

    def get_content_height(self, container, viewport, width):
        raise KeyError("height")


class BrokenScreen(Screen[None]):
    """Has nothing to show, not even a line for messages."""

    BINDINGS = [("q", "dismiss", "back")]

    def compose(self):
        raise RuntimeError("no parts")


def fail(*args, **kwargs):
    raise ZeroDivisionError("of a handler")


def refuse(*args, **kwargs):
    raise StoreError("The queue file is locked.")


@pytest.fixture
def log(monkeypatch, tmp_path):
    """The function that gives the log's entries, one a fault."""
    monkeypatch.setattr("platformdirs.user_log_path", lambda *args, **kwargs: tmp_path)

    def entries() -> list[str]:
        path = tmp_path / "desk-faults.txt"
        return path.read_text().split("\n\n")[:-1] if path.exists() else []

    return entries


@pytest.fixture
def guarded(drive):
    """Run steps on a desk with the guard on."""

    def run(session, steps, **options):
        async def whole(app, pilot):
            app.is_guarded = True
            await steps(app, pilot)

        drive(session, whole, **options)

    return run


async def rest(pilot):
    for _ in range(4):
        await pilot.pause()


@pytest.mark.parametrize("broken", [BrokenDrawing, BrokenMeasure])
def test_what_cannot_be_drawn_is_said_once_and_all_else_is_drawn(fake_session, guarded, screen_text, log, broken):
    async def steps(app, pilot):
        await app.screen.mount(broken("x", id="broken"), before="#described")
        await rest(pilot)
        text = screen_text(app)
        assert f"The broken {broken.__name__.removeprefix('Broken').lower()} could not be drawn" in text
        assert "> SM-0001" in text and "quit" in text and "desk-faults.txt" in "".join(text.split())
        for _ in range(5):
            app.screen.query_one("#broken").refresh(layout=True)
            await rest(pilot)
        await pilot.press("down", "down")
        await rest(pilot)
        assert "> SM-0003" in screen_text(app)
        assert len(log()) == 1 and "test_guard.py" in log()[0]

    guarded(fake_session, steps, size=(160, 40))


def test_one_bad_row_costs_its_own_line(fake_session, guarded, screen_text, log, monkeypatch):
    draw = candidate_list.row_cells

    def row_cells(row, *how):
        return draw(row, *how) if row.name != "SM-0003" else fail()

    async def steps(app, pilot):
        monkeypatch.setattr(candidate_list, "row_cells", row_cells)
        app.screen.refresh_all()
        await rest(pilot)
        lines = screen_text(app).splitlines()
        place = next(number for number, line in enumerate(lines) if "SM-0002" in line)
        assert lines[place + 1].strip().startswith("could not be drawn") and "SM-0004" in lines[place + 2]
        await pilot.press("down", "down", "down")
        await rest(pilot)
        assert "> SM-0004" in screen_text(app) and len(log()) == 1

    guarded(fake_session, steps)


def test_a_key_whose_work_fails_says_so_each_time_and_other_keys_work(
    fake_session, guarded, screen_text, log, monkeypatch
):
    monkeypatch.setattr(QueueScreen, "action_tally", fail)

    async def steps(app, pilot):
        for _ in range(2):
            await pilot.press("t")
            await rest(pilot)
            assert "Something went wrong in the" in screen_text(app)
            await pilot.press("down")
            await rest(pilot)
            assert "Something went wrong" not in screen_text(app)
        assert "> SM-0003" in screen_text(app)
        assert len(log()) == 1 and "of a handler" in log()[0]

    guarded(fake_session, steps)


def test_work_in_the_background_that_fails_is_said(fake_session, guarded, screen_text, log, monkeypatch):
    async def steps(app, pilot):
        monkeypatch.setattr(fake_session, "order", fail)
        app.screen.order()
        await rest(pilot)
        assert "Something went wrong in the background (ZeroDivisionError)" in screen_text(app)
        assert len(log()) == 1 and "> SM-0001" in screen_text(app)

    guarded(fake_session, steps)


def test_a_clock_that_fails_at_every_tick_is_said_once(fake_session, guarded, log, monkeypatch):
    async def steps(app, pilot):
        told = []
        monkeypatch.setattr(app, "tell", lambda text: told.append(text) or asyncio.sleep(0))
        ticks, done = [], asyncio.Event()

        def tick():
            ticks.append(1)
            if len(ticks) == 20:
                done.set()
                timer.stop()
            raise ValueError("at every tick")

        timer = app.screen.set_interval(0.001, tick)
        await done.wait()
        await rest(pilot)
        assert len(told) == 1 and len(log()) == 1

    guarded(fake_session, steps)


def test_a_page_that_cannot_be_made_can_be_left(fake_session, guarded, screen_text, log):
    async def steps(app, pilot):
        app.push_screen(BrokenScreen())
        await rest(pilot)
        assert "Something went wrong" in screen_text(app)
        await pilot.press("q")
        await rest(pilot)
        assert isinstance(app.screen, QueueScreen) and "> SM-0001" in screen_text(app)

    guarded(fake_session, steps)


def test_an_error_raised_on_purpose_says_its_own_sentence(fake_session, guarded, screen_text, log, monkeypatch):
    async def steps(app, pilot):
        candidates = app.screen.query_one("#list")
        candidates.fetch = refuse
        app.call_later(candidates.forget_rows)
        await rest(pilot)
        assert "The queue file is locked." in screen_text(app) and not log()
        await pilot.press("question_mark")
        await rest(pilot)
        assert not isinstance(app.screen, QueueScreen)

    guarded(fake_session, steps)


def test_a_note_that_is_being_typed_outlives_a_fault(fake_session, on_candidate, screen_text, log):
    async def steps(app, screen, press):
        app.is_guarded = True
        await press("a", "o", "d")
        screen.call_later(fail)
        await press("d")
        screen.call_later(fail)
        while not screen.query_one("#message").display:
            await asyncio.sleep(0)
        assert "Something went wrong" in str(screen.query_one("#message").content)
        await press("tab", "f", "enter")
        assert fake_session.log[-1].note == "odd" and len(log()) == 1

    on_candidate(fake_session, steps)


def test_details_that_cannot_be_kept_are_no_second_fault(fake_session, guarded, screen_text, monkeypatch):
    def full(*args, **kwargs):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("platformdirs.user_log_path", full)
    monkeypatch.setattr(QueueScreen, "action_tally", fail)

    async def steps(app, pilot):
        await pilot.press("t")
        await rest(pilot)
        assert "Its details could not be kept (No space left on device)." in " ".join(screen_text(app).split())

    guarded(fake_session, steps, size=(160, 40))


@pytest.mark.parametrize("where", ["key", "drawing", "worker"])
def test_without_the_guard_a_fault_fails_the_test(fake_session, drive, monkeypatch, where):
    monkeypatch.setattr(QueueScreen, "action_tally", fail)

    async def steps(app, pilot):
        if where == "key":
            await pilot.press("t")
        elif where == "drawing":
            await app.screen.mount(BrokenDrawing("x"))
        else:
            monkeypatch.setattr(fake_session, "order", fail)
            app.screen.order()
        await rest(pilot)

    with pytest.raises(ZeroDivisionError):
        drive(fake_session, steps)


def test_a_real_run_is_guarded_and_tells_at_the_end(fake_session, log, monkeypatch, capfd):
    monkeypatch.setattr(QueueScreen, "action_tally", fail)
    app = Desk(fake_session)

    async def keys(pilot):
        await pilot.press("t", "down", "q", "q")

    app.run(headless=True, size=(80, 24), auto_pilot=keys)
    assert app.return_code == 1 and len(log()) == 1
    assert "Please send" in capfd.readouterr().err


def test_a_real_run_without_faults_is_done(fake_session, log):
    app = Desk(fake_session)

    async def keys(pilot):
        await pilot.press("down", "q", "q")

    app.run(headless=True, size=(80, 24), auto_pilot=keys)
    assert app.return_code == 0 and not log()


def test_a_desk_that_cannot_start_says_so_without_a_traceback(fake_session, log, monkeypatch, capfd):
    monkeypatch.setattr(Desk, "get_default_screen", fail)
    app = Desk(fake_session)
    app.run(headless=True, size=(80, 24))
    said = capfd.readouterr().err
    assert app.return_code == 1 and "fault of its own" in said and "Traceback" not in said and len(log()) == 1
