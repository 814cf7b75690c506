"""Cross products of rows with the rows a few places away, which are the moments of the rows' spectrum."""

from __future__ import annotations

import numpy as np

# Elements of a block of rows that stays in the processor's cache.
_BLOCK = 160_000
# Columns of a long row: wide enough for fast products, small enough for their result.
_WIDEST = 128
# The logarithm of the relative precision of sums.
_ROUNDING = -39.0


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

    def series(self, ratio: np.ndarray, loss: np.ndarray) -> np.ndarray:
        """M_0 + 2 sum over m of ratio^m M_m for every ratio (nodes,): (nodes, k, k).

        loss: (nodes,) how many powers of e of relative precision each may lose.
        """
        size = np.abs(ratio)
        needed = (_ROUNDING + loss) / np.log(np.clip(size, 1e-300, 1.0 - 1e-9))
        count = min(max(1, int(np.ceil(needed.max())) + 1), self.q.shape[0] - 1)
        if count > self.moments.shape[0]:
            self.moments = self._moments(min(count + count // 2, self.q.shape[0] - 1))
        weights = 2.0 * ratio[:, None] ** np.arange(count)
        weights[:, 0] = 1.0
        return np.tensordot(weights, self.moments[:count], axes=1)

    def _moments(self, count: int) -> np.ndarray:
        """(count, k, k): the first moments."""
        apart = _lagged(self.q, count)
        found = np.empty_like(apart)
        found[0] = apart[0]
        start, end = np.ascontiguousarray(self.q[:count]), np.ascontiguousarray(self.q[-count:])
        for lag in range(1, count):
            folded = start[:lag].T @ start[:lag][::-1] + end[-lag:].T @ end[-lag:][::-1]
            found[lag] = (apart[lag] + apart[lag].T + folded) / 2.0
        return found


def _lagged(q: np.ndarray, count: int) -> np.ndarray:
    """(count, k, k): sums of q[i] q[i + lag]' for lag = 0 to count - 1.

    Several rows beside each other are one long row: its cross products with itself and with the next ones hold them
    all, and are large products where many small ones would wait for memory.
    """
    n, k = q.shape
    side = max(1, min(count, _WIDEST // k))  # rows in a long row
    ahead = -(-(count - 1) // side) + 1
    rows = min(max(1, _BLOCK // (side * k)), -(-n // side))  # long rows in a block
    cross = np.zeros((ahead, side * k, side * k))
    for first in range(0, n, rows * side):
        block = np.zeros(((rows + ahead) * side, k))
        piece = q[first:first + block.shape[0]]
        block[: piece.shape[0]] = piece
        long = block.reshape(-1, side * k)
        for j in range(ahead):
            cross[j] += long[:rows].T @ long[j:rows + j]
    parts = cross.reshape(ahead, side, k, side, k)
    here = np.arange(side)
    found = np.empty((count, k, k))
    for lag in range(count):
        there = here + lag
        found[lag] = parts[there // side, here, :, there % side, :].sum(axis=0)
    return found
