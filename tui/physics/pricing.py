"""Pricing of the natural cone's columns: which would help a mixture most, for many candidates at once."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tui.model import FloatArray

IntArray = NDArray[np.int64]
SMALLEST = np.float32(1e-37)  # the square of a trace may be less than a float32 holds
SMALL_PRODUCT = 9.5e5  # multiplications in one product; OpenBLAS packs above 1e6, at twice the cost


def price(blocks: NDArray[np.float32], gradient: FloatArray, weight: FloatArray) -> tuple[FloatArray, IntArray]:
    """Per candidate and block the largest r.g / w.g and, where that is positive, the column that has it.

    Both of shape (K, blocks). One float32 product gives numerators and denominators of a few candidates at a time,
    few enough that the product needs no packing and its result stays in cache.
    """
    size = np.maximum(weight.max(axis=1, keepdims=True), 1e-300)
    numerator, denominator = (gradient / size).astype(np.float32), (weight / size).astype(np.float32)
    value = np.empty((len(gradient), len(blocks)), dtype=np.float32)
    place = np.zeros((len(gradient), len(blocks)), dtype=np.int64)
    rows = max(int(SMALL_PRODUCT / (2 * blocks.shape[1] * blocks.shape[2])), 1)
    for first in range(0, len(gradient), rows):
        group = slice(first, first + rows)
        stacked = np.vstack([numerator[group], denominator[group]])
        count = len(stacked) // 2
        product = np.empty((2 * count, blocks.shape[2]), dtype=np.float32)
        for number, block in enumerate(blocks):
            np.matmul(stacked, block, out=product)
            ratio = np.divide(product[:count], product[count:], out=product[:count])
            highest = value[group, number] = ratio.max(axis=1)
            helps = np.flatnonzero(highest > 0)
            if len(helps):
                place[first + helps, number] = ratio[helps].argmax(axis=1)
    return value.astype(np.float64), place


def single_sources(
    blocks: NDArray[np.float32], gradient: FloatArray, weight: FloatArray
) -> tuple[FloatArray, IntArray]:
    """As `price`, of the fall of chi-square by a column alone, (r.g)^2 / (w g)^2 (errors taken as independent)."""
    size = np.maximum(weight.max(axis=1, keepdims=True), 1e-300)
    numerator, denominator = (gradient / size).astype(np.float32), ((weight / size) ** 2).astype(np.float32)
    value = np.empty((len(gradient), len(blocks)))
    place = np.empty((len(gradient), len(blocks)), dtype=np.int64)
    for number, block in enumerate(blocks):
        fall = np.maximum(numerator @ block, 0) ** 2 / np.maximum(denominator @ (block * block), SMALLEST)
        place[:, number] = fall.argmax(axis=1)
        value[:, number] = fall[np.arange(len(fall)), place[:, number]]
    return value, place
