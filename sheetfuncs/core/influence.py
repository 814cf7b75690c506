"""Single rows: leverage, studentized residuals, and how far each row moves the fit. Closed forms, no refits."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import stdtr

from sheetfuncs.core.auxiliary import refused
from sheetfuncs.core.basis import EPS
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.results import DoesNotApply, Result, Statistic

BELONGS = "the row with the largest studentized residual belongs with the others"


@dataclass(frozen=True, eq=False)
class RowMeasures:
    """Arrays (n,), NaN where undefined: rows of leverage 1, or a fit that leaves nothing.

    internally_studentized: e / (s sqrt(1 - h)); externally_studentized: the same with the s of the other rows;
    leave_one_out: e / (1 - h), the error when the row is predicted from the others; cooks_distance, dffits.
    """

    leverage: np.ndarray
    internally_studentized: np.ndarray
    externally_studentized: np.ndarray
    leave_one_out: np.ndarray
    cooks_distance: np.ndarray
    dffits: np.ndarray

    @property
    def press(self) -> float:
        """Sum of squared leave-one-out errors (Allen 1974, Technometrics 16:125-127); NaN where one is undefined."""
        return float(self.leave_one_out @ self.leave_one_out)


def row_measures(fit: Fit) -> RowMeasures:
    """Measures of every row (Belsley, Kuh and Welsch 1980, Regression Diagnostics, chapter 2; Cook 1977)."""
    h = fit.leverage
    if not fit.has_error_bars:
        nothing = np.full(fit.n, np.nan)
        return RowMeasures(h, nothing, nothing, nothing, nothing, nothing)
    gap = np.where(fit.fits_itself, np.nan, 1.0 - h)
    leave_one_out = fit.residuals / gap
    internal = fit.residuals / (fit.sigma * np.sqrt(gap))
    external = _externally_studentized(fit, internal)
    ratio = h / gap
    return RowMeasures(
        h, internal, external, leave_one_out, internal**2 * ratio / fit.p, external * np.sqrt(ratio)
    )


def _externally_studentized(fit: Fit, internal: np.ndarray) -> np.ndarray:
    """t_i = r_i sqrt((df - 1) / (df - r_i^2)); undefined where the other rows fit perfectly."""
    if fit.df < 2:
        return np.full(fit.n, np.nan)
    left = fit.df - internal**2
    left = np.where(left > 1000 * EPS * fit.df, left, np.nan)
    return internal * np.sqrt((fit.df - 1) / left)


def outlier_test(fit: Fit) -> Result:
    """The largest externally studentized residual, t with n - p - 1 degrees of freedom, two-sided, its p multiplied by
    the number of rows tested (Bonferroni; Cook and Weisberg 1982, Residuals and Influence in Regression, section
    2.2.2, section from memory) and at most 1.

    details: row_of_used (its place from 1 among the used rows), unadjusted_p, n_tests.
    """
    variant = "largest externally studentized residual, Bonferroni"
    refusal = refused(fit, "outlier_test", {}, variant, BELONGS)
    if refusal:
        return refusal
    external = row_measures(fit).externally_studentized
    tested = np.isfinite(external)
    if not tested.any():
        return DoesNotApply(
            method="outlier_test", args={}, variant=variant, null=BELONGS,
            reason="No row can be compared with what the others predict: too few rows are left without it.",
        )
    place = int(np.argmax(np.where(tested, np.abs(external), -1.0)))
    single = 2.0 * float(stdtr(fit.df - 1, -abs(external[place])))
    count = int(tested.sum())
    return Statistic(
        method="outlier_test", args={}, variant=variant, statistic=float(external[place]), df=fit.df - 1,
        p=min(1.0, single * count), null=BELONGS, note=f"Row {int(fit.design.rows[place])}.",
        details={"row_of_used": place + 1, "unadjusted_p": single, "n_tests": count},
    )
