"""Pricing of the natural cone's columns: which would help a mixture most, for many candidates at once."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tui.model import FloatArray

IntArray = NDArray[np.int64]
Single = NDArray[np.float32]
SMALLEST = np.float32(1e-37)  # the square of a trace may be less than a float32 holds
SMALL_PRODUCT = 9.5e5  # multiplications in one product; OpenBLAS packs above 1e6, at twice the cost
CELLS = 2**18  # of the products at work at one time, so that they stay in cache
LARGEST = 1e30  # of what is handed on as float32


def price(blocks: Single, gradient: FloatArray, weight: FloatArray) -> tuple[FloatArray, IntArray]:
    """Per candidate and block the largest r.g / w.g and the column that has it.

    Both of shape (K, blocks). One float32 product gives numerators and denominators of a few candidates at a time,
    few enough that the product needs no packing; as many blocks at a time as leave the results in cache.
    """
    numerator, denominator = _scaled(gradient, weight)
    value = np.empty((len(gradient), len(blocks)), dtype=np.float32)
    place = np.empty((len(gradient), len(blocks)), dtype=np.int64)
    rows = max(int(SMALL_PRODUCT / (2 * blocks.shape[1] * blocks.shape[2])), 1)
    for first in range(0, len(gradient), rows):
        group = slice(first, first + rows)
        stacked = np.vstack([numerator[group], denominator[group]])
        count = len(stacked) // 2
        many = max(CELLS // (2 * count * blocks.shape[2]), 1)
        for start in range(0, len(blocks), many):
            some = slice(start, start + many)
            product = np.matmul(stacked, blocks[some])
            ratio = np.divide(product[:, :count], product[:, count:], out=product[:, :count])
            best = ratio.argmax(axis=2)
            place[group, some] = best.T
            value[group, some] = np.take_along_axis(ratio, best[:, :, None], axis=2)[:, :, 0].T
    return value.astype(np.float64), place


def single_sources(blocks: Single, gradient: FloatArray, weight: FloatArray) -> tuple[FloatArray, IntArray]:
    """As `price`, of the fall of chi-square by a column alone, (r.g)^2 / (w g)^2 (errors taken as independent)."""
    numerator, denominator = _scaled(gradient, weight)
    denominator = denominator**2
    value = np.empty((len(gradient), len(blocks)))
    place = np.empty((len(gradient), len(blocks)), dtype=np.int64)
    for number, block in enumerate(blocks):
        fall = np.maximum(numerator @ block, 0) ** 2 / np.maximum(denominator @ (block * block), SMALLEST)
        place[:, number] = fall.argmax(axis=1)
        value[:, number] = fall[np.arange(len(fall)), place[:, number]]
    return value, place


def _scaled(gradient: FloatArray, weight: FloatArray) -> tuple[Single, Single]:
    """Both over each candidate's largest weight, which leaves their ratio and is a range that float32 holds.

    A candidate without any weight gets equal ones, so that its ratio is nothing over something.
    """
    size = weight.max(axis=1, keepdims=True)
    known = size > 0
    scaled = np.where(known, weight / np.where(known, size, 1.0), 1.0)
    slope = np.clip(gradient / np.where(known, size, 1.0), -LARGEST, LARGEST)
    return slope.astype(np.float32), scaled.astype(np.float32)
