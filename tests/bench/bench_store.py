"""What the store costs: python tests/bench/bench_store.py [rulings] [long]; prints tables, writes to temporary folders.

`rulings`: eight reviewers, each a process, 2,000 rulings each on one file, with a person's pause shrunk
to 20 ms and without any pause; `long`: a queue of a million rows.
"""

from __future__ import annotations

import os
import random
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path
from subprocess import PIPE

sys.path.insert(0, str(Path(__file__).parents[2]))

from tui.model import CHECKS, Candidate, Evidence, Fit, Measurement, Ruling
from tui.store import deriving, views
from tui.store.candidates import candidate_name, save_candidates
from tui.store.chains import chain_faults
from tui.store.connect import immediate, open_queue
from tui.store.evidence import save_evidence
from tui.store.names import folded, ring
from tui.store.records import SORTS, Filter, LoadRecord
from tui.store.reviewers import add_reviewer
from tui.store.rulings import append_ruling, ruling_log

REVIEWERS, EACH, CANDIDATES = 8, 2000, 400
ROWS = 1_000_000
UTC = "2026-03-01T00:00:00.000000Z"


def make_small(path: str) -> list[str]:
    """A queue with evidence and eight reviewers; their ids."""
    connection = open_queue(path, create=True)
    names = [f"SM-{number:04d}" for number in range(CANDIDATES)]
    measured = (Measurement("J", 1.0, 0.02, source="2MASS"),)
    save_candidates(connection, [LoadRecord(Candidate(name, measured)) for name in names], UTC)
    fit = Fit("star", 70.0, 2, 1e-16, 74.0, 75.0, {}, {"J": 0.5, "W3": 8.0})
    rows = [(name, Evidence(kind, 1, False, (fit,), digest=f"{kind}1")) for name in names for kind in CHECKS]
    save_evidence(connection, rows)
    ids = [add_reviewer(connection, f"reviewer{number}", UTC).id for number in range(REVIEWERS)]
    connection.close()
    return ids


def rule_many(path: str, reviewer_id: str, pause_ms: float) -> None:
    """One reviewer's process: rules, and prints how long each took, in ms."""
    connection = open_queue(path)
    choice = random.Random(reviewer_id)
    took = []
    for number in range(EACH):
        name, check = f"SM-{number // 5 % CANDIDATES:04d}", CHECKS[number % 5]
        word = choice.choice(("explains", "short", "short", "unclear"))
        start = time.perf_counter()
        append_ruling(connection, Ruling(name, check, reviewer_id, word, note="a note", utc=UTC))
        took.append(1e3 * (time.perf_counter() - start))
        time.sleep(choice.expovariate(1) * pause_ms / 1e3)
    print(" ".join(f"{one:.3f}" for one in took))


def bench_rulings() -> None:
    """Eight at once."""
    for pause_ms in (20.0, 0.0):
        with tempfile.TemporaryDirectory() as folder:
            path = os.path.join(folder, "queue.db")
            ids = make_small(path)
            start = time.perf_counter()
            command = [sys.executable, __file__, "--rule", path]
            running = [
                subprocess.Popen([*command, one, str(pause_ms)], stdout=PIPE, stderr=PIPE, text=True) for one in ids
            ]
            done = [process.communicate() for process in running]
            seconds = time.perf_counter() - start
            took = sorted(float(one) for out, _ in done for one in out.split())
            errors = "".join(errors for _, errors in done)
            connection = open_queue(path)
            kept = sum(1 for _ in ruling_log(connection))
            print(
                f"pause {pause_ms:4.0f} ms: {len(took)} acknowledged, {kept} kept, "
                f"{len(chain_faults(connection))} chain faults, {'errors: ' + errors if errors else 'no error'}; "
                f"{len(took) / seconds:.0f} a second; median {statistics.median(took):.1f}, "
                f"p99 {took[int(0.99 * len(took))]:.1f}, longest {took[-1]:.0f} ms"
            )
            connection.close()


def make_long(path: str) -> str:
    """A million rows without measurements, ten thousand rulings of one reviewer; the reviewer's id."""
    connection = open_queue(path, create=True)
    choice = random.Random(1)
    reason = deriving.untouched(0).pending_reason
    names = [f"Gaia DR3 {choice.getrandbits(50)}-{number}" for number in range(1, ROWS + 1)]
    with immediate(connection):
        connection.executemany("INSERT INTO candidate (id, name) VALUES (?, ?)", enumerate(names, 1))
        connection.executemany(
            "INSERT INTO queue_row (id, name, fold, ring, oddness, odd_band, odd_pull, pending_reason) "
            "VALUES (?, ?, ?, ?, ?, 'W3', ?, ?)",
            (
                (number, name, folded(name), ring(name), choice.expovariate(1), choice.gauss(0, 3), reason)
                for number, name in enumerate(names, 1)
            ),
        )
    heron = add_reviewer(connection, "heron", UTC)
    for number in range(1, ROWS, ROWS // 2000):
        for check in CHECKS:
            append_ruling(connection, Ruling(candidate_name(connection, number), check, heron.id, "short", utc=UTC))
    connection.close()
    return heron.id


def timed(what: str, run: Callable[[], object]) -> object:
    """Print the median of five runs."""
    took = []
    for _ in range(5):
        start = time.perf_counter()
        found = run()
        took.append(1e3 * (time.perf_counter() - start))
    print(f"{what:24s} {statistics.median(took):8.1f} ms")
    return found


def bench_long() -> None:
    """Orders, filters, searches and pages of a million rows."""
    with tempfile.TemporaryDirectory() as folder:
        path = os.path.join(folder, "long.db")
        heron = make_long(path)
        print(f"{ROWS} rows, {os.path.getsize(path) / 1e6:.0f} MB")
        connection = open_queue(path)
        for sort in SORTS:
            timed(f"sort {sort}", lambda sort=sort: views.view_order(connection, heron, sort=sort))
        for name, where in {
            "unresolved": Filter(unresolved="dust"),
            "needs me": Filter(needs_me=True),
            "mine": Filter(mine=True),
            "text": Filter(text="123"),
        }.items():
            timed(f"filter {name}", lambda where=where: views.view_order(connection, heron, where=where))
        ids = views.view_order(connection, heron)
        timed("first 64 ids", lambda: views.view_order(connection, heron, limit=64))
        timed("64 rows", lambda: views.view_rows(connection, heron, ids[500_000:500_064]))
        timed("prefix, 10,000 found", lambda: views.find_prefix(connection, "gaia dr3 12"))
        timed("prefix, first 1,000", lambda: views.find_prefix(connection, "gaia", 1000))
        timed("substring", lambda: views.find_substring(connection, "123"))
        timed("counts", lambda: views.view_counts(connection, heron))
        timed("next", lambda: views.next_for(connection, heron, UTC))
        connection.close()


def main() -> None:
    """Run what was asked for, or all."""
    if sys.argv[1:2] == ["--rule"]:
        rule_many(sys.argv[2], sys.argv[3], float(sys.argv[4]))
        return
    asked = sys.argv[1:] or ["rulings", "long"]
    for name, bench in {"rulings": bench_rulings, "long": bench_long}.items():
        if name in asked:
            bench()


if __name__ == "__main__":
    main()
