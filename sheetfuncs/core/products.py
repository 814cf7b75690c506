"""Regression on all squares and products of predictors, by cross products that are summed block by block of rows.

The products of an orthonormal basis of the predictors span, with constant and levels, the same space as the products
of the predictors themselves, and are told apart far better. Cross products square what is left of a column, so that a
column of which little seems to be left is in doubt: a further pass takes the columns already kept off it, in the rows,
and measures the rest itself (Gram-Schmidt twice; Giraud, Langou and Rozloznik 2005, Computers Math. Applic. 50:1069).
"""

from __future__ import annotations

import numpy as np
from scipy.linalg import lapack, solve_triangular

from sheetfuncs.core.auxiliary import Addition
from sheetfuncs.core.basis import DETERMINED, EPS, ROUNDINGS, Basis
from sheetfuncs.core.cross_products import coordinates
from sheetfuncs.core.threads import few_threads

PRODUCTS_AT_MOST = 2_000
# What is left of a column, squared: below the first it is in doubt, below the second it costs digits.
IN_DOUBT = 1e-11
COSTS_DIGITS = 1e-4
_BLOCK = 1 << 16
_MOST_PASSES = 5


def number_of_products(k: int) -> int:
    """Squares and products of k columns."""
    return k * (k + 1) // 2


def explain_by_products(basis: Basis, target: np.ndarray) -> Addition:
    """How much of target (n,), of mean zero, a constant, the basis and all its products explain; rank of all of them.

    Memory: a block of rows and a few square matrices as wide as there are products, whatever n is.
    """
    with few_threads(0):
        gram, length = _scaled_products(basis, target)
        return _if_apart(gram, target) or _in_passes(basis, target, gram, length)


def explain_if_apart(basis: Basis, target: np.ndarray) -> Addition | None:
    """The same where all columns can be told apart well, as a rule; else None."""
    with few_threads(0):
        return _if_apart(_scaled_products(basis, target)[0], target)


def _scaled_products(basis: Basis, target: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Cross products over the columns' lengths, and these lengths."""
    gram = _cross_products(basis, target, None)
    length = _lengths(gram, basis)
    gram /= np.multiply.outer(length, length)
    return gram, length


def _if_apart(gram: np.ndarray, target: np.ndarray) -> Addition | None:
    found = coordinates(gram, 1.0)
    if found is None:
        return None
    squares = float(target @ target) * found**2
    return Addition(float(squares[:-1].sum()), float(squares[-1]), found.shape[0] - 1)


def _in_passes(basis: Basis, target: np.ndarray, gram: np.ndarray, length: np.ndarray) -> Addition:
    total = float(target @ target)
    share = max(DETERMINED, ROUNDINGS * EPS * basis.amplification)
    transform = np.diag(1.0 / length)
    kept, in_doubt = 1, IN_DOUBT  # the constant; limit of a squared share
    for _ in range(_MOST_PASSES):
        root = np.linalg.cholesky(gram[:kept, :kept])
        across = solve_triangular(root, gram[:kept, kept:], lower=True)
        left = gram[kept:, kept:] - across.T @ across
        size = np.maximum(np.diag(left)[:-1], 0.0)
        alive = np.flatnonzero(size > in_doubt)
        chosen, smallest = _independent(left[np.ix_(alive, alive)], scaled=in_doubt < IN_DOUBT)
        new = alive[chosen]
        others = np.setdiff1d(np.arange(size.shape[0]) if in_doubt == IN_DOUBT else alive, new)
        order = np.concatenate([np.arange(kept), kept + new, kept + others, [gram.shape[0] - 1]])
        kept += new.shape[0]
        gram, transform = gram[np.ix_(order, order)], transform[order]
        root = np.linalg.cholesky(gram[:kept, :kept])
        along = solve_triangular(root, gram[:kept, kept:], lower=True)
        rest = max(float(gram[-1, -1] - along[:, -1] @ along[:, -1]), 0.0)
        if not others.size and smallest > COSTS_DIGITS:
            break
        transform[:kept] = solve_triangular(root, transform[:kept], lower=True)
        transform[kept:] -= along.T @ transform[:kept]
        gram = _cross_products(basis, target, transform)
        in_doubt = share**2
    rest *= total
    return Addition(total - rest, rest, kept)


def _lengths(gram: np.ndarray, basis: Basis) -> np.ndarray:
    """Lengths of the columns before anything was taken off them: squares had their mean, 1, taken off already."""
    k = basis.q.shape[1]
    squares = 1 + k + np.concatenate([[0], np.cumsum(np.arange(k, 1, -1))])
    length = np.diag(gram).copy()
    length[squares] += basis.n
    length[length <= 0.0] = 1.0
    return np.sqrt(length)


def _independent(left: np.ndarray, *, scaled: bool) -> tuple[np.ndarray, float]:
    """Places of columns that can be told apart, by their cross products, and the smallest squared rest among them."""
    if not left.shape[0]:
        return np.empty(0, np.intp), 1.0
    if scaled:
        unit = np.sqrt(np.diag(left))
        left = left / np.outer(unit, unit)
    factor, pivot, rank, _ = lapack.dpstrf(np.asfortranarray(left), tol=IN_DOUBT, lower=1)
    return pivot[:rank].astype(np.intp) - 1, float(factor[rank - 1, rank - 1] ** 2) if rank else 1.0


def _cross_products(basis: Basis, target: np.ndarray, transform: np.ndarray | None) -> np.ndarray:
    """Cross products of constant, levels, products and target, or of their transforms (rows of `transform`)."""
    levels, n = basis.q.T, basis.n
    k = levels.shape[0]
    height = 2 + k + number_of_products(k)
    width = min(n, max(256, _BLOCK // height))
    rows = np.empty((height, width))
    size = height if transform is None else transform.shape[0]
    total = np.zeros((size, size))
    for start in range(0, n, width):
        part = slice(start, min(start + width, n))
        block = rows[:, : part.stop - start]
        block[0] = 1.0
        np.multiply(levels[:, part], np.sqrt(n), out=block[1:k + 1])
        block[-1] = target[part]
        place = k + 1
        for i in range(1, k + 1):
            np.multiply(block[i], block[i:k + 1], out=block[place:place + k + 1 - i])
            block[place] -= 1.0
            place += k + 1 - i
        if transform is not None:
            block = transform @ block
        total += block @ block.T
    return total
