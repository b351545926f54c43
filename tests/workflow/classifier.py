"""A small classifier and how well it does: ridge logistic regression, cross-validated, AUC with its 95 % interval."""

from __future__ import annotations

import numpy as np
from scipy.special import expit, ndtri

RIDGE = 10.0
FOLDS = 10
STEPS = 60
SHUFFLES = 30


def fitted(features: np.ndarray, labels: np.ndarray) -> np.ndarray:
    """Weights that minimise the penalised log loss, for several sets of labels at once.

    Each step takes the largest curvature that the log loss can have (Böhning & Lindsay 1988), so that one inverse
    serves all sets and steps, and none overshoots.

    Args:
        features: standardised, shape (n, k).
        labels: 0 or 1, one set a column, shape (n, sets).
    Returns:
        Shape (1 + k, sets), intercepts first.
    """
    design = np.column_stack([np.ones(len(features)), features])
    penalty = np.full(design.shape[1], RIDGE)
    penalty[0] = 1e-6
    inverse = np.linalg.inv(design.T @ design / 4 + np.diag(penalty))
    weights = np.zeros((design.shape[1], labels.shape[1]))
    for _ in range(STEPS):
        slope = design.T @ (expit(design @ weights) - labels) + penalty[:, None] * weights
        weights -= inverse @ slope
    return weights


def scores(table: np.ndarray, labels: np.ndarray, rng: np.random.Generator) -> np.ndarray:
    """For each row and set the rank, from 0 to 1, that a classifier which never saw the row gives it in its fold."""
    features = (table - table.mean(axis=0)) / np.maximum(table.std(axis=0), 1e-12)
    fold = rng.permutation(np.arange(len(table)) % FOLDS)
    found = np.empty(labels.shape)
    for number in range(FOLDS):
        test = fold == number
        weights = fitted(features[~test], labels[~test])
        leaning = weights[0] + features[test] @ weights[1:]
        ahead = leaning[:, None] - leaning
        found[test] = (ahead > 0).mean(axis=1) + 0.5 * (ahead == 0).mean(axis=1)
    return found


def auc(found: np.ndarray, labels: np.ndarray) -> tuple[float, float]:
    """Area under the ROC curve and its standard error, after DeLong, DeLong & Clarke-Pearson 1988 (placements)."""
    high, low = found[labels == 1], found[labels == 0]
    wins = (high[:, None] > low) + 0.5 * (high[:, None] == low)
    error = np.sqrt(wins.mean(axis=1).var(ddof=1) / len(high) + wins.mean(axis=0).var(ddof=1) / len(low))
    return float(wins.mean()), float(error)


def tried(table: np.ndarray, labels: np.ndarray, together: int = 1) -> tuple[float, float, float]:
    """AUC on rows that the classifier never saw, with its 95 % interval.

    The folds share what they learn from, so that the area scatters more than its placements say: where labels
    drawn by lot scatter it more, that scatter is taken.

    Args:
        table: one row a candidate, shape (n, k).
        labels: 0 or 1, shape (n,).
        together: of so many intervals all shall hold at 95 % (Bonferroni).
    """
    rng = np.random.default_rng(1)
    sets = np.column_stack([labels, *(rng.permutation(labels) for _ in range(SHUFFLES))])
    found = scores(table, sets, rng)
    area, error = auc(found[:, 0], labels)
    scatter = np.std([auc(found[:, one], sets[:, one])[0] for one in range(1, SHUFFLES + 1)], ddof=1)
    half = ndtri(1 - 0.025 / together) * max(error, float(scatter))
    return area, area - half, area + half
