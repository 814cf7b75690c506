"""Double-double arithmetic: a number as the unevaluated sum of two doubles, 32 digits on every platform.

Built on transformations without error (Dekker 1971, Numer. Math. 18:224-242; Knuth, Seminumerical Algorithms, 4.2.2).
A pair (high, low) of equally shaped arrays stands for high + low, |low| at most half a unit in the last place of high.
Long doubles would differ by platform, and fused multiplications are not reached from numpy.
"""

from __future__ import annotations

import numpy as np

Pair = tuple[np.ndarray, np.ndarray]

# Veltkamp's constant for 53 bits: 2^27 + 1.
_SPLITTER = 134217729.0


def two_sum(a: np.ndarray, b: np.ndarray) -> Pair:
    """a + b, exactly: the rounded sum and its error (Knuth)."""
    high = a + b
    of_b = high - a
    return high, (a - (high - of_b)) + (b - of_b)


def renormalized(high: np.ndarray, low: np.ndarray) -> Pair:
    """high + low, exactly, where |high| >= |low| or high is 0 (Dekker)."""
    total = high + low
    return total, low - (total - high)


def halves(a: np.ndarray) -> Pair:
    """a as a sum of two numbers of 26 bits, whose products are exact (Veltkamp). |a| below 1e300."""
    shifted = _SPLITTER * a
    high = shifted - (shifted - a)
    return high, a - high


def two_prod(a: np.ndarray, b: np.ndarray) -> Pair:
    """a b, exactly: the rounded product and its error (Dekker). Products between 1e-290 and 1e300, or zero."""
    product = a * b
    (a1, a2), (b1, b2) = halves(a), halves(b)
    return product, ((a1 * b1 - product) + a1 * b2 + a2 * b1) + a2 * b2


def add(a: Pair, b: Pair) -> Pair:
    """a + b, within 2^-104 of |a| + |b|."""
    high, low = two_sum(a[0], b[0])
    return renormalized(high, low + (a[1] + b[1]))


def product(a: np.ndarray, b: Pair) -> Pair:
    """a b for plain doubles a, within 2^-104 of |a b|."""
    high, low = two_prod(a, b[0])
    return renormalized(high, low + a * b[1])


def quotient(a: Pair, b: float) -> Pair:
    """a / b for a plain double b, within 2^-103 of |a / b|."""
    first = a[0] / b
    back, error = two_prod(first, np.asarray(b))
    return renormalized(first, ((a[0] - back) - error + a[1]) / b)


def total(a: Pair, axis: int = 0) -> Pair:
    """The sum along an axis, by halves: its error is 2^-104 of the sum of sizes times log2 of the length."""
    high, low = (np.moveaxis(part, axis, 0) for part in a)
    while (length := high.shape[0]) > 1:
        upper = (length + 1) // 2
        folded = add((high[: length - upper], low[: length - upper]), (high[upper:], low[upper:]))
        if 2 * upper > length:  # the middle one waits for its partner
            folded = (
                np.concatenate([folded[0], high[upper - 1:upper]]), np.concatenate([folded[1], low[upper - 1:upper]])
            )
        high, low = folded
    return high[0], low[0]


def negative(a: Pair) -> Pair:
    """-a, exactly."""
    return -a[0], -a[1]
