"""Look-alikes among 100,000 candidates: one candidate, shared patterns, and a queue on disk. Run by hand."""

from __future__ import annotations

import resource
import tempfile
import time
from contextlib import closing
from pathlib import Path

import numpy as np

from tui.checks.lookalikes import look_alikes, ready, shared_patterns, sky_vectors
from tui.data.load import bands
from tui.model import Candidate, Evidence, Fit, Measurement
from tui.store.candidates import save_candidates
from tui.store.connect import open_queue
from tui.store.evidence import save_evidence
from tui.store.records import LoadRecord
from tui.workflow.lookalikes import LookAlikeFinder

BANDS = ("Gaia_BP", "Gaia_G", "Gaia_RP", "SDSS_g", "SDSS_r", "SDSS_i", "SDSS_z", "J", "H", "Ks", "W1", "W2", "W3", "W4")
RUN = 5000


def fill(path: Path, pulls: np.ndarray, rng: np.random.Generator) -> None:
    """A queue on disk with these pulls, a magnitude in two bands and a place for each candidate."""
    with closing(open_queue(str(path), create=True)) as connection:
        connection.execute("PRAGMA synchronous = OFF")
        for first in range(0, len(pulls), RUN):
            rows, evidence = [], []
            for place in range(first, min(first + RUN, len(pulls))):
                name, flux = f"S-{place:06d}", float(10 ** rng.uniform(-3, 0))
                facts = {"ra": float(rng.uniform(0, 360)), "dec": float(rng.uniform(-60, 60))}
                measured = tuple(Measurement(band, flux, 0.02 * flux, source="s") for band in ("J", "W4"))
                rows.append(LoadRecord(Candidate(name, measured, facts), "s"))
                own = {b: round(float(x), 9) for b, x in zip(BANDS, pulls[place], strict=True) if np.isfinite(x)}
                fit = Fit("star", 1.0, 9, 0.5, 1.0, 1.0, {}, own)
                evidence.append((name, Evidence("star", 1, False, (fit,), (), {}, f"d-{name}", tuple(own))))
            save_candidates(connection, rows, f"2026-01-01T00:00:{first // RUN:02d}.000000Z")
            save_evidence(connection, evidence)


def on_disk(pulls: np.ndarray) -> None:
    """The first look at a queue on disk, and the second."""
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "q.db"
        fill(path, pulls, np.random.default_rng(4))
        finder = LookAlikeFinder()
        with closing(open_queue(str(path), write=False)) as connection:
            own = {band: float(x) for band, x in zip(BANDS, pulls[3], strict=True) if np.isfinite(x)}
            star = Evidence("star", 1, False, (Fit("star", 1.0, 9, 0.5, 1.0, 1.0, {}, own),), (), {}, "d")
            for look in ("first look", "second look"):
                wall, used = time.perf_counter(), time.process_time()
                found = finder.find(connection, (0,), (4, "S-000003"), star, bands())
                wall, used = time.perf_counter() - wall, time.process_time() - used
                print(f"{look:<16} {wall:6.2f} s   {used:.2f} s of processor time, {found.count} look-alikes")


def main() -> None:
    """Print one line for each of the two."""
    rng = np.random.default_rng(1)
    count = 100_000
    pulls = 2.0 * rng.normal(size=(count, 14))
    pulls[rng.random(pulls.shape) < 0.2] = np.nan
    pulls[:500] += 10.0 * np.array([0.0] * 10 + [1.0, 2.0, 3.0, 4.0])
    quantities = {
        "magnitude": rng.uniform(8, 16, count),
        "place": sky_vectors(rng.uniform(0, 360, count), np.degrees(np.arcsin(rng.uniform(-1, 1, count)))),
    }
    started = time.perf_counter()
    queue = ready(pulls)
    found = look_alikes(3, queue, np.random.default_rng(2), quantities)
    print(f"one candidate    {time.perf_counter() - started:6.2f} s   {found.rows.size} look-alikes, p {found.p}")
    started = time.perf_counter()
    patterns = shared_patterns(queue, np.random.default_rng(3))
    sizes = [(pattern.rows.size, round(pattern.expected)) for pattern in patterns]
    print(f"shared patterns  {time.perf_counter() - started:6.2f} s   members and chance: {sizes}")
    on_disk(pulls)
    print(f"peak memory      {resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024:6.0f} MB")


if __name__ == "__main__":
    main()
