"""Cross products of rows with the rows a few places away, which are the moments of the rows' spectrum."""

from __future__ import annotations

import numpy as np
from numpy.lib.stride_tricks import as_strided

# Elements of a block of rows that stays in the processor's cache.
_BLOCK = 100_000
# Columns of the products: fewer are slow, more do work that is not needed.
_WIDTH = 40
# The logarithm of the relative precision of sums.
_ROUNDING = -37.0


class LaggedProducts:
    """Sums over the frequencies of cos(m theta) q q', for m = 0, 1, ...: lagged cross products of q, no transform.

    The DCT-II is the spectrum of the rows mirrored at both ends, so that these are cross products of each row with the
    rows m places away, the ends folded back.
    """

    def __init__(self, q: np.ndarray):
        self.q = q
        # As many as the integral at the centre of the distribution takes.
        guess = int(-_ROUNDING / np.log(max(np.sqrt(q.shape[0]) / 3.0, 1.5))) + 2
        self.moments = self._moments(min(guess, q.shape[0] - 1))

    @property
    def trace(self) -> float:
        """Of the first moment."""
        return float(self.moments[1].trace())

    def series(self, ratio: np.ndarray, loss: np.ndarray) -> np.ndarray:
        """M_0 + 2 sum over m of ratio^m M_m for every ratio (nodes,): (nodes, k, k).

        loss: (nodes,) how many powers of e of relative precision each may lose.
        """
        size = np.abs(ratio)
        needed = (_ROUNDING + loss) / np.log(np.clip(size, 1e-300, 1.0 - 1e-9))
        count = min(max(1, int(np.ceil(needed.max())) + 1), self.q.shape[0] - 1)
        if count > self.moments.shape[0]:
            self.moments = self._moments(min(count + count // 2, self.q.shape[0] - 1))
        weights = np.empty((ratio.shape[0], count), dtype=np.complex128)
        weights[:, 0], weights[:, 1:] = 2.0, ratio[:, None]
        np.multiply.accumulate(weights, axis=1, out=weights)  # powers
        weights[:, 0] = 1.0
        k = self.q.shape[1]
        flat = self.moments[:count].reshape(count, -1)
        return (weights.real @ flat + 1j * (weights.imag @ flat)).reshape(-1, k, k)

    def _moments(self, count: int) -> np.ndarray:
        """(count, k, k): the first moments."""
        apart = _lagged(self.q, count)
        found = apart + apart.transpose(0, 2, 1)
        found[0] = apart[0]
        ends = np.stack([self.q[:count], self.q[-count:][::-1]], axis=1)  # from both ends inwards
        k = ends.shape[2]
        inwards, outwards = ends.reshape(-1, k), ends[::-1].reshape(-1, k)
        for lag in range(1, count):
            found[lag] += inwards[: 2 * lag].T @ outwards[2 * (count - lag) :]
        found[1:] *= 0.5
        return found


def _lagged(q: np.ndarray, count: int) -> np.ndarray:
    """(count, k, k): sums of q[i] q[i + lag]' for lag = 0 to count - 1.

    Several rows side by side make a line: few products of lines with the lines some places on, which are wide enough to
    be fast, hold those of all rows, and each lag's lie along a diagonal.
    """
    n, k = q.shape
    side = min(count, max(1, _WIDTH // k))
    steps = (count + 2 * side - 2) // side
    rows = side * max(steps, _BLOCK // (k * side))
    products = np.zeros((side, k, steps * side, k))
    for first in range(0, n, rows):
        height = -(-min(rows, n - first) // side)
        lines = np.zeros((height + steps - 1, side * k))
        part = q[first : first + lines.shape[0] * side]
        lines.reshape(-1, k)[: part.shape[0]] = part
        for step in range(steps):
            there = lines[:height].T @ lines[step : step + height]
            products[:, :, step * side : (step + 1) * side] += there.reshape(side, k, side, k)
    own, row, other, column = products.strides
    diagonals = as_strided(products, (side, count, k, k), (own + other, other, row, column), writeable=False)
    return np.add.reduce(diagonals, axis=0)
