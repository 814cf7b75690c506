"""Auxiliary regressions: how much further columns explain, and the refusal that every test shares."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from scipy.linalg import lapack

from sheetfuncs.core.basis import EPS
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.results import DoesNotApply
from sheetfuncs.core.threads import few_threads


def explained(target: np.ndarray, columns: np.ndarray) -> tuple[float, int]:
    """Sum of squares of target (n,) that columns (n, m) explain, and the columns' rank.

    Columns are scaled to unit length first; those that others determine (to within a few thousand roundings) do not
    count, so that degrees of freedom are the rank and not the number of columns.
    """
    lengths = np.linalg.norm(columns, axis=0)
    kept = lengths > 0
    if not kept.any():
        return 0.0, 0
    with few_threads(columns.size):
        factors, _, tau, _, _ = lapack.dgeqp3(np.asfortranarray(columns[:, kept] / lengths[kept]))
        diagonal = np.abs(np.diag(factors))
        rank = int(np.count_nonzero(diagonal > 4096 * EPS * diagonal[0]))
        q, _, _ = lapack.dorgqr(factors[:, : diagonal.shape[0]], tau)
        along = q[:, :rank].T @ target
    return float(along @ along), rank


def refused(fit: Fit, method: str, args: Mapping[str, Any], variant: str, null: str) -> DoesNotApply | None:
    """The refusal that a fit without anything left to test gives to every test; None where there is something."""
    reason = fit.nothing_left()
    if not reason:
        return None
    return DoesNotApply(method=method, args=args, variant=variant, null=null, reason=reason, cell_error="#NUM!")
