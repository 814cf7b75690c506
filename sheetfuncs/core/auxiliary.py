"""Auxiliary regressions: how much further columns explain, and the refusals that tests share."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.linalg import lapack

from sheetfuncs.core.basis import DETERMINED, EPS, ROUNDINGS, Basis, column_lengths
from sheetfuncs.core.cross_products import apart
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.results import DoesNotApply
from sheetfuncs.core.threads import few_threads


@dataclass(frozen=True)
class Addition:
    """What added columns explain of residuals: part, and rest, which they leave (sums of squares); rank they add."""

    part: float
    rest: float
    rank: int

    def fits_perfectly(self, noise: float) -> bool:
        """Whether the rest is rounding: noise is the length of the roundings that the residuals carry."""
        return self.rest <= (ROUNDINGS * noise) ** 2 + DETERMINED**2 * self.part


def add_columns(basis: Basis, residuals: np.ndarray, columns: np.ndarray) -> Addition:
    """Add columns (n, m) to a regression on basis that left residuals (n,), orthogonal to it.

    Each column is measured against what it was before the basis was taken off it, so that one that the basis or the
    other columns determine adds nothing, and degrees of freedom are the rank and not the number of columns.
    """
    with few_threads(basis.q.size + columns.size):
        before = column_lengths(columns)
        left = basis.project_out(columns)
        after = column_lengths(left)
        # Roundings of a column, relative to what is left of it.
        share = np.maximum(DETERMINED, ROUNDINGS * EPS * basis.amplification) * before
        kept = np.flatnonzero(after > share)
        if not kept.size:
            return Addition(0.0, float(residuals @ residuals), 0)
        scaled = left / after if kept.size == after.size else left[:, kept] / after[kept]
        if share[kept].max(initial=0.0) < 1e-6 * after[kept].min():
            unexplained, _ = apart(scaled, residuals)
            if unexplained is not None:
                explained = residuals - unexplained
                return Addition(float(explained @ explained), float(unexplained @ unexplained), kept.size)
        factors, pivot, tau, _, _ = lapack.dgeqp3(np.asfortranarray(scaled), overwrite_a=1)
        diagonal = np.abs(np.diag(factors))
        limit = (share[kept] / after[kept])[pivot[: diagonal.shape[0]] - 1]
        rank = int(np.count_nonzero(diagonal > np.maximum(limit, DETERMINED)))
        q = lapack.dorgqr(factors[:, : diagonal.shape[0]], tau, overwrite_a=1)[0][:, :rank]
        along = q.T @ residuals
        rest = residuals - q @ along
    return Addition(float(along @ along), float(rest @ rest), rank)


def refused(fit: Fit, method: str, args: Mapping[str, Any], variant: str, null: str) -> DoesNotApply | None:
    """The refusal that a fit without anything left to test gives to every test; None where there is something."""
    reason = fit.nothing_left()
    if not reason:
        return None
    return DoesNotApply(method=method, args=args, variant=variant, null=null, reason=reason, cell_error="#NUM!")
