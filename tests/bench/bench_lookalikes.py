"""Look-alikes of one candidate and shared patterns among 100,000: time and memory. Run by hand."""

from __future__ import annotations

import resource
import time

import numpy as np

from tui.checks.lookalikes import look_alikes, ready, shared_patterns, sky_vectors


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
    print(f"peak memory      {resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024:6.0f} MB")


if __name__ == "__main__":
    main()
