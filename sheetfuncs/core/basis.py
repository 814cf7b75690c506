"""One orthogonal decomposition of the predictors, which everything else reuses.

Householder QR with column pivoting (Businger and Golub 1965; LAPACK dgeqp3) of the predictor columns, centred where
there is an intercept, and each scaled to unit length. Centring first means that a column like 1e9 + u keeps every
digit of u, and that neither an offset nor a unit can make a design look collinear.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache, cached_property

import numpy as np
from scipy.linalg import lapack

from sheetfuncs.core.threads import few_threads
from sheetfuncs.errors import CollinearPredictorsError, NoVariationError, TooFewRowsError

EPS = float(np.finfo(float).eps)
# A column that is this many roundings of its own values away from the others is determined by them.
ROUNDINGS = 16.0
# A column of which no more than this share is left is determined by the others.
DETERMINED = 1e-12
# Columns of which at least this share is left after the others are told apart without a closer look.
SUSPICIOUS = 1e-6
# Below this the squares of what is left of a column lose digits to the end of the number range.
SMALLEST = 1e-130


@dataclass(frozen=True, eq=False)
class Basis:
    """The predictors' column space.

    q: (n, k) orthonormal basis of the scaled (and centred) columns; with an intercept the constant direction 1/sqrt(n)
    is orthogonal to it and stands beside it. r: (k, k) upper triangular; pivot: the columns' order in r.
    scale, centre: (k,) length after centring, and what was taken off. raw_norm: (k,) length of the columns as given.
    """

    q: np.ndarray
    r: np.ndarray
    pivot: np.ndarray
    scale: np.ndarray
    centre: np.ndarray
    raw_norm: np.ndarray
    intercept: bool

    @cached_property
    def n(self) -> int:
        return self.q.shape[0]

    @cached_property
    def rank(self) -> int:
        """Dimension of the column space, the constant counted."""
        return self.q.shape[1] + int(self.intercept)

    @cached_property
    def leverage(self) -> np.ndarray:
        """Diagonal of the hat matrix, (n,)."""
        h = np.einsum("ij,ij->i", self.q, self.q)
        if self.intercept:
            h += 1.0 / self.n
        return np.minimum(h, 1.0)

    @cached_property
    def r_inverse(self) -> np.ndarray:
        """Inverse of r, rows in the columns' own order, (k, k): its product with its transpose is the inverse of the
        scaled columns' cross products, so that its squared row lengths are variance inflation factors."""
        k = self.r.shape[0]
        inverse = np.empty((k, k))
        if k:
            inverse[self.pivot] = back_substituted(self.r, np.eye(k))
        return inverse

    @cached_property
    def amplification(self) -> float:
        """By how much at most a rounding in the scaled columns grows in the column space: 1 for unrelated columns."""
        return max(1.0, float(np.linalg.norm(self.r_inverse)))

    @cached_property
    def scaled_coordinates(self) -> np.ndarray:
        """(k, k) coordinates on q of the scaled columns, in their own order."""
        columns = np.empty_like(self.r)
        columns[:, self.pivot] = self.r
        return columns

    @property
    def cross_products(self) -> np.ndarray:
        """(k, k) cross products of the scaled columns in their own order; with an intercept their correlations."""
        return self.scaled_coordinates.T @ self.scaled_coordinates

    @cached_property
    def coefficient_root(self) -> np.ndarray:
        """(p, p) matrix B: coefficients = B @ (response's coordinates on [1/sqrt(n), q]); (X'X)^-1 = B B'."""
        slopes = self.r_inverse / self.scale[:, None]
        if not self.intercept:
            return slopes
        root = np.zeros((self.rank, self.rank))
        root[1:, 1:] = slopes
        root[0, 0] = 1.0 / np.sqrt(self.n)
        root[0, 1:] = -self.centre @ slopes
        return root

    @cached_property
    def root_lengths(self) -> np.ndarray:
        """(p,): roots of the diagonal of (X'X)^-1."""
        root = self.coefficient_root
        return np.sqrt(np.einsum("ij,ij->i", root, root))

    def project_out(self, values: np.ndarray) -> np.ndarray:
        """What is left of values (n,) or (n, m) after regression on this basis; twice, so that it is orthogonal."""
        left = np.array(values, dtype=np.float64)
        with few_threads(self.q.size):
            for _ in range(2):
                if self.intercept:
                    left -= column_means(left)
                left -= self.q @ (self.q.T @ left)
        return left


def factorize(columns: np.ndarray, names: Sequence[str], *, intercept: bool) -> Basis:
    """Decompose predictor columns (n, k).

    Refused (CollinearPredictorsError, naming the columns): a column that is constant beside an intercept, all zero,
    or determined by the others. The measure is the column itself: what is left of it after the others, against the
    roundings that its own values carry. Refused too: fewer rows than coefficients, and values too large or too small
    for their squares.
    """
    n, k = columns.shape
    if n < k + int(intercept):
        raise TooFewRowsError(
            f"{n} usable row{'s' if n != 1 else ''} for {k + int(intercept)} coefficients: at least "
            f"{k + int(intercept) + 1} rows are needed. Add rows or use fewer predictors."
        )
    with few_threads(columns.size):
        with np.errstate(over="ignore", invalid="ignore"):
            raw_norm = column_lengths(columns)
            work, centre = centred(columns) if intercept else (columns.copy(), np.zeros(k))
            scale = column_lengths(work)
        if not np.isfinite(raw_norm).all():
            raise NoVariationError(
                "The numbers are too large for their squares to be computed: express them in a larger unit."
            )
        _refuse_empty_columns(columns, names, scale, raw_norm, intercept)
        work /= scale
        q, r, pivot = _pivoted_qr(work)
        limit = EPS * ROUNDINGS * np.sqrt(n) * np.maximum(raw_norm / scale, 1.0)
        _refuse_dependent_columns(names, r, pivot, limit[pivot], intercept)
    return Basis(q, r, pivot, scale, np.asarray(centre), raw_norm, intercept)


def centred(values: np.ndarray) -> tuple[np.ndarray, np.ndarray | float]:
    """Values minus their mean, and the mean; in two steps, so that a large offset costs no digit."""
    first = column_means(values)
    left = values - first
    second = column_means(left)
    left -= second
    return left, first + second


def column_means(values: np.ndarray) -> np.ndarray | float:
    """Means over the rows of (n,) or (n, m): as numpy's own, which takes four times as long on few rows."""
    return np.add.reduce(values, axis=0) / values.shape[0]


def column_lengths(columns: np.ndarray) -> np.ndarray:
    """Euclidean length of each column (n, k), (k,); infinite where the squares are too large."""
    return np.sqrt([column @ column for column in columns.T]) if columns.shape[1] else np.empty(0)


def _pivoted_qr(work: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    n, k = work.shape
    if k == 0:
        return np.empty((n, 0)), np.empty((0, 0)), np.empty(0, np.intp)
    factors, pivot, tau, _, info = lapack.dgeqp3(np.asfortranarray(work), overwrite_a=1)
    if info != 0:
        raise NoVariationError("The predictors could not be factorized: look for extreme values among them.")
    r = upper_triangle(factors[:k])
    q, _, _ = lapack.dorgqr(factors, tau, overwrite_a=1)
    return q, r, pivot.astype(np.intp) - 1


def upper_triangle(values: np.ndarray) -> np.ndarray:
    """values (m, k), m at most k, with zeros below the diagonal."""
    return np.where(_upper(values.shape[1])[: values.shape[0]], values, 0.0)


@cache
def _upper(width: int) -> np.ndarray:
    """(width, width) bool: the places of the upper triangle, which numpy's own function makes anew each time."""
    return np.triu(np.ones((width, width), bool))


def _refuse_empty_columns(
    columns: np.ndarray, names: Sequence[str], scale: np.ndarray, raw_norm: np.ndarray, intercept: bool
) -> None:
    for j, name in enumerate(names):
        if raw_norm[j] < SMALLEST:
            if columns[:, j].any():
                raise NoVariationError(
                    f"The values of {name} are too small for their squares to be computed: express it in a smaller "
                    "unit."
                )
            raise CollinearPredictorsError(f"{name} is zero in every used row: leave it out.", (name,))
        if intercept and scale[j] <= EPS * ROUNDINGS * raw_norm[j]:
            raise CollinearPredictorsError(
                f"{name} has the same value in every used row, so it cannot be told from the intercept: "
                "leave it out, or fit without an intercept.", (name,),
            )


def _refuse_dependent_columns(
    names: Sequence[str], r: np.ndarray, pivot: np.ndarray, limit: np.ndarray, intercept: bool
) -> None:
    # Roundings of the columns that determine it count too, as far as they take part; only columns of which little is
    # left need that look.
    for rank in np.flatnonzero(np.abs(r.diagonal()) <= np.maximum(SUSPICIOUS, limit.max(initial=0.0) * r.shape[0])):
        weights = back_substituted(r[:rank, :rank], r[:rank, rank])
        if abs(r[rank, rank]) <= limit[rank] + np.abs(weights) @ limit[:rank]:
            _refuse_dependent_column(names, pivot, int(rank), weights, intercept)


def _refuse_dependent_column(
    names: Sequence[str], pivot: np.ndarray, rank: int, weights: np.ndarray, intercept: bool
) -> None:
    # Pivoting decides which column comes out last; the sentence names all that move together with it.
    partners = [int(pivot[i]) for i in np.flatnonzero(np.abs(weights) > 1e-6)]
    together = tuple(names[j] for j in sorted([int(pivot[rank]), *partners]))
    constant = " and the intercept" if intercept else ""
    if len(together) == 1:
        raise CollinearPredictorsError(f"{together[0]} is determined by the intercept: leave it out.", together)
    raise CollinearPredictorsError(
        f"{together[-1]} is determined exactly by {listed(together[:-1])}{constant}: leave one of them out.", together
    )


def back_substituted(r: np.ndarray, right: np.ndarray) -> np.ndarray:
    """Solve r x = right for an upper triangular r (k, k) without zeros on its diagonal."""
    return lapack.dtrtrs(r, right)[0] if r.shape[0] else np.zeros(right.shape)


def listed(names: Sequence[str]) -> str:
    """"a, b and c"."""
    return names[0] if len(names) == 1 else ", ".join(names[:-1]) + " and " + names[-1]
