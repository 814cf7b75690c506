"""Regression by cross products, where the columns are so far apart that it costs no digit."""

from __future__ import annotations

import numpy as np
from scipy.linalg import lapack

# Cross products of columns of which at least this share is left after the others lose no digit that matters.
WELL_APART = 1e-3
# The same for one step without a second one that takes back its roundings; of squares.
FAR_APART = 1e-2


def coordinates(gram: np.ndarray, whole: np.ndarray | float | None = None) -> np.ndarray | None:
    """Coordinates of the last of some columns along the others, made orthonormal one after the other; (m,).

    gram: (m, m) cross products, of which the lower triangle is read. The last coordinate is the length of what is left,
    so that all squares add up to the column's own. Squares of the first few are what these first few columns explain.
    None where less than a hundredth is left of a column's square, which would cost digits; whole: these squares, where
    something was taken off the columns before.
    """
    root, info = lapack.dpotrf(gram, lower=1)
    if info != 0:
        return None
    left = root.diagonal() ** 2
    return root[-1] if (left >= FAR_APART * (gram.diagonal() if whole is None else whole)).all() else None


def leading(gram: np.ndarray, count: int) -> np.ndarray:
    """The lower triangle of the cross products of the first columns and the last one, (count + 1, count + 1)."""
    part = np.empty((count + 1, count + 1))
    part[:count, :count] = gram[:count, :count]
    part[count, :count], part[count, count] = gram[-1, :count], gram[-1, -1]
    return part


def apart(q: np.ndarray, e: np.ndarray) -> tuple[np.ndarray | None, int]:
    """What q (m, k) leaves of e, and k, by cross products; None where the columns are too close to each other."""
    k = q.shape[1]
    if k == 0:
        return e, 0
    gram = q.T @ q
    length = np.sqrt(np.diag(gram))
    if q.shape[0] < k or length.min() < WELL_APART:
        return None, 0
    root, info = lapack.dpotrf(gram / np.outer(length, length), lower=1)
    if info != 0 or np.diag(root).min() < WELL_APART:
        return None, 0
    left = e
    for _ in range(2):  # the second step takes back the roundings of the first
        weights, _ = lapack.dpotrs(root, (q.T @ left) / length, lower=1)
        left = left - q @ (weights / length)
    return left, k
