"""p-values from simulated tables of quantiles, smooth in the statistic and in the number of rows."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from math import exp, sqrt
from pathlib import Path

import numpy as np

FOLDER = Path(__file__).parent / "tables"
LOWEST_P = 1e-4
BELOW = "< 1e-4"
# So many rows of the table take part in a value between them.
_NEIGHBOURS = 4


@dataclass(frozen=True, eq=False)
class SimulatedTable:
    """Quantiles of a statistic of n independent normal draws.

    log_p: (levels,) logarithms of upper tail probabilities, falling. closeness: (rows,) 1/sqrt(n) of the table's rows,
    falling, the last one 0. log_quantiles: (rows, levels). samples: (rows,) how many were simulated. fewest: the
    smallest n.
    """

    log_p: np.ndarray
    closeness: np.ndarray
    log_quantiles: np.ndarray
    samples: np.ndarray
    fewest: int

    def p(self, statistic: float, n: int) -> tuple[float, float]:
        """Upper tail probability of a statistic of n >= fewest values, at least LOWEST_P, and its standard error.

        log p is interpolated in the statistic by a monotone cubic (Fritsch and Butland 1984, SIAM Journal on
        Scientific and Statistical Computing 5:300-304), logarithms of quantiles between the table's rows by a cubic in
        1/sqrt(n). The standard error is that of the simulation, sqrt(p (1 - p) / samples).
        """
        quantiles, samples = self._quantiles(n)
        p = _tail(statistic, quantiles, self.log_p)
        return p, sqrt(p * (1.0 - p) / samples)

    def _quantiles(self, n: int) -> tuple[np.ndarray, int]:
        """Quantiles (levels,) for n rows, and the number of samples that they rest on."""
        at = 1.0 / sqrt(n)
        after = int(np.searchsorted(-self.closeness, -at))
        if self.closeness[after] == at:
            return np.exp(self.log_quantiles[after]), int(self.samples[after])
        first = min(max(after - _NEIGHBOURS // 2, 0), self.closeness.shape[0] - _NEIGHBOURS)
        near = slice(first, first + _NEIGHBOURS)
        weights = _lagrange(at, self.closeness[near].tolist())
        return np.exp(weights @ self.log_quantiles[near]), int(self.samples[after - 1 : after + 1].min())


@cache
def simulated_table(name: str) -> SimulatedTable:
    """The table of this name: lines of n, samples, and quantiles under the probability at the head of the column."""
    lines = (FOLDER / f"{name}.csv").read_text(encoding="ascii").splitlines()
    head, *rows = (line.split(",") for line in lines if not line.startswith("#"))
    figures = np.array(rows, dtype=float)
    order = np.argsort(figures[0, 2:])
    return SimulatedTable(
        log_p=np.log(np.array(head[2:], dtype=float))[order], closeness=1.0 / np.sqrt(figures[:, 0]),
        log_quantiles=np.log(figures[:, 2:])[:, order], samples=figures[:, 1].astype(int), fewest=int(figures[0, 0]),
    )


def _lagrange(at: float, points: list[float]) -> np.ndarray:
    """Weights (points,) of the values at points in the polynomial through them, at `at`."""
    weights = [1.0] * len(points)
    for i, own in enumerate(points):
        for j, other in enumerate(points):
            if i != j:
                weights[i] *= (at - other) / (own - other)
    return np.array(weights)


def _tail(statistic: float, quantiles: np.ndarray, log_p: np.ndarray) -> float:
    """Upper tail probability, at least LOWEST_P: log p runs through (0, log 1) and the points (quantile, log_p)."""
    after = int(np.searchsorted(quantiles, statistic))
    count = quantiles.shape[0]
    if after == count:
        return LOWEST_P
    around = range(after - 2, after + 2)
    places = [i for i in around if -1 <= i < count]  # -1 stands for the start, where p is 1
    x = [0.0 if i < 0 else float(quantiles[i]) for i in places]
    y = [0.0 if i < 0 else float(log_p[i]) for i in places]
    left = places.index(after - 1)
    return max(exp(_monotone_cubic(max(statistic, 0.0), x, y, left)), LOWEST_P)


def _monotone_cubic(at: float, x: list[float], y: list[float], left: int) -> float:
    """The value between x[left] and x[left + 1] of a cubic that never turns between points that do not."""
    rises = [(y[i + 1] - y[i]) / (x[i + 1] - x[i]) for i in range(len(x) - 1)]

    def slope(i: int) -> float:
        if i == 0 or i == len(x) - 1:
            return rises[0] if i == 0 else rises[-1]
        before, after = x[i] - x[i - 1], x[i + 1] - x[i]
        one, other = rises[i - 1], rises[i]
        if one * other <= 0.0:
            return 0.0
        return 3.0 * (before + after) / ((2.0 * after + before) / one + (after + 2.0 * before) / other)

    width = x[left + 1] - x[left]
    t = (at - x[left]) / width
    start, end = slope(left), slope(left + 1)
    return (
        (1 + 2 * t) * (1 - t) ** 2 * y[left] + t * (1 - t) ** 2 * width * start
        + t**2 * (3 - 2 * t) * y[left + 1] + t**2 * (t - 1) * width * end
    )
