"""A fit on some of the rows only, from the whole fit's basis and residuals."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.linalg import lapack

from sheetfuncs.core.basis import DETERMINED, EPS, ROUNDINGS, column_means
from sheetfuncs.core.cross_products import FAR_APART, apart, coordinates
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.threads import few_threads


@dataclass(frozen=True)
class PartialFit:
    """rows: how many; rank: of the predictors there, the constant counted; rss: what they leave of the response."""

    rows: int
    rank: int
    rss: float


def fit_rows(fit: Fit, rows: slice | np.ndarray) -> PartialFit:
    """Fit the same model on these rows alone.

    The design's columns are combinations of the basis, and the response is fitted values plus residuals, so that what
    the rows' own fit leaves of the residuals is what it leaves of the response. The rank may be lower than the whole
    design's: a category that does not occur there, a predictor that does not vary.
    """
    basis = fit.basis
    rest = rest_of_rows(fit, rows)
    if rest is not None:
        count = rows.shape[0] if isinstance(rows, np.ndarray) else len(range(*rows.indices(fit.n)))
        return PartialFit(count, fit.p, rest)
    q, e = basis.q[rows], fit.residuals[rows]
    with few_threads(q.size):
        if basis.intercept:
            q = q - column_means(q)
            e = e - column_means(e)
        left, rank = apart(q, e)
        if left is None:
            left, rank = _by_pivoting(q, e, max(DETERMINED, ROUNDINGS * EPS * basis.amplification))
    return PartialFit(e.shape[0], rank + int(basis.intercept), float(left @ left))


def rest_of_rows(fit: Fit, rows: slice | np.ndarray) -> float | None:
    """The residual sum of squares of these rows' own fit, from cross products; None where that could cost digits, and
    where fewer coefficients than the whole design's can be told apart there."""
    if fit.told_apart_to > FAR_APART:
        return None
    part = fit.orthonormal[:, rows]
    with few_threads(part.size):
        found = coordinates(part @ part.T)
    return None if found is None else fit.rss * float(found[-1]) ** 2


def _by_pivoting(q: np.ndarray, e: np.ndarray, limit: float) -> tuple[np.ndarray, int]:
    """The same by Householder QR with column pivoting; directions no longer than limit are roundings."""
    factors, _, tau, _, _ = lapack.dgeqp3(np.array(q, order="F"), overwrite_a=1)
    width = min(factors.shape)
    rank = int(np.count_nonzero(np.abs(np.diag(factors)) > limit))
    directions = lapack.dorgqr(factors[:, :width], tau[:width], overwrite_a=1)[0][:, :rank]
    left = e - directions @ (directions.T @ e)
    return left - directions @ (directions.T @ left), rank
