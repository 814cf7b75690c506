"""The likelihood of powers of a response as one power series around a power, from few sums over the rows."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from itertools import pairwise
from math import factorial, isfinite, log, sqrt

import numpy as np

# Terms are taken until the next one is this small; more than that many would cost digits or time.
NEGLIGIBLE = 1e-16
MOST_TERMS = 30
BLOCK = 4096  # rows at a time, which stay in the processor's cache
# Steps after which nothing has been found.
_MOST_STEPS = 30


@dataclass(frozen=True, eq=False)
class PowerSeries:
    """log of the residual sum of squares of ((y/g)^power - 1)/power on the predictors, near a power.

    coefficients: of the sum of squares, times power^2 unless centre is 0, in (power - centre)/reach, the highest first.
    """

    centre: float
    reach: float
    coefficients: list[float]

    def at(self, power: float) -> tuple[float, float, float]:
        """log rss and its first two derivatives; NaN outside the reach."""
        t = (power - self.centre) / self.reach
        if not abs(t) <= 1.0:
            return float("nan"), float("nan"), float("nan")
        value = slope = bend = 0.0
        for coefficient in self.coefficients:
            bend = bend * t + slope
            slope = slope * t + value
            value = value * t + coefficient
        if not value > 0.0:
            return float("nan"), float("nan"), float("nan")
        slope /= value * self.reach
        bend = 2.0 * bend / (value * self.reach**2) - slope * slope
        if self.centre == 0.0:
            return log(value), slope, bend
        return log(value / (power * power)), slope - 2.0 / power, bend + 2.0 / (power * power)

    def lowest(self) -> tuple[float, float, float] | None:
        """The power of the least rss, its log rss, and the second derivative there; None where none is in reach."""
        power = self.centre
        for _ in range(_MOST_STEPS):
            height, slope, bend = self.at(power)
            if not bend > 0.0:
                return None
            step = slope / bend
            power -= step
            if abs(step) <= 1e-7 * self.reach:  # the next step would be a rounding
                height -= 0.5 * slope * step
                return power, height, bend
        return None

    def rises_to(self, power: float, height: float, distance: float) -> float | None:
        """The power at which log rss is above its least value, at power, by height; sought from a distance off.

        Newton steps on the root of what it is above, which is nearly straight. None where it is not in reach.
        """
        least, goal = self.at(power)[0], sqrt(height)
        for _ in range(_MOST_STEPS):
            above, slope, _ = self.at(power + distance)
            if not above > least:
                return None
            root = sqrt(above - least)
            step = (root - goal) * 2.0 * root / slope
            distance -= step
            if abs(step) <= 1e-7 * abs(distance):
                return power + distance
        return None


def power_series(
    u: np.ndarray, q: np.ndarray, intercept: bool, centre: float, reach: float
) -> PowerSeries | None:
    """The series for u (n,), the logarithms of the response over its geometric mean, on q (n, k), an orthonormal basis.

    With E = e^(centre u), e^((centre + d) u) - 1 = (E - 1) + E (d u + (d u)^2/2! + ...): columns that are made one from
    the other, and whose cross products hold the sum of squares for every d. None where it would take too many terms.
    """
    if abs(centre) <= reach:  # around 0 nothing is divided by the power
        centre, reach = 0.0, abs(centre) + reach
    terms = _number_of_terms(reach * max(float(u.max()), -float(u.min())))
    if terms is None:
        return None
    blocks = [slice(start, start + BLOCK) for start in range(0, u.shape[0], BLOCK)]
    columns = [_columns(u[rows], terms, centre, reach) for rows in blocks]
    along, mean, products = np.zeros((terms, q.shape[1])), np.zeros((terms, 1)), np.zeros((terms, terms))
    for rows, block in zip(blocks, columns, strict=True):
        along += block @ q[rows]
        if intercept:
            mean += np.add.reduce(block, axis=1, keepdims=True) / u.shape[0]
    for rows, block in zip(blocks, columns, strict=True):
        block -= along @ q[rows].T
        block -= mean
        products += block @ block.T
    places, weights = _places(terms, int(centre == 0.0))
    sums = np.bincount(places, (products * weights).ravel())
    if not isfinite(float(sums.sum())):
        return None
    enough = np.flatnonzero(np.abs(sums) > NEGLIGIBLE * abs(sums[0]))
    return PowerSeries(centre, reach, sums[: int(enough[-1]) + 1][::-1].tolist()) if enough.size else None


def _columns(u: np.ndarray, terms: int, centre: float, reach: float) -> np.ndarray:
    """(terms, m): of which sums with the powers of d/reach are (e^((centre + d) u) - 1), over d for a centre of 0, once
    each is divided by the factorial of its place."""
    columns = np.empty((terms, u.shape[0]))
    columns[0] = u if centre == 0.0 else np.exp(centre * u)
    scaled = reach * u
    for before, column in pairwise(columns):
        np.multiply(before, scaled, out=column)
    if centre != 0.0:
        columns[0] = np.expm1(centre * u)
    return columns


def _number_of_terms(size: float) -> int | None:
    term, count = 1.0, 1
    while term > NEGLIGIBLE:
        term *= size / count
        count += 1
        if count > MOST_TERMS:
            return None
    return count


@cache
def _places(terms: int, first: int) -> tuple[np.ndarray, np.ndarray]:
    """To which coefficient each cross product belongs, (terms^2,), and over which factorials, (terms, terms); the first
    column's is that of `first`."""
    places = np.arange(terms)
    over = 1.0 / np.array([float(factorial(j + first)) for j in range(terms)])
    return np.add.outer(places, places).ravel(), np.multiply.outer(over, over)
