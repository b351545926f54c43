"""Pulls of bands that share an error: what is left once the best common factor is taken off."""

from __future__ import annotations

import numpy as np

from tui.model import FloatArray
from tui.physics.fitting import FitBatch


def shown_pulls(batch: FitBatch) -> FloatArray:
    """`batch.pulls`, shape (M, B), less each instrument's most probable common error where the settings give it one.

    With r the pulls, S the common errors in units of sigma (K, B) and a = (1 + S S')^-1 S r, these are r - S' a:
    chi-square is their sum of squares plus that of a.
    """
    pulls = batch.pulls
    common = batch.problem.common
    if not common.size:
        return pulls
    there = batch.problem.detected
    scale = common[None] * (np.where(there, batch.prediction.flux, 0.0) / batch.errors.sigma)[:, None, :]
    left = np.where(there, np.nan_to_num(pulls), 0.0)
    inner = np.eye(common.shape[0]) + np.einsum("mkb,mlb->mkl", scale, scale)
    factor = np.linalg.solve(inner, np.einsum("mkb,mb->mk", scale, left)[:, :, None])[:, :, 0]
    return pulls - np.where(there, np.einsum("mkb,mk->mb", scale, factor), 0.0)
