"""General optimisers of scipy on the fits' own models and data, errors frozen as the last pass left them."""

from __future__ import annotations

import numpy as np
from scipy.optimize import differential_evolution, least_squares

from tui.physics import composite as c
from tui.physics.composite import predict
from tui.physics.likelihood import residuals

RAW_LN_S = -45.0


def random_starts(rng, problem, kit, count):
    """Rows (count, M, 8) spread over all of a model's range, scale set to the data's middle."""
    low, high = kit.bounds(problem.av_max)
    m = len(problem)
    out = np.zeros((count, m, c.WIDTH))
    for start in out:
        start[:] = rng.uniform(low, high)
        start[:, c.AV] = rng.uniform(0, 1, m) ** 2 * high[:, c.AV]
        start[:, c.RV] = rng.uniform(2.4, 5.5, m) if c.RV in kit.model.free else 3.1
        start[:, c.A2] = 10.0 ** rng.uniform(-5, 0.5, m)
        start[:, c.A3] = 10.0 ** rng.uniform(-5, 0.5, m)
        start[:, c.LN_S] = RAW_LN_S
        ratio = np.where(problem.flux_jy > 0, problem.flux_jy, np.nan) / predict(kit, start).flux
        start[:, c.LN_S] += np.log(np.nanmedian(ratio, axis=1))
    return out


class OneCandidate:
    """Residuals of one candidate as scipy's optimisers want them: a vector of the free parameters in, a vector out."""

    def __init__(self, batch, row):
        self.kit, self.free = batch.kit, list(batch.model.free)
        self.problem, self.errors = batch.problem.take(np.array([row])), batch.errors.take(np.array([row]))
        low, high = self.kit.bounds(self.problem.av_max)
        self.low, self.high = low[0, self.free], high[0, self.free]
        self.base = batch.x[row].copy()

    def state(self, free_values):
        x = self.base.copy()[None]
        x[0, self.free] = free_values
        return residuals(self.problem, self.kit, self.errors, x, predict(self.kit, x))

    def value(self, free_values):
        return self.state(free_values).value[0]

    def jacobian(self, free_values):
        return self.state(free_values).slopes[0].T

    def cost(self, free_values):
        return float(self.state(free_values).cost[0])

    def least_squares(self, starts):
        """Lowest cost of trust-region fits from rows (S, 8)."""
        best = np.inf
        for start in starts:
            inside = np.clip(start[self.free], self.low + 1e-9, self.high - 1e-9)
            found = least_squares(
                self.value, inside, self.jacobian, bounds=(self.low, self.high), x_scale="jac", max_nfev=200
            )
            best = min(best, 2 * found.cost)
        return best

    def differential_evolution(self, seed, **options):
        """Lowest cost that differential evolution finds; amplitudes and scale on logarithms."""
        logs = [place for place, column in enumerate(self.free) if column in (c.A2, c.A3)]
        low, high = self.low.copy(), self.high.copy()
        scale = self.free.index(c.LN_S)
        low[scale], high[scale] = self.base[c.LN_S] - 12, self.base[c.LN_S] + 12
        low[logs], high[logs] = np.log(1e-7), np.log(np.minimum(self.high[logs], 1e3))

        def cost(values):
            values = values.copy()
            values[logs] = np.exp(values[logs])
            return self.cost(values)

        found = differential_evolution(cost, list(zip(low, high, strict=True)), rng=seed, polish=False, **options)
        values = found.x.copy()
        values[logs] = np.exp(values[logs])
        polished = least_squares(
            self.value, np.clip(values, self.low, self.high), self.jacobian, bounds=(self.low, self.high), x_scale="jac"
        )
        return min(found.fun, 2 * polished.cost)
