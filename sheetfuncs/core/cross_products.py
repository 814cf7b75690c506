"""Regression by cross products, where the columns are so far apart that it costs no digit."""

from __future__ import annotations

import numpy as np
from scipy.linalg import lapack

# Cross products of columns of which at least this share is left after the others lose no digit that matters.
WELL_APART = 1e-3


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
