"""What evidence costs and whether general optimisers do better; run by hand, prints one table:

    python tests/bench/bench_fits.py [--large] [--compare N]

Evidence of all kinds for 10, 14 and 20 bands on two processes with peak memory of both (1,000 candidates; with --large
10,000 and, for 14 bands, 100,000 too); "of CPU" is what it would be where no other work shares the machine. One
candidate on demand; building and loading the grids; each model for N candidates against scipy's least_squares from 8
starts and differential_evolution on the same models, data and frozen errors.
"""

from __future__ import annotations

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
os.environ.setdefault("OMP_NUM_THREADS", "1")

import argparse  # noqa: E402
import multiprocessing  # noqa: E402
import resource  # noqa: E402
import sys  # noqa: E402
import tempfile  # noqa: E402
import time  # noqa: E402
from pathlib import Path  # noqa: E402

import numpy as np  # noqa: E402

sys.path.insert(0, str(Path(__file__).parent))
from descents import descend  # noqa: E402
from optimisers import OneCandidate, random_starts  # noqa: E402
from random_stars import FOURTEEN, TEN, TWENTY, random_problem  # noqa: E402

from tui.checks import assess_all, probe  # noqa: E402
from tui.checks.tables import build_tables  # noqa: E402
from tui.data import load_flags  # noqa: E402
from tui.model import KINDS, Candidate, Measurement, Settings  # noqa: E402
from tui.physics import composite as c  # noqa: E402
from tui.physics.fitting import fit  # noqa: E402
from tui.workflow.memory import keep_freed_memory  # noqa: E402
from tui.workflow.templates import build, templates_for  # noqa: E402

CHUNK = 1000  # candidates that a process assesses at once, nearly as the program does; fewer where there are few
PROCESSES = 2
LOWER = 0.1
MODELS = (c.STAR, c.STAR_AV, c.STAR_AV_RV, c.DUST, c.DUST_AV, c.TWO_DUST, c.BOUND_PAIR, c.FREE_PAIR, c.COMPACT,
    c.GALAXY)
ROW = "{:<42}{:>12}{:>16}{:>16}{:>16}"


def tables():
    """The packaged tables about data quality and surroundings."""
    return build_tables(
        load_flags.flag_rows(), load_flags.gaia_excess_rows(), load_flags.gaia_scatter_rows(),
        load_flags.galaxy_count_rows(), load_flags.natural_class_rows(),
    )  # fmt: skip


def candidates_of(problem, first=0):
    """Candidates that hold a problem's numbers."""
    names = problem.templates.names
    nan = float("nan")
    return [
        Candidate(
            f"R-{first + row}",
            tuple(
                Measurement(
                    name,
                    float(problem.flux_jy[row, column]),
                    nan if problem.limited[row, column] else float(problem.error_jy[row, column]),
                    bool(problem.limited[row, column]),
                )
                for column, name in enumerate(names)
            ),
            {"parallax": float(problem.parallax_mas[row]), "parallax_error": float(problem.parallax_error_mas[row])}
            if np.isfinite(problem.parallax_mas[row])
            else {},
        )
        for row in range(len(problem))
    ]


def work(task):
    """One process's share: assess chunk after chunk, made on the spot; (candidates, seconds, CPU seconds, peak MB)."""
    keep_freed_memory()  # as the program does before it fits
    names, size, seeds = task
    settings = Settings()
    grids, packaged = templates_for(settings), tables()
    assess_all(candidates_of(random_problem(grids, names, 20, 99)[0]), grids, settings, KINDS, packaged)
    spent = busy = 0.0
    for seed in seeds:
        chunk = candidates_of(random_problem(grids, names, size, seed)[0])
        start, start_busy = time.perf_counter(), time.process_time()
        assess_all(chunk, grids, settings, KINDS, packaged)
        spent += time.perf_counter() - start
        busy += time.process_time() - start_busy
    return size * len(seeds), spent, busy, resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024


def evidence(count, names, label):
    """All evidence for `count` candidates on two processes."""
    size = min(CHUNK, count // PROCESSES)
    seeds = np.array_split(np.arange(count // size), PROCESSES)
    with multiprocessing.get_context("spawn").Pool(PROCESSES) as pool:
        shares = pool.map(work, [(names, size, [int(seed) for seed in share]) for share in seeds])
    slowest, busiest = (max(share[place] for share in shares) for place in (1, 2))
    total = sum(share[0] for share in shares)
    memory = sum(peak for *_, peak in shares)
    print(ROW.format(f"all evidence, {label}", total, f"{total / slowest:.0f} /s", f"{memory:.0f} MB peak",
                     f"{total / busiest:.0f} /s of CPU"), flush=True)  # fmt: skip


def on_demand(grids):
    """One candidate at a time, as a reviewer asks for it."""
    packaged, settings = tables(), Settings()
    stars = candidates_of(random_problem(grids, FOURTEEN, 21, 5)[0])
    spent = []
    for star in stars:
        start = time.perf_counter()
        assess_all([star], grids, settings, KINDS, packaged)
        spent.append(time.perf_counter() - start)
    print(ROW.format("on demand, 14 bands, all evidence", 20, f"{1e3 * np.median(spent[1:]):.0f} ms", "median",
                     f"{1e3 * max(spent[1:]):.0f} ms most"))  # fmt: skip
    spent = []
    for star in stars:
        start = time.perf_counter()
        probe(star, "dust", {"dust_temperature": 300.0}, frozenset(), grids, settings)
        spent.append(time.perf_counter() - start)
    print(ROW.format("by hand, dust temperature held", 20, f"{1e3 * np.median(spent[1:]):.1f} ms", "median",
                     f"{1e3 * max(spent[1:]):.1f} ms most"))  # fmt: skip


def grids_cost():
    """Building the grids of every packaged band, and loading them from the cache."""
    for r_v in ("3.1", "free"):
        start = time.perf_counter()
        build(Settings(r_v=r_v), {})
        print(ROW.format(f"grids built, 44 bands, R_V {r_v}", "", f"{time.perf_counter() - start:.2f} s", "", ""))
    code = (
        "import time; from tui.workflow import templates as t; from tui.model import Settings;"
        "import tui.physics.templates;"
        "k = t.cache_key(Settings(), {}); s = time.perf_counter(); assert t.read_cached(k) is not None;"
        "print(f'{1e3 * (time.perf_counter() - s):.0f} ms')"
    )
    import subprocess

    with tempfile.TemporaryDirectory() as folder:
        os.environ["PLAINLIGHT_CACHE"] = folder
        templates_for(Settings())
        loaded = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout.strip()
        del os.environ["PLAINLIGHT_CACHE"]
    print(ROW.format("grids loaded from the cache", "", loaded, "", ""), flush=True)


def compare(grids, count):
    """Each model against general optimisers: time ratio, and how often either ends lower by more than 0.1."""
    print()
    print(ROW.format("model", "ms each", "8 starts: time", "lower by > 0.1", "and evolution"))
    problem, *_ = random_problem(grids, FOURTEEN, count, 77)
    star = fit(problem, c.STAR)
    few, many = min(count, 25), min(count, 6)
    ours = theirs = 0.0
    lower = tried = 0
    for model in MODELS:
        start = time.process_time()
        batch = fit(problem, model, start=None if model is c.STAR else star.x)
        spent = (time.process_time() - start) / count
        starts = random_starts(np.random.default_rng(8), problem, batch.kit, 8)
        start = time.process_time()
        found = np.array([OneCandidate(batch, row).least_squares(starts[:, row]) for row in range(few)])
        outside = (time.process_time() - start) / few
        own = np.min([descend(problem, batch.kit, batch.errors, row).cost for row in starts], axis=0)
        own[:few] = np.minimum(own[:few], found)
        evolved = [
            batch.cost[row] - OneCandidate(batch, row).differential_evolution(row, maxiter=60, popsize=10)
            for row in range(many)
        ]
        share, worse = np.mean(batch.cost - own > LOWER), np.sum(np.array(evolved) > LOWER)
        ours, theirs, lower, tried = ours + spent, theirs + outside, lower + share * count, tried + count
        print(ROW.format(model.name, f"{1e3 * spent:.2f}", f"{outside / spent:.0f} x", f"{100 * share:.2f} %",
                         f"{worse} of {many}"), flush=True)  # fmt: skip
    print(ROW.format(f"all models, {count} candidates of all natures", f"{1e3 * ours:.1f}", f"{theirs / ours:.0f} x",
                     f"{100 * lower / tried:.2f} %", ""))  # fmt: skip


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--large", action="store_true", help="10,000 candidates, and 100,000 of 14 bands")
    parser.add_argument("--compare", type=int, default=200, metavar="N", help="candidates for the optimisers")
    chosen = parser.parse_args()
    keep_freed_memory()
    print(ROW.format("what", "candidates", "", "", ""))
    grids_cost()
    grids = templates_for(Settings())
    on_demand(grids)
    for count in (1000, 10_000) if chosen.large else (1000,):
        for names in (TEN, FOURTEEN, TWENTY):
            evidence(count, names, f"{len(names)} bands")
    if chosen.large:
        evidence(100_000, FOURTEEN, "14 bands")
    compare(build(Settings(r_v="free"), {}), chosen.compare)


if __name__ == "__main__":
    main()
