"""The Durbin-Watson form by small determinants: neither an n x n matrix nor its eigenvalues, at any n."""

from __future__ import annotations

from functools import cache
from math import pi, sin, sqrt

import numpy as np
from scipy.fft import dct

from sheetfuncs.core.lagged_products import LaggedProducts

# Up to here sums over all frequencies are cheaper than the series in lagged cross products.
FREQUENCIES_UP_TO = 400


def frequencies(n: int) -> np.ndarray:
    """Eigenvalues of the second-difference matrix, (n,), ascending from 0."""
    return 4.0 * np.sin(np.arange(n) * (np.pi / (2 * n))) ** 2


def frequency(n: int, place: int) -> float:
    """One of them."""
    return 4.0 * sin(place * pi / (2 * n)) ** 2


class DeterminantForm:
    """u'M(A - dI)M u without any n x n matrix: O(n k^2) for every node of the integral, or less.

    det(V'CV) = det(C) det(Q'C^-1 Q) for C = I - 2s(A - dI) and V orthogonal to Q. det(C) is a Chebyshev polynomial in
    closed form. The k x k matrix is a sum over the frequencies, or with C^-1's generating series
    1/(a + 4s cos) = (1 + 2 sum (-r)^m cos(m theta)) / sqrt(a^2 - 16 s^2) one over lagged cross products, like r^m.
    """

    passable = True

    def __init__(self, q: np.ndarray, intercept: bool, d: float):
        n = self.n = q.shape[0]
        self.size = n - q.shape[1] - int(intercept)
        self.k, self.intercept, self.d = q.shape[1], intercept, d
        # Inside the range of the frequencies of A itself, which every node of the integral stays in.
        self.lowest = 0.5 / (frequency(n, int(intercept)) - d)
        self.highest = 0.5 / (frequency(n, n - 1) - d)
        self.sums = LaggedProducts(q) if n > FREQUENCIES_UP_TO and self.k else FrequencySums(q, d)
        self.shift = 2.0 * (self.sums.trace + int(intercept) - 1)

    def at(self, s: float) -> tuple[float, float]:
        """From one step off the real line."""
        # Small beside the integrand's width, about 1/sqrt(8n), and the way to the ends.
        step = min(0.03 / sqrt(self.n), 0.05 * abs(s - self.lowest), 0.05 * abs(self.highest - s))
        logs = self._log_determinant(np.array([s, s + 1j * step]))
        return -0.5 * float(logs[1].imag) / step, float((logs[1] - logs[0]).real) / step**2

    def roughly_at(self, s: float) -> tuple[float, float]:
        """The derivatives of K as if the frequencies had their limiting distribution, that of 2 - 2 cos of an angle,
        the first shifted so that it is exact at 0."""
        rate = 2.0 * self.d - 4.0
        whole = 1.0 + rate * s
        root = sqrt(max(whole * whole - 16.0 * s * s, 1e-6))  # it ends a little before the frequencies of A
        steep = (rate * whole - 16.0 * s) / root
        slope = (rate + steep) / (whole + root)
        bend = (rate * rate - 16.0 - steep * steep) / (root * (whole + root)) - slope * slope
        return self.shift - 0.5 * self.size * slope, -0.5 * self.size * bend

    def across(self, place: float, t: np.ndarray) -> tuple[float, np.ndarray, np.ndarray]:
        logs = self._log_determinant(np.concatenate([[place], place + 1j * t]))
        height = float(logs.real[0])
        return -0.5 * height, np.exp(-0.5 * (logs.real[1:] - height)), -0.5 * logs.imag[1:]

    def bound(self, end: float) -> float:
        """An upper bound for the logarithm of the tail on end's side of 0, whatever Q is, from real s up to end.

        exp(K(s)) bounds the tail (Chernoff), and Q takes off no more than k of the largest factors of K (Cauchy's
        interlacing).
        """
        s = end * np.geomspace(1e-4, 1.0, 40)
        logs, _, _ = self._log_chebyshev(s.astype(np.complex128))
        lost = self.k * np.log1p(8.0 * np.abs(s))
        return float((-0.5 * (logs.real - lost)).min())

    def _log_chebyshev(self, s: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """log det(C) without frequency 0 where there is an intercept; the series' r and root."""
        d, n = self.d, self.n
        delta = s * (2.0 * d - 4.0)
        root = np.sqrt(1.0 + delta - 4.0 * s) * np.sqrt(1.0 + delta + 4.0 * s)
        beyond_one = (delta * (2.0 + delta) - 16.0 * s * s) / (root + 1.0)  # root - 1 without cancellation
        log_larger = np.log1p((delta + beyond_one) / 2.0)
        r = 2.0 * s * np.exp(-log_larger)
        logs = n * log_larger + np.log1p(-(r * r) ** n) - np.log(root)
        if not self.intercept:
            logs = logs + np.log(1.0 + 2.0 * s * d)
        return logs, r, root

    def _log_determinant(self, s: np.ndarray) -> np.ndarray:
        logs, r, root = self._log_chebyshev(s)
        if not self.k:
            return logs
        if isinstance(self.sums, FrequencySums):
            return logs + _log_pivots(self.sums.inverses(s))
        # What is small beside the first node need not keep all its digits.
        loss = np.clip(0.5 * (logs.real - logs.real[0]), 0.0, 36.0)
        return logs + _log_pivots(self.sums.series(-r, loss) / root[:, None, None])


class FrequencySums:
    """Q'C^-1 Q as a sum over the frequencies: of outer products of the spectrum's rows, over 1 - 2s(f - d).

    trace: of the sum of those outer products, times the cosines of the frequencies' angles.
    """

    def __init__(self, q: np.ndarray, d: float):
        n, k = q.shape
        spectrum, values = dct(q, type=2, axis=0, norm="ortho"), frequencies(n)
        self.shifted = values - d
        first, second, self.places = _pairs(k)
        self.outer = spectrum[:, first] * spectrum[:, second]
        self.trace = k - 0.5 * float((values @ self.outer)[first == second].sum())

    def inverses(self, s: np.ndarray) -> np.ndarray:
        """(nodes, k, k) for complex s (nodes,)."""
        # In real arithmetic, several times as fast: 1/(a - bi) = (a + bi)/(a^2 + b^2).
        real = 1.0 - np.multiply.outer(2.0 * s.real, self.shifted)
        imaginary = np.multiply.outer(2.0 * s.imag, self.shifted)
        squares = real * real
        squares += imaginary * imaginary
        real /= squares
        imaginary /= squares
        return (real @ self.outer + 1j * (imaginary @ self.outer))[:, self.places]


@cache
def _pairs(k: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Both places of each pair of k columns, and the pair's place (k, k)."""
    first, second = np.triu_indices(k)
    places = np.empty((k, k), np.intp)
    places[first, second] = places[second, first] = np.arange(first.shape[0])
    return first, second, places


def _log_pivots(matrices: np.ndarray) -> np.ndarray:
    """log det of matrices (m, k, k) whose real parts are positive definite.

    All pivots then have positive real parts, so that no exchange of rows is needed and the sum of their principal
    logarithms is the continuous branch.
    """
    left = matrices.copy()
    logs = np.log(left[:, 0, 0])
    for _ in range(1, left.shape[1]):
        left = left[:, 1:, 1:] - left[:, 1:, :1] * (left[:, :1, 1:] / left[:, :1, :1])
        logs = logs + np.log(left[:, 0, 0])
    return logs
