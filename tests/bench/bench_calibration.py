"""Are p-values uniform and do intervals cover what they say? By simulation; run by hand:

    python tests/bench/bench_calibration.py [candidates per line]

Truth is drawn from the fits' own models, noise from their own errors: with independent floors, with errors that the
bands of an instrument share, and with limits. Away from bounds a 68 % interval should cover 63 to 73 %, at a bound a
one-sided 95 % limit 95 to 100 %. The last line is a warning: between temperature and screen of hot stars without
ultraviolet bands chi-square has several minima, and there neither the profile nor its interval is regular.
"""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parent))
from random_stars import FOURTEEN, TWENTY, random_problem  # noqa: E402

from tui.model import Settings  # noqa: E402
from tui.physics import composite as c  # noqa: E402
from tui.physics.fitting import fit  # noqa: E402
from tui.physics.profile import intervals  # noqa: E402
from tui.physics.statistics import chi2_tail  # noqa: E402
from tui.workflow.templates import templates_for  # noqa: E402

TITLES = {c.LN_T: "T_eff", c.LN_S: "theta", c.AV: "A_V", c.X2: "T_2", c.A2: "amount"}
LINES = (
    ("star", c.STAR, FOURTEEN, 0.0, 0.0),
    ("star, shared errors 2 %", c.STAR, FOURTEEN, 0.02, 0.0),
    ("star, limits", c.STAR, FOURTEEN, 0.0, 0.3),
    ("dust", c.DUST, FOURTEEN, 0.0, 0.0),
    ("dust, shared errors 2 %", c.DUST, FOURTEEN, 0.02, 0.0),
    ("dust, limits", c.DUST, FOURTEEN, 0.0, 0.3),
    ("star + A_V, with u and B", c.STAR_AV, TWENTY, 0.0, 0.0),
    ("dust + A_V, 14 bands", c.DUST_AV, FOURTEEN, 0.0, 0.0),
)


def covered(batch, truth):
    """Column -> (coverage of two-sided intervals, their number, coverage of one-sided limits, their number)."""
    ends = intervals(batch)
    found = {}
    for column in batch.model.free:
        inside = (ends.low[:, column] <= truth[:, column]) & (truth[:, column] <= ends.high[:, column])
        limit = ends.limit[:, column]
        found[column] = (share(inside[~limit]), (~limit).sum(), share(inside[limit]), limit.sum())
    return found


def share(inside):
    """Share of true values; NaN of none."""
    return inside.mean() if inside.size else np.nan


def main(count: int) -> None:
    """Print one line a simulation."""
    grids = templates_for(Settings())
    print(f"{count} candidates a line; coverage of 68 % intervals (of 95 % limits at bounds)")
    for seed, (title, model, names, common, limits) in enumerate(LINES):
        problem, truth, _ = random_problem(grids, names, count, seed, natures=(model,), limits=limits, common=common)
        batch = fit(problem, model)
        free = (~batch.at_bounds()).sum(axis=1)
        plain = ~problem.limited.any(axis=1)  # with limits p is a bound, not uniform
        p = chi2_tail(batch.chi2, problem.points - free)[plain]
        parts = []
        for column, (two, n, one, k) in covered(batch, truth).items():
            tail = f" ({one:.2f} of {k})" if k >= 20 else ""
            parts.append(f"{TITLES[column]} {two:.2f}{tail}" if n else f"{TITLES[column]} -{tail}")
        tails = f"p<0.1 {np.mean(p < 0.1):.3f}  p<0.01 {np.mean(p < 0.01):.4f}  mean p {p.mean():.3f}"
        print(f"{title:28s} {tails}   " + "  ".join(parts), flush=True)


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 1000)
