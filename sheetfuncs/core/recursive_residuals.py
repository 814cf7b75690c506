"""Recursive residuals: the error of predicting each row from the rows before it, all of equal variance."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.linalg import lapack

from sheetfuncs.core.basis import DETERMINED, EPS, ROUNDINGS, back_substituted, upper_triangle
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.threads import few_threads

BLOCK = 64
# Rows in a block once many are taken at a time: the work of a row grows with the square of this.
SMALL_BLOCK = 16
# Blocks that are taken at a time, so that memory stays small.
TOGETHER = 64
# Cross products of the rows so far cost no digit that matters once every column has this share left after the others,
# and once this much of it, squared, that no row to come, of length 1 at most, lies far beyond them.
WELL_APART, REACHED = 0.1, 1e-3


@dataclass(frozen=True, eq=False)
class RecursiveResiduals:
    """start: how many rows it takes to tell the predictors apart, none of which has a recursive residual.

    values: (n - start,), for the rows from there on, in the order in which they were taken.
    """

    start: int
    values: np.ndarray


def recursive_residuals(fit: Fit, order: np.ndarray | None = None) -> RecursiveResiduals:
    """Recursive residuals (Brown, Durbin and Evans 1975, JRSS B 37:149-192, equation 2).

    w_t = (y_t - x_t b) / sqrt(1 + x_t (X'X)^-1 x_t'), b and X from the rows before t. order: permutation (n,) in which
    the rows are taken, None for their own order. With independent normal errors of equal variance the values are
    independent, with mean zero and that variance. Their squares add up to the rss less that of the first rows alone.

    Taken in blocks: with X_b the rows of a block, P = (X'X)^-1 before it and LL' = I + X_b P X_b', the block's values
    are L^-1 (y_b - X_b b).
    """
    with few_threads(0):  # the factorizations are small whatever n is
        rows = _Rows(fit, order)
        start = _first_with_full_rank(rows)
        return RecursiveResiduals(start, _values(rows, start) * rows.length)


class _Rows:
    """The rows as they are taken, (m, p + 1): predictors, and last the fit's residuals scaled to length 1. Recursive
    residuals of these are those of the response, since fitted values are combinations of the predictors."""

    def __init__(self, fit: Fit, order: np.ndarray | None):
        self.fit, self.order = fit, order
        self.constant = int(fit.design.intercept)
        self.length = float(np.sqrt(fit.rss)) or 1.0
        self.first = fit.design.columns[0 if order is None else order[0]] * self.constant

    def in_basis(self, start: int, stop: int) -> np.ndarray:
        """Predictors as coordinates in the fit's orthonormal basis: well apart once there are many rows."""
        place = slice(start, stop) if self.order is None else self.order[start:stop]
        return self.fit.orthonormal[:, place].T

    def near_first(self, start: int, stop: int) -> np.ndarray:
        """Predictors as they are, counted from the first row where there is an intercept: that keeps every digit of
        small steps, as those of a time column, which in the basis are small differences."""
        place = slice(start, stop) if self.order is None else self.order[start:stop]
        e = self.fit.residuals[place]
        rows = np.empty((e.shape[0], self.fit.p + 1))
        rows[:, : self.constant] = 1.0
        np.subtract(self.fit.design.columns[place], self.first, out=rows[:, self.constant : -1])
        rows[:, self.constant : -1] /= self.fit.basis.scale
        np.divide(e, self.length, out=rows[:, -1])
        return rows

    def roundings(self, rows: np.ndarray) -> float:
        """The roundings that the predictors of first rows, as `near_first` gives them, carry, relative to how far they
        lie apart."""
        near = rows[:, self.constant : -1]
        with np.errstate(divide="ignore", invalid="ignore"):
            size = np.abs(near + self.first / self.fit.basis.scale).max(axis=0) / np.abs(near).max(axis=0)
        return ROUNDINGS * EPS * float(size.max(initial=0.0))


def _first_with_full_rank(rows: _Rows) -> int:
    """How many of the first rows it takes for the predictors' full rank."""
    n, p = rows.fit.n, rows.fit.p

    def full(count: int) -> bool:
        near = rows.near_first(0, count)
        z = near[:, :-1]
        length = np.sqrt(np.add.reduce(z * z, axis=0))
        if not length.all():
            return False
        factors = lapack.dgeqp3(np.asfortranarray(z / length), overwrite_a=1)[0]
        return bool(abs(factors[p - 1, p - 1]) > max(DETERMINED, rows.roundings(near)))

    short, enough = p - 1, p
    while enough < n and not full(enough):
        short, enough = enough, min(2 * enough, n)
    while enough - short > 1:  # rank only grows with rows
        middle = (short + enough) // 2
        short, enough = (short, middle) if full(middle) else (middle, enough)
    return enough


def _values(rows: _Rows, start: int) -> np.ndarray:
    """Recursive residuals of the last column on the others, after the first rows."""
    n = rows.fit.n
    found: list[np.ndarray] = []
    root = _triangle(rows.near_first(0, start))
    done = start
    gram = _gram(rows.in_basis(0, start))
    while done < n and not _well_apart(gram):
        # Small first blocks: rows far beyond those before them would be predicted with large P.
        stop = min(done + min(2 * done, BLOCK), n)
        block = rows.near_first(done, stop)
        found.append(_block_values(root, block))
        root = _triangle(np.concatenate([root, block]))
        gram += _gram(rows.in_basis(done, stop))
        done = stop
    room = _room(rows.fit.p, n - done)
    while done < n:
        values, gram = _many_blocks(gram, rows.in_basis(done, done + TOGETHER * SMALL_BLOCK), room)
        found.append(values)
        done += values.shape[0]
    return np.concatenate(found) if found else np.empty(0)


def _gram(rows: np.ndarray) -> np.ndarray:
    return rows.T @ rows


def _triangle(rows: np.ndarray) -> np.ndarray:
    """(p + 1, p + 1) upper triangle R of these rows' QR; fewer rows are filled up with zeros."""
    width = rows.shape[1]
    factors = lapack.dgeqrf(np.array(rows, order="F"), overwrite_a=1)[0]
    root = np.zeros((width, width))
    height = min(factors.shape[0], width)
    root[:height] = upper_triangle(factors[:height])
    return root


def _well_apart(gram: np.ndarray) -> bool:
    inner = gram[:-1, :-1]
    root, info = lapack.dpotrf(inner, lower=1)
    return bool(info == 0 and (root.diagonal() ** 2 >= np.maximum(WELL_APART**2 * inner.diagonal(), REACHED)).all())


def _block_values(root: np.ndarray, block: np.ndarray) -> np.ndarray:
    """Values of one block (m, p + 1) after rows with this triangle, by orthogonal steps only.

    L comes from the QR of [I, V]' with V = X_b R^-1, which costs no digit where the first rows determine the
    coefficients badly and P is large.
    """
    inner = root[:-1, :-1]
    m, p = block.shape[0], inner.shape[0]
    v = lapack.dtrtrs(inner, block[:, :-1].T, trans=1)[0]
    stacked = np.zeros((m + p, m), order="F")
    stacked[:m] = np.eye(m)
    stacked[m:] = v
    upper = lapack.dgeqrf(stacked, overwrite_a=1)[0][:m]
    upper *= np.sign(np.diag(upper))[:, None]
    error = block[:, -1] - block[:, :-1] @ back_substituted(inner, root[:-1, -1])
    return lapack.dtrtrs(upper, error, trans=1)[0]


def _room(p: int, count: int) -> np.ndarray:
    """Room (blocks, p + SMALL_BLOCK + 1, the same) for the triangles of `_many_blocks`, with what never changes."""
    size = p + SMALL_BLOCK + 1
    room = np.zeros((min(TOGETHER, -(-count // SMALL_BLOCK)), size, size))
    room.reshape(-1, size * size)[:, p * (size + 1) : -1 : size + 1] = 1.0
    room[:, -1, -1] = 4.0  # more than the rest of the line can take away: all squares add up to 1
    return room


def _many_blocks(gram: np.ndarray, chunk: np.ndarray, room: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Values of many blocks at once, and the cross products (p + 1, p + 1) of all rows up to their end.

    With the cross products G, c of the rows up to a block's end, and that block's rows taken backwards, the Cholesky
    factor of [[G, X_b', c], [X_b, I, y_b], [c', y_b', .]] has L^-1 (y_b - X_b b) in its last line: eliminating G
    leaves I - X_b G^-1 X_b', the inverse of I + X_b P X_b', and the residuals after the block.
    """
    count, width = chunk.shape
    p = width - 1
    blocks = -(-count // SMALL_BLOCK)
    if count % SMALL_BLOCK:
        chunk = np.concatenate([chunk, np.zeros((blocks * SMALL_BLOCK - count, width))])
    x = chunk.reshape(blocks, SMALL_BLOCK, width)
    sums = np.empty((blocks + 1, width, width))
    sums[0] = gram
    np.matmul(x.transpose(0, 2, 1), x, out=sums[1:])
    sums = np.add.accumulate(sums, axis=0)
    bordered = room[:blocks]
    bordered[:, :p, :p] = sums[1:, :p, :p]
    bordered[:, p:-1, :p] = x[:, ::-1, :p]
    bordered[:, -1, :p] = sums[1:, p, :p]
    bordered[:, -1, p:-1] = x[:, ::-1, p]
    factors = np.linalg.cholesky(bordered)  # LinAlgError: rows that were told apart well are not any more
    return factors[:, -1, -2 : p - 1 : -1].reshape(-1)[:count], sums[-1]
