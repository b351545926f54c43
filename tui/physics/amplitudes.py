"""Non-negative amplitudes of up to three sources from their normal equations, for many rows at once."""

from __future__ import annotations

from itertools import combinations

import numpy as np

from tui.model import FloatArray

UNSEEN = 1e-12  # in sigma squared: a source that no measured band shows
SINGULAR = 1e-6  # two sources whose shapes agree this far are one


def non_negative(normal: FloatArray, right: FloatArray) -> FloatArray:
    """Amplitudes s >= 0 (K, R) that minimise s.N s - 2 s.b, N (K, K, R), b (K, R), K <= 3.

    Of the sets of sources without a negative amplitude the lowest is taken.
    """
    count = right.shape[0]
    if count == 1:
        return _alone(normal[0, 0], right[0])[None]
    if count == 2:
        return _of_two(normal, right)
    best, found = np.zeros(right.shape[1], right.dtype), np.zeros_like(right)
    for size in range(1, count + 1):
        for chosen in combinations(range(count), size):
            value, gain = _solved(normal, right, chosen)
            allowed = (value > 0).all(axis=0) & (gain > best)
            for source in chosen:
                allowed &= normal[source, source] > UNSEEN
            np.copyto(best, gain, where=allowed)
            for place in range(count):
                np.copyto(found[place], value[chosen.index(place)] if place in chosen else 0.0, where=allowed)
    return found


def _alone(a: FloatArray, b: FloatArray) -> FloatArray:
    """Amplitude of one source; nothing of one that no measured band shows."""
    return np.maximum(b, 0.0) * (a > UNSEEN) / np.maximum(a, UNSEEN)


def _of_two(normal: FloatArray, right: FloatArray) -> FloatArray:
    """Amplitudes of two sources; where one would be negative, is unseen or is the other's twin, the better alone."""
    (a, c), (_, d) = normal
    one, two = _alone(a, right[0]), _alone(d, right[1])
    first = one * right[0] >= two * right[1]
    det, least = a * d - c * c, SINGULAR * a * d + UNSEEN**2
    apart = det > least
    det = np.maximum(det, least)
    s1, s2 = (right[0] * d - right[1] * c) / det, (right[1] * a - right[0] * c) / det
    both = apart & (s1 > 0) & (s2 > 0) & (a > UNSEEN) & (d > UNSEEN)
    return np.array([np.where(both, s1, one * first), np.where(both, s2, two * ~first)])


def _solved(normal: FloatArray, right: FloatArray, chosen: tuple[int, ...]) -> tuple[FloatArray, FloatArray]:
    """Amplitudes of the chosen sources alone, and how much they lower the sum."""
    index = list(chosen)
    own, side = normal[np.ix_(index, index)], right[index]
    value = solved(own, side, SINGULAR)
    return value, np.einsum("kr,kr->r", value, side)


def solved(matrix: FloatArray, right: FloatArray, singular: float = 1e-12) -> FloatArray:
    """x (n, R) of symmetric positive systems (n, n, R), each pivot held above a part `singular` of its diagonal."""
    matrix, right = matrix.copy(), right.copy()
    size = right.shape[0]
    floor = np.maximum(np.einsum("iir->ir", matrix), UNSEEN)
    for k in range(size):
        matrix[k, k] = np.maximum(matrix[k, k], singular * floor[k])
        for i in range(k + 1, size):
            share = matrix[k, i] / matrix[k, k]
            matrix[i, i:] -= share * matrix[k, i:]
            right[i] -= share * right[k]
    for k in range(size - 1, -1, -1):
        for j in range(k + 1, size):
            right[k] -= matrix[k, j] * right[j]
        right[k] /= matrix[k, k]
    return right
