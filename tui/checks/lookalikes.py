"""Look-alikes: candidates of the queue whose pulls share a pattern, against what chance alone would give.

A shared pattern points to calibration only where magnitude, epoch or place on the sky is shared too: all discs
seen by W4 share one. This is a fact of the queue: it enters no digest and no `adequate`.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from tui.model import FloatArray

COSINE = 0.9
LEAST_BANDS = 4
PERMUTATIONS = 99
P_SHARED = 0.01
LEAST_MEMBERS = 4  # a pattern of fewer is not spoken of
PRODUCT = 250_000  # multiplications of one matrix product: small enough that no threads are waited for
FIRST_LOOK = 4  # permutations by which patterns are ranked; those kept get all of them
Rows = NDArray[np.intp]


@dataclass(frozen=True, slots=True, eq=False)
class Pulls:
    """Pulls of a queue, ready to be compared: shape (N, B) each, 0 where a band is missing."""

    value: NDArray[np.float32]
    present: NDArray[np.float32]  # 1 where there is a pull, else 0
    square: NDArray[np.float32]

    def __len__(self) -> int:
        return self.value.shape[0]


@dataclass(frozen=True, slots=True, eq=False)
class Alike:
    """Look-alikes of one candidate."""

    rows: Rows  # most alike first, the candidate itself left out
    cosine: FloatArray  # of the same length
    expected: float  # number that chance gives: mean over permutations within bands
    p: float  # share of permutations (and the data themselves) with as many or more
    shared: Mapping[str, float]  # quantity -> p that look-alikes lie so close together in it by chance

    @property
    def points_to_calibration(self) -> bool:
        """Whether the pattern is no chance and something besides the pattern is shared."""
        return self.p <= P_SHARED and any(p <= P_SHARED for p in self.shared.values())


def pulls_table(pulls: Sequence[Mapping[str, float]], bands: Sequence[str]) -> FloatArray:
    """Pulls (N, B) of many candidates in a fixed order of bands, NaN where missing."""
    place = {band: column for column, band in enumerate(bands)}
    table = np.full((len(pulls), len(bands)), np.nan)
    for row, found in enumerate(pulls):
        for band, pull in found.items():
            if band in place:
                table[row, place[band]] = pull
    return table


def ready(pulls: FloatArray) -> Pulls:
    """A table of pulls (N, B), NaN where missing, made ready; not finite counts as missing."""
    present = np.isfinite(pulls)
    value = np.where(present, pulls, 0.0).astype(np.float32)
    return Pulls(value, present.astype(np.float32), np.square(value))


def cosines(target: FloatArray, queue: Pulls) -> FloatArray:
    """Cosine between one candidate's pulls (B,) and each candidate's, over the bands both have.

    Returns:
        shape (N,); NaN where fewer than four bands are shared or one of the two is all zero there.
    """
    one = ready(target[None, :])
    shared = queue.present @ one.present[0]
    norm = np.sqrt((queue.square @ one.present[0]) * (queue.present @ one.square[0]))
    product = queue.value @ one.value[0]
    usable = (shared >= LEAST_BANDS) & (norm > 0)
    return np.where(usable, product / np.where(usable, norm, 1.0), np.nan).astype(np.float64)


def holders(queue: Pulls) -> list[tuple[Rows, NDArray[np.float32]]]:
    """For each band the rows that have it and their pulls: what a permutation deals anew."""
    rows = [np.flatnonzero(present) for present in queue.present.T]
    return [(found, queue.value[found, column]) for column, found in enumerate(rows)]


def shuffled(queue: Pulls, rng: np.random.Generator, held: Sequence[tuple[Rows, NDArray[np.float32]]] = ()) -> Pulls:
    """The same pulls dealt anew within each band, among the candidates that have it.

    Args:
        held: `holders` of the queue, for whoever deals many times.
    """
    value = np.zeros_like(queue.value)
    for column, (rows, pulls) in enumerate(held or holders(queue)):
        value[rows, column] = rng.permutation(pulls)
    return Pulls(value, queue.present, np.square(value))


def look_alikes(
    row: int,
    queue: Pulls,
    rng: np.random.Generator,
    quantities: Mapping[str, FloatArray] | None = None,
    permutations: int = PERMUTATIONS,
) -> Alike:
    """Look-alikes of one candidate, with what chance would give.

    Args:
        row: the candidate's row in the queue.
        quantities: name -> shape (N,) or (N, D): magnitude, epoch, unit vector on the sky (see `sky_vectors`);
            rows with NaN are left out of that comparison.
    """
    target = np.where(queue.present[row] > 0, queue.value[row], np.nan).astype(float)
    cosine = cosines(target, queue)
    cosine[row] = np.nan
    found = np.flatnonzero(cosine >= COSINE)
    order = found[np.argsort(-cosine[found], kind="stable")]
    counts = chance_counts(target, queue, rng, permutations)
    p = tail(counts, found.size, permutations)
    alike = Alike(order, cosine[order], float(counts.mean()) if counts.size else 0.0, p, {})
    return with_shared(alike, row, rng, quantities or {}, permutations)


def with_shared(
    alike: Alike,
    row: int,
    rng: np.random.Generator,
    quantities: Mapping[str, FloatArray],
    permutations: int = PERMUTATIONS,
) -> Alike:
    """The same look-alikes with what else they share; quantities as in `look_alikes`.

    They may be known (not NaN) of the look-alikes and a random sample of the queue only.
    """
    rows = np.append(alike.rows, row)
    shared = {
        name: closeness_p(rows, np.asarray(values, dtype=float), rng, permutations)
        for name, values in quantities.items()
    }
    return replace(alike, shared=shared)


def chance_counts(
    target: FloatArray, queue: Pulls, rng: np.random.Generator, permutations: int, sample: int = 10_000
) -> FloatArray:
    """Look-alikes that permuted queues hold, one number a permutation; a large queue is sampled and scaled up."""
    part, scale = queue, 1.0
    if len(queue) > sample:
        part = take(queue, rng.choice(len(queue), sample, replace=False))
        scale = len(queue) / sample
    held = holders(part)
    return np.array(
        [scale * np.sum(cosines(target, shuffled(part, rng, held)) >= COSINE) for _ in range(permutations)], dtype=float
    )


def closeness_p(rows: Rows, values: FloatArray, rng: np.random.Generator, permutations: int) -> float:
    """p that these rows lie so close together in a quantity by chance: against random rows of the same number.

    Closeness is the summed squared distance from the mean; NaN where fewer than three rows have the quantity.
    """
    values = values if values.ndim == 2 else values[:, None]
    known = np.flatnonzero(np.isfinite(values).all(axis=1))
    rows = rows[np.isin(rows, known)]
    if rows.size < 3:
        return float("nan")
    own = scatter(values[rows])
    drawn = [scatter(values[rng.choice(known, rows.size, replace=False)]) for _ in range(permutations)]
    return (1 + int(np.sum(np.array(drawn) <= own))) / (1 + permutations)


def scatter(values: FloatArray) -> float:
    """Mean squared distance from the mean, shape (K, D)."""
    return float(np.mean(np.sum((values - values.mean(axis=0)) ** 2, axis=1)))


def sky_vectors(ra_deg: FloatArray, dec_deg: FloatArray) -> FloatArray:
    """Unit vectors (N, 3), so that closeness on the sky knows no seam at 0h."""
    ra, dec = np.radians(ra_deg), np.radians(dec_deg)
    return np.stack([np.cos(dec) * np.cos(ra), np.cos(dec) * np.sin(ra), np.sin(dec)], axis=-1)


@dataclass(frozen=True, slots=True, eq=False)
class Pattern:
    """A pattern that many candidates of the queue share."""

    centre: int  # row of the candidate it was found from
    rows: Rows
    expected: float
    p: float


def shared_patterns(
    queue: Pulls,
    rng: np.random.Generator,
    most: int = 8,
    tried: int = 256,
    permutations: int = PERMUTATIONS,
    sample: int = 5000,
) -> list[Pattern]:
    """The patterns of the queue that stand out most against chance; each row is in one of them only.

    They are looked for from `tried` random candidates: a pattern that one candidate in a hundred shares is missed
    with a chance below 0.08.

    Args:
        sample: rows that are permuted to find what chance gives; the numbers are scaled to the queue.
    """
    centres = rng.choice(len(queue), min(tried, len(queue)), replace=False)
    part = take(queue, rng.choice(len(queue), min(sample, len(queue)), replace=False))
    expected = permuted_counts(take(queue, centres), part, rng, FIRST_LOOK).mean(axis=0) * len(queue) / len(part)
    alike, free, chosen = alike_many(take(queue, centres), queue), np.ones(len(queue), dtype=bool), []
    for _ in range(most):
        counts = (alike & free).sum(axis=1)
        best = int(((counts - expected) / np.sqrt(expected + 1.0)).argmax())
        if counts[best] < LEAST_MEMBERS or counts[best] <= expected[best]:
            break
        chosen.append((best, np.flatnonzero(alike[best] & free)))
        free &= ~alike[best]
    kept = take(queue, centres[[best for best, _ in chosen]])
    chance = permuted_counts(kept, part, rng, permutations) * len(queue) / len(part)
    patterns = [
        Pattern(int(centres[best]), rows, float(by_chance.mean()), tail(by_chance, rows.size, permutations))
        for (best, rows), by_chance in zip(chosen, chance.T, strict=True)
    ]
    return [pattern for pattern in patterns if pattern.p <= P_SHARED]


def tail(counts: FloatArray, seen: int, permutations: int) -> float:
    """Share of permutations, the data among them, with as many or more."""
    return (1 + int(np.sum(counts >= seen))) / (1 + permutations)


def permuted_counts(targets: Pulls, queue: Pulls, rng: np.random.Generator, permutations: int) -> FloatArray:
    """Look-alikes of each target in permuted queues, shape (permutations, C)."""
    held = holders(queue)
    drawn = (alike_many(targets, shuffled(queue, rng, held)) for _ in range(permutations))
    return np.array([alike.sum(axis=1) for alike in drawn], dtype=float)


def take(queue: Pulls, rows: Rows) -> Pulls:
    """Some candidates of a queue."""
    return Pulls(queue.value[rows], queue.present[rows], queue.square[rows])


def alike_many(targets: Pulls, queue: Pulls) -> NDArray[np.bool_]:
    """Which candidates look like each of some targets, shape (C, N)."""
    out = np.empty((len(targets), len(queue)), dtype=bool)
    least = np.float32(COSINE**2)
    size = max(1, PRODUCT // max(1, targets.value.size))
    for first in range(0, len(queue), size):
        part = slice(first, first + size)
        norm2 = targets.square @ queue.present[part].T
        norm2 *= targets.present @ queue.square[part].T
        norm2 *= least
        product = targets.value @ queue.value[part].T
        alike = product > 0
        alike &= np.square(product, out=product) >= norm2
        alike &= targets.present @ queue.present[part].T >= LEAST_BANDS
        out[:, part] = alike
    return out


def sentence(found: Alike) -> str:
    """What the look-alikes of one candidate mean."""
    if not found.rows.size:
        return "No candidate of the queue looks like this one."
    one = found.rows.size == 1
    who = "One candidate shares" if one else f"{found.rows.size} candidates share"
    start = f"{who} this pattern of pulls, chance alone gives {found.expected:.3g}"
    near = [name for name, p in found.shared.items() if p <= P_SHARED]
    if found.p > P_SHARED:
        return f"{start}: no more than chance."
    if not near:
        lacking = listed(list(found.shared), "nor") if found.shared else "magnitude, epoch nor place"
        return f"{start}. They share neither {lacking}: a class of stars does that as well."
    return f"{start}. They share {listed(near, 'and')} too, as a fault of calibration would."


def listed(words: Sequence[str], last: str) -> str:
    """Words in a row.

    >>> listed(["magnitude", "epoch", "place"], "nor")
    'magnitude, epoch nor place'
    """
    return f" {last} ".join(filter(None, (", ".join(words[:-1]), words[-1])))
