"""Least squares with residuals in extended precision, for designs and responses that cost plain doubles their digits.

Iterative refinement of r + Zb = y, Z'r = 0 with every residual of this system in double-double arithmetic and every
correction from the decomposition that is there (Bjorck 1967, BIT 7:1-21; Higham 2002, Accuracy and Stability of
Numerical Algorithms, section 20.5). What comes out is the solution for the numbers as they stand, rounded once.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property
from math import sqrt

import numpy as np
from scipy.linalg import lapack

from sheetfuncs.core.basis import EPS, Basis, back_substituted
from sheetfuncs.core.design import Design
from sheetfuncs.core.double_double import Pair, add, negative, product, quotient, total, two_prod, two_sum

# Relative errors above this call for extended precision: 13 digits are to be right.
TOLERANCE = 1e-13
# By how much the columns may amplify a rounding before the decomposition itself is refined.
AMPLIFICATION = 16.0
_STEPS = 12
# A step that changes no digit of a double, and the size below which a residual is nothing.
_SETTLED = 2.0**-57
_FLOOR = 1e-30
# Elements of a block: all its temporaries stay in the processor's cache.
_BLOCK = 16_384


@dataclass(frozen=True, eq=False)
class RefinedBasis(Basis):
    """A Basis of ill-conditioned columns that is right to the last digits of double precision.

    inverse: (k, k), see r_inverse. constant_row: (k,), minus the centre's coordinates in the coefficients.
    """

    inverse: np.ndarray
    constant_row: np.ndarray

    @cached_property
    def r_inverse(self) -> np.ndarray:
        return self.inverse

    @cached_property
    def coefficient_root(self) -> np.ndarray:
        slopes = self.inverse / self.scale[:, None]
        if not self.intercept:
            return slopes
        root = np.zeros((self.rank, self.rank))
        root[1:, 1:] = slopes
        root[0, 0] = 1.0 / np.sqrt(self.n)
        root[0, 1:] = self.constant_row
        return root


def ill_conditioned(basis: Basis) -> bool:
    """Whether the columns amplify roundings so much that their decomposition loses digits."""
    # Pivoting puts the least of what is left of a column last.
    return basis.r.shape[0] > 1 and AMPLIFICATION * abs(basis.r.item(-1)) < abs(basis.r.item(0))


def refined_basis(basis: Basis, columns: np.ndarray) -> RefinedBasis:
    """The same decomposition of columns (n, k), right to the last digits however ill-conditioned they are.

    The columns times the inverse of the triangular factor that is there, in extended precision, are orthonormal up to
    its errors; the Cholesky factor of their cross products, near the identity, corrects both.
    """
    n, k = columns.shape
    scaled = _Scaled(columns, basis.scale, constant=False)
    steep = back_substituted(basis.r, np.eye(k)) / scaled.length[basis.pivot][:, None]
    zero = np.zeros(k)
    centre = shift = (zero, zero)
    if basis.intercept:
        for _, block in scaled.blocks():
            centre = add(centre, total((block, np.zeros_like(block)), axis=1))
        centre = quotient(centre, float(n))
        spread = two_prod(steep, centre[0][basis.pivot][:, None])
        shift = total((spread[0], spread[1] + steep * centre[1][basis.pivot][:, None]))
    near = np.empty((n, k))
    for rows, block in scaled.blocks():
        near[rows] = _triangular_product(block[basis.pivot], steep, negative(shift)).T
    root = np.linalg.cholesky(near.T @ near)
    across = lapack.dtrtri(root, lower=1)[0].T
    inverse = np.empty((k, k))
    inverse[basis.pivot] = (steep * scaled.length[basis.pivot][:, None]) @ across
    r = root.T @ lapack.dtrtri(steep * scaled.length[basis.pivot][:, None])[0]
    return RefinedBasis(
        near @ across, r, basis.pivot, basis.scale, centre[0] / scaled.power if basis.intercept else basis.centre,
        basis.raw_norm, basis.intercept, inverse, -(shift[0] @ across),
    )


def _triangular_product(block: np.ndarray, steep: np.ndarray, start: Pair) -> np.ndarray:
    """block' steep + start for block (k, m) and an upper triangular steep, transposed: (k, m), rounded once."""
    k, m = block.shape
    high = np.repeat(start[0][:, None], m, axis=1)
    low = np.repeat(start[1][:, None], m, axis=1)
    for i in range(k):
        high[i:], low[i:] = add((high[i:], low[i:]), two_prod(block[i], steep[i, i:, None]))
    return high + low


def loses_digits(
    basis: Basis, total_squares: float, rss: float, noise: float, coefficients: np.ndarray, mean: float
) -> bool:
    """Whether plain double precision would leave residuals or coefficients with fewer digits than it can.

    total_squares: of the (centred) response. A coefficient below its standard error is measured against that.
    """
    n, k = basis.q.shape
    if not k:
        return False
    if isinstance(basis, RefinedBasis):
        return True
    # Roundings in the residuals and the slopes relative to the residuals.
    if EPS**2 * total_squares > (TOLERANCE * basis.r.item(-1)) ** 2 * rss:
        return True
    if not basis.intercept:
        return False
    # The intercept: the mean of the response less what the slopes make of the predictors' means.
    least = TOLERANCE * max(abs(coefficients.item(0)), sqrt(rss) / n)
    if noise <= least * sqrt(n):
        return False
    return EPS * (abs(mean) + float(np.abs(basis.centre) @ np.abs(coefficients[1:]))) > least


def refined_solution(
    design: Design, basis: Basis, coefficients: np.ndarray, residuals: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Coefficients (p,) and residuals (n,), each rounded once from extended precision.

    Where the steps do not converge, which takes columns at the limit of what is told apart, they stay as given.
    """
    scaled = _Scaled(design.columns, basis.scale, constant=basis.intercept)
    unit = _power_of_two(np.abs(design.response).max())
    y = design.response * unit
    b: Pair = (coefficients * (unit / scaled.powers), np.zeros(coefficients.shape))
    r: Pair = (residuals * unit, np.zeros(residuals.shape))
    whole, before = float(np.linalg.norm(y)), np.inf
    for _ in range(_STEPS):
        db, dr = _correction(scaled, basis, *_defects(scaled, y, b, r))
        size = float(np.linalg.norm(db[-scaled.length.shape[0]:] * scaled.length) + np.linalg.norm(dr))
        if size > before:
            if size > EPS * whole:
                return coefficients, residuals
            break
        b, r = add(b, (db, np.zeros_like(db))), add(r, (dr, np.zeros_like(dr)))
        if _small(db, b[0], _FLOOR * whole) and _small(np.abs(dr).max(), np.abs(r[0]).max(), _FLOOR * whole):
            break
        before = 0.5 * size
    return b[0] * (scaled.powers / unit), r[0] / unit


def _small(step: np.ndarray, value: np.ndarray, floor: float) -> bool:
    return bool((np.abs(step) <= np.maximum(_SETTLED * np.abs(value), floor)).all())


class _Scaled:
    """Columns (n, k) in units of powers of two, so that products neither overflow nor lose their error terms."""

    def __init__(self, columns: np.ndarray, scale: np.ndarray, *, constant: bool):
        self.columns, self.constant = columns, constant
        self.power = _power_of_two(scale)
        self.powers = np.concatenate([[1.0], self.power]) if constant else self.power
        self.length = scale * self.power

    def blocks(self) -> Iterator[tuple[slice, np.ndarray]]:
        """Rows, and these rows of the columns (after a column of ones where there is a constant), transposed."""
        n, k = self.columns.shape
        size = max(1, _BLOCK // max(k, 1))
        for start in range(0, n, size):
            rows = slice(start, min(start + size, n))
            block = np.ones((k + int(self.constant), rows.stop - rows.start))
            np.multiply(self.columns[rows].T, self.power[:, None], out=block[int(self.constant):])
            yield rows, block


def _power_of_two(size: np.ndarray) -> np.ndarray:
    """The power of two that brings size to [0.5, 1)."""
    return np.ldexp(1.0, -np.frexp(size)[1])


def _defects(scaled: _Scaled, y: np.ndarray, b: Pair, r: Pair) -> tuple[np.ndarray, np.ndarray]:
    """What is left of both equations: y - r - Zb (n,) and -Z'r (p,), computed in extended precision, rounded once."""
    off = np.empty(y.shape)
    along: Pair = (np.zeros(b[0].shape), np.zeros(b[0].shape))
    for rows, block in scaled.blocks():
        here = (r[0][rows], r[1][rows])
        fitted = total(product(block, (b[0][:, None], b[1][:, None])))
        off[rows] = add(two_sum(y[rows], -fitted[0]), (-here[0], -fitted[1] - here[1]))[0]
        along = add(along, total(product(block, here), axis=1))
    return off, -along[0]


def _correction(
    scaled: _Scaled, basis: Basis, off: np.ndarray, along: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """db and dr with dr + Z db = off and Z'dr = along, by the decomposition, in plain doubles."""
    q, n = basis.q, basis.n
    centre = basis.centre * scaled.power
    mean = aside = 0.0
    if basis.intercept:
        mean, aside = float(off.mean()), float(along[0]) / n
        along = along[1:] - centre * along[0]
    target = lapack.dtrtrs(basis.r, (along / scaled.length)[basis.pivot], trans=1)[0]
    projected = q.T @ off
    dr = off - q @ (projected - target) - (mean - aside)
    slopes = np.empty(target.shape)
    slopes[basis.pivot] = back_substituted(basis.r, projected - target)
    slopes /= scaled.length
    if not basis.intercept:
        return slopes, dr
    return np.concatenate([[mean - aside - centre @ slopes], slopes]), dr
