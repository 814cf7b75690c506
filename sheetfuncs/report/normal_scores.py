"""Normal scores, and pointwise limits for a plot against them."""

from __future__ import annotations

from statistics import NormalDist

import numpy as np

from sheetfuncs.core.normality import scores_of_ranks

_NORMAL = NormalDist()


def normal_scores(n: int, places: np.ndarray | None = None) -> np.ndarray:
    """Expected places of n ordered standard normal values: quantiles at (i - 3/8)/(n + 1/4), i from 1 (Blom 1958).

    places: which of them, from 0; None gives all n.
    """
    return scores_of_ranks((np.arange(n) if places is None else places) + 1.0, n)


def pointwise_limits(scores: np.ndarray, n: int, level: float = 0.95) -> tuple[np.ndarray, np.ndarray]:
    """Limits for each single ordered value, score -/+ z * sqrt(P(1 - P)/n)/density.

    The large-sample standard error of an order statistic, as used with such plots by Chambers, Cleveland, Kleiner and
    Tukey 1983, Graphical Methods for Data Analysis (from memory). Pointwise: with many points some leave the limits.
    """
    z = _NORMAL.inv_cdf(0.5 + level / 2)
    chance = np.array([_NORMAL.cdf(s) for s in scores])
    density = np.array([_NORMAL.pdf(s) for s in scores])
    half = z * np.sqrt(chance * (1.0 - chance) / n) / density
    return scores - half, scores + half
