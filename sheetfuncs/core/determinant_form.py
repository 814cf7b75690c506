"""The Durbin-Watson form by small determinants: neither an n x n matrix nor its eigenvalues, at any n."""

from __future__ import annotations

from math import pi, sin, sqrt

import numpy as np
from scipy.fft import dct

from sheetfuncs.core.lagged_products import LaggedProducts

# Up to here sums over all frequencies are cheaper than the series in lagged cross products.
FREQUENCIES_UP_TO = 1000


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
        self.k, self.intercept, self.d = q.shape[1], intercept, d
        # Inside the range of the frequencies of A itself, which every node of the integral stays in.
        self.lowest = 0.5 / (frequency(n, int(intercept)) - d)
        self.highest = 0.5 / (frequency(n, n - 1) - d)
        self.sums = LaggedProducts(q) if n > FREQUENCIES_UP_TO and self.k else FrequencySums(q, frequencies(n) - d)

    def at(self, s: float) -> tuple[float, float, float]:
        """K(s) and its derivatives, these from one step off the real line."""
        # Small beside the integrand's width, about 1/sqrt(8n), and the way to the ends.
        step = min(0.03 / sqrt(self.n), 0.05 * abs(s - self.lowest), 0.05 * abs(self.highest - s))
        logs = self._log_determinant(np.array([s, s + 1j * step]))
        return (
            -0.5 * float(logs[0].real), -0.5 * float(logs[1].imag) / step, float((logs[1] - logs[0]).real) / step**2,
        )

    def across(self, place: float, t: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        logs = self._log_determinant(np.concatenate([[place], place + 1j * t]))
        return np.exp(-0.5 * (logs.real[1:] - logs.real[0])), -0.5 * logs.imag[1:]

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
    """Q'C^-1 Q as a sum over the frequencies: of outer products of the spectrum's rows, over 1 - 2s shifted."""

    def __init__(self, q: np.ndarray, shifted: np.ndarray):
        self.shape, self.shifted = q.shape, shifted
        spectrum = dct(q, type=2, axis=0, norm="ortho")
        self.outer = (spectrum[:, :, None] * spectrum[:, None, :]).reshape(q.shape[0], -1)

    def inverses(self, s: np.ndarray) -> np.ndarray:
        """(nodes, k, k) for complex s (nodes,)."""
        n, k = self.shape
        # In real arithmetic, several times as fast: 1/(a - bi) = (a + bi)/(a^2 + b^2).
        weights = np.empty((2, s.shape[0], n))
        np.subtract(1.0, 2.0 * s.real[:, None] * self.shifted, out=weights[0])
        np.multiply(2.0 * s.imag[:, None], self.shifted, out=weights[1])
        weights /= np.square(weights).sum(axis=0)
        real, imaginary = (weights.reshape(-1, n) @ self.outer).reshape(2, -1, k, k)
        return real + 1j * imaginary


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
