"""Opening, creating, refusing and bringing up to date."""

from __future__ import annotations

import hashlib
import os
import shutil
import sqlite3
import subprocess
import sys
from pathlib import Path

import pytest

from tests.store.making import fill, rule, utc
from tui.errors import StoreError
from tui.store import connect
from tui.store.candidates import candidate_count, candidate_names
from tui.store.connect import data_version, immediate, open_queue, read_header
from tui.store.reviewers import add_reviewer, reviewer_by_handle
from tui.store.schema import APPLICATION_ID, MIGRATIONS, SCHEMA_VERSION, migrate


def content(folder: Path) -> dict[str, str]:
    return {entry.name: hashlib.sha256(entry.read_bytes()).hexdigest() for entry in folder.iterdir()}


def plain(path: str) -> sqlite3.Connection:
    return sqlite3.connect(path, isolation_level=None)


def test_a_new_queue_says_what_it_is(queue, path):
    queue.close()
    header = read_header(path)
    assert (header.application_id, header.user_version) == (APPLICATION_ID, SCHEMA_VERSION)


def test_settings_of_the_connection(queue):
    pragmas = {
        name: queue.execute(f"PRAGMA {name}").fetchone()[0]
        for name in ("journal_mode", "foreign_keys", "recursive_triggers", "synchronous", "busy_timeout")
    }
    assert pragmas.pop("busy_timeout") >= 30_000
    assert pragmas == {"journal_mode": "wal", "foreign_keys": 1, "recursive_triggers": 1, "synchronous": 2}


def test_tables_are_strict(queue):
    query = "SELECT name, strict FROM pragma_table_list WHERE schema = 'main' AND type = 'table'"
    rows = queue.execute(query).fetchall()
    loose = {name for name, strict in rows if not strict and not name.startswith("sqlite_")}
    assert loose == {"_sqlite_migrations"}  # the library's own


def test_opening_an_up_to_date_queue_does_not_import_sqlite_utils(queue, path):
    queue.close()
    code = (
        "import sys; from tui.store.connect import open_queue; from tui.store import views, rulings, candidates; "
        f"open_queue({path!r}).close(); print('sqlite_utils' in sys.modules, 'scipy' in sys.modules)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, cwd=Path.cwd())
    assert done.stdout.split() == ["False", "False"]


def test_a_missing_queue_is_refused_and_not_made(path):
    with pytest.raises(StoreError, match="plainlight load"):
        open_queue(path)
    assert not os.path.exists(path)


@pytest.mark.parametrize("text", [b"name,ra\nSM-1,2\n", b"SQLite format 3\x00", b"\0" * 4096], ids=("csv", "cut", "0"))
def test_what_is_no_queue_is_left_untouched(tmp_path, text):
    path = tmp_path / "not.db"
    path.write_bytes(text)
    before = content(tmp_path)
    for create in (False, True):
        with pytest.raises(StoreError, match="not a Plainlight queue"):
            open_queue(path, create=create)
    assert content(tmp_path) == before


def test_a_foreign_database_is_left_untouched(tmp_path):
    other = plain(str(tmp_path / "other.db"))
    other.execute("CREATE TABLE t (a)")
    other.close()
    before = content(tmp_path)
    with pytest.raises(StoreError, match="not a Plainlight queue"):
        open_queue(tmp_path / "other.db", create=True)
    assert content(tmp_path) == before


def test_a_newer_queue_is_left_untouched(queue, path, tmp_path):
    queue.execute(f"PRAGMA user_version = {SCHEMA_VERSION + 1}")
    queue.close()
    before = content(tmp_path)
    with pytest.raises(StoreError, match="newer"):
        open_queue(path)
    assert content(tmp_path) == before


def older_queue(path: str, version: int) -> None:
    """A queue as an earlier program left it, with a candidate in it."""
    connection = plain(path)
    connection.execute("BEGIN IMMEDIATE")
    migrate(connection, version)
    connection.execute("INSERT INTO candidate (name) VALUES ('SM-0001')")
    connection.execute("COMMIT")
    connection.execute("PRAGMA journal_mode = WAL")
    connection.close()


@pytest.mark.parametrize("version", range(1, SCHEMA_VERSION))
def test_an_older_queue_is_copied_then_brought_up_to_date(path, version):
    older_queue(path, version)
    connection = open_queue(path)
    assert candidate_names(connection) == ["SM-0001"]
    applied = connection.execute("SELECT name FROM _sqlite_migrations ORDER BY id").fetchall()
    assert [name for (name,) in applied] == [name for name, _ in MIGRATIONS]
    connection.close()
    assert read_header(path).user_version == SCHEMA_VERSION
    copy = plain(f"{path}.v{version}.bak")
    assert copy.execute("PRAGMA user_version").fetchone()[0] == version
    assert copy.execute("SELECT name FROM candidate").fetchall() == [("SM-0001",)]
    assert copy.execute("PRAGMA integrity_check").fetchone()[0] == "ok"
    copy.close()


def test_a_second_copy_does_not_replace_the_first(path, tmp_path):
    older_queue(path, 1)
    (tmp_path / "queue.db.v1.bak").write_bytes(b"kept")
    open_queue(path).close()
    assert (tmp_path / "queue.db.v1.bak").read_bytes() == b"kept"
    assert (tmp_path / "queue.db.v1.2.bak").exists()


def test_a_failing_migration_leaves_the_older_queue(path, monkeypatch):
    older_queue(path, 2)
    monkeypatch.setattr("tui.store.schema.MIGRATIONS", (*MIGRATIONS[:2], ("m3_derived", ("CREATE TABLE broken (",))))
    with pytest.raises(StoreError):
        open_queue(path)
    assert read_header(path).user_version == 2
    connection = plain(path)
    assert connection.execute("SELECT COUNT(*) FROM candidate").fetchone() == (1,)
    connection.close()


def test_an_up_to_date_queue_is_not_copied(queue, path, tmp_path):
    queue.close()
    open_queue(path).close()
    assert [entry.name for entry in tmp_path.iterdir()] == ["queue.db"]


def test_writing_on_a_network_filesystem_names_gather(queue, path, monkeypatch):
    monkeypatch.setattr(connect, "network_type", lambda path: "nfs4")
    with pytest.raises(StoreError, match=r"nfs4.*gather"):
        open_queue(path)
    reader = open_queue(path, write=False)
    assert candidate_count(reader) == 0
    reader.close()


def test_a_reader_cannot_write(filled, path):
    reader = open_queue(path, write=False)
    assert candidate_count(reader) == 12
    with pytest.raises(StoreError):
        add_reviewer(reader, "heron", utc())
    reader.close()


def test_a_queue_in_a_folder_that_cannot_be_written_can_be_read(queue, path, tmp_path, monkeypatch):
    fill(queue, ["SM-0001"])
    queue.close()
    monkeypatch.setattr(os, "access", lambda path, mode: mode != os.W_OK)
    before = content(tmp_path)
    reader = open_queue(path, write=False)
    assert candidate_names(reader) == ["SM-0001"]
    reader.close()
    assert content(tmp_path) == before


def test_a_damaged_queue_is_said_plainly(queue, path):
    fill(queue, [f"SM-{number}" for number in range(200)])
    queue.close()
    with open(path, "r+b") as file:
        file.seek(4096)
        file.write(b"\xff" * 40_000)
    with pytest.raises(StoreError, match="damaged"):
        connection = open_queue(path)
        candidate_names(connection)


def test_a_full_disk_writes_nothing_and_says_so(filled, team, path):
    pages = filled.execute("PRAGMA page_count").fetchone()[0]
    filled.execute(f"PRAGMA max_page_count = {pages}")
    with pytest.raises(StoreError, match="full"):
        for number in range(1000):
            rule(filled, team[0], "SM-0001", "star", second=number, note="n" * 4000)
    assert not filled.in_transaction
    filled.execute(f"PRAGMA max_page_count = {pages * 10}")
    assert filled.execute("PRAGMA integrity_check").fetchone()[0] == "ok"
    rule(filled, team[0], "SM-0002", "star")


def test_a_failing_block_is_rolled_back(queue):
    with pytest.raises(RuntimeError), immediate(queue):
        queue.execute("INSERT INTO candidate (name) VALUES ('SM-1')")
        raise RuntimeError
    assert candidate_count(queue) == 0


def test_data_version_tells_of_others_writes(queue, path):
    other = open_queue(path)
    before = data_version(queue)
    assert data_version(queue) == before
    add_reviewer(other, "heron", utc())
    assert data_version(queue) != before
    other.close()


def test_processes_that_make_one_queue_at_once(path):
    code = f"from tui.store.connect import open_queue; open_queue({path!r}, create=True).close()"
    running = [subprocess.Popen([sys.executable, "-c", code], stderr=subprocess.PIPE) for _ in range(6)]
    assert [(process.communicate()[1], process.returncode) for process in running] == [(b"", 0)] * 6
    assert not os.path.exists(path + ".v1.bak")


CLOSER = "from tui.store.connect import open_queue; import sys; open_queue(sys.argv[1]).close()"


def test_opening_a_queue_again_does_not_drop_the_locks_of_the_first_connection(filled, path):
    """Else the other process, taking itself for the last, clears away the log that is still written here."""
    heron = reviewer_by_handle(filled, "heron")
    rule(filled, heron, "SM-0001", "star")
    open_queue(path).close()
    subprocess.run([sys.executable, "-c", CLOSER, path], check=True, cwd=Path.cwd())
    assert os.path.exists(path + "-wal")
    rule(filled, heron, "SM-0002", "star")
    other = plain(path)
    assert other.execute("SELECT COUNT(*) FROM ruling").fetchone() == (2,)
    other.close()


def test_a_queue_that_became_newer_while_it_is_open_is_refused(queue, path):
    queue.execute(f"PRAGMA user_version = {SCHEMA_VERSION + 1}")
    with pytest.raises(StoreError, match="newer"):
        open_queue(path)
