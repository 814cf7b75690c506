"""Single rows: leverage, studentized residuals, and how far each row moves the fit. Closed forms, no refits."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import stdtr

from sheetfuncs.core.auxiliary import refused
from sheetfuncs.core.basis import ROUNDINGS, listed
from sheetfuncs.core.fit import Fit, once_per_fit
from sheetfuncs.core.results import DoesNotApply, Result, Statistic

# Where a row holds this share of the residual variance, that of the others is computed anew instead of subtracted.
DOMINATES = 0.999
BELONGS = "the row with the largest studentized residual belongs with the others"


@dataclass(frozen=True, eq=False)
class RowMeasures:
    """Arrays (n,), NaN where undefined: rows of leverage 1, or a fit that leaves nothing.

    internally_studentized: e / (s sqrt(1 - h)); externally_studentized: the same with the s of the other rows;
    leave_one_out: e / (1 - h), the error when the row is predicted from the others; cooks_distance, dffits.
    covratio: determinant of the coefficients' covariance without the row over that with it: above 1, the row makes the
    coefficients more certain. sigma_without: residual standard deviation of the fit without the row.
    spoils_perfect_fit: bool, rows without which the others fit perfectly: externally studentized they are infinitely
    far off, and stand as NaN.
    """

    leverage: np.ndarray
    internally_studentized: np.ndarray
    externally_studentized: np.ndarray
    leave_one_out: np.ndarray
    cooks_distance: np.ndarray
    dffits: np.ndarray
    covratio: np.ndarray
    sigma_without: np.ndarray
    spoils_perfect_fit: np.ndarray

    @property
    def press(self) -> float:
        """Sum of squared leave-one-out errors (Allen 1974, Technometrics 16:125-127); NaN where one is undefined."""
        return float(self.leave_one_out @ self.leave_one_out)


@once_per_fit
def row_measures(fit: Fit) -> RowMeasures:
    """Measures of every row (Belsley, Kuh and Welsch 1980, Regression Diagnostics, chapter 2; Cook 1977)."""
    h = fit.leverage
    if not fit.has_error_bars:
        nothing = np.full(fit.n, np.nan)
        return RowMeasures(h, nothing, nothing, nothing, nothing, nothing, nothing, nothing, np.zeros(fit.n, bool))
    gap = 1.0 - h
    if fit.some_fit_themselves:
        gap[fit.fits_itself] = np.nan
    root = np.sqrt(gap)
    leave_one_out = fit.residuals / gap
    internal = fit.residuals / (fit.sigma * root)
    without = _sigma_without(fit, internal, leave_one_out)
    external = fit.residuals / (np.where(without > 0.0, without, np.nan) * root)
    ratio = h / gap
    return RowMeasures(
        h, internal, external, leave_one_out, internal**2 * ratio / fit.p, external * np.sqrt(ratio),
        _covratio(fit, without, gap), without, without == 0.0,
    )


def _covratio(fit: Fit, without: np.ndarray, gap: np.ndarray) -> np.ndarray:
    """(s(i)/s)^(2p) / (1 - h_i) (Belsley, Kuh and Welsch 1980, equation 2.36, number from memory); by its logarithm,
    so that many coefficients do not overflow before the leverage makes up for it."""
    with np.errstate(divide="ignore"):
        return np.exp(2.0 * fit.p * np.log(without / fit.sigma) - np.log(gap))


def _sigma_without(fit: Fit, internal: np.ndarray, leave_one_out: np.ndarray) -> np.ndarray:
    """(n,) residual standard deviation of the fit without each row; 0 where the others fit perfectly, NaN where there
    is no such fit or no degree of freedom is left in it.

    s(i)^2 = s^2 (df - r_i^2) / (df - 1) (Belsley, Kuh and Welsch 1980, equation 2.8, number from memory). For a row
    that holds nearly all of rss the difference would be rounding, so that there the residuals of the others are formed:
    e_j + h_ij e_i / (1 - h_i).
    """
    if fit.df < 2:
        return np.full(fit.n, np.nan)
    share = internal**2 / fit.df
    without = fit.sigma * np.sqrt(np.maximum(1.0 - share, 0.0) * (fit.df / (fit.df - 1)))
    dominating = np.flatnonzero(share > DOMINATES)
    if dominating.size:
        basis = fit.basis
        hat = basis.q @ basis.q[dominating].T + (1.0 / fit.n if basis.intercept else 0.0)
        others = fit.residuals[:, None] + hat * leave_one_out[dominating]
        others[dominating, np.arange(dominating.size)] = 0.0
        length = np.linalg.norm(others, axis=0)
        noise = ROUNDINGS * fit.noise / (1.0 - fit.leverage[dominating])
        without[dominating] = np.where(length > noise, length / np.sqrt(fit.df - 1), 0.0)
    return without


def outlier_test(fit: Fit) -> Result:
    """The largest externally studentized residual, t with n - p - 1 degrees of freedom, two-sided, its p multiplied by
    the number of rows tested (Bonferroni; Cook and Weisberg 1982, Residuals and Influence in Regression, section
    2.2.2, section from memory) and at most 1.

    details: row_of_used (its place from 1 among the used rows), rstudent, unadjusted_p, bonferroni_p, n_tests.
    """
    variant = "largest externally studentized residual, Bonferroni"
    refusal = refused(fit, "outlier_test", {}, variant, BELONGS)
    if refusal:
        return refusal
    measures = row_measures(fit)
    external = measures.externally_studentized

    def cannot(reason: str) -> DoesNotApply:
        return DoesNotApply(
            method="outlier_test", args={}, variant=variant, null=BELONGS, reason=reason, cell_error="#NUM!"
        )

    if measures.spoils_perfect_fit.any():
        rows = [str(int(row)) for row in fit.design.rows[measures.spoils_perfect_fit]]
        return cannot(
            f"Without row {rows[0]} the other rows fit perfectly, so that nothing measures how far it lies from them: "
            "look at that row first." if len(rows) == 1 else
            f"Without any one of the rows {listed(rows)} the others fit perfectly, so that nothing measures how far "
            "they lie off: look at those rows first."
        )
    tested = np.isfinite(external)
    if not tested.any():
        return cannot("No row can be compared with what the others predict: too few rows are left without it.")
    place = int(np.argmax(np.where(tested, np.abs(external), -1.0)))
    single = 2.0 * float(stdtr(fit.df - 1, -abs(external[place])))
    count = int(tested.sum())
    adjusted = min(1.0, single * count)
    return Statistic(
        method="outlier_test", args={}, variant=variant, statistic=float(external[place]), df=fit.df - 1,
        p=adjusted, null=BELONGS, note=f"Row {int(fit.design.rows[place])}.",
        details={
            "row_of_used": place + 1, "rstudent": float(external[place]), "unadjusted_p": single,
            "bonferroni_p": adjusted, "n_tests": count,
        },
    )


def press(fit: Fit) -> Result:
    """Sum of squared leave-one-out errors (Allen 1974, Technometrics 16:125-127); no test.

    details: predicted_r_squared, 1 - press / tss: the share of the response's variation that is predicted by fits
    which did not see it; it can be negative.
    """
    variant = "leave-one-out errors, squared and summed"
    refusal = refused(fit, "press", {}, variant, "")
    if refusal:
        return refusal
    if fit.some_fit_themselves:
        rows = [str(int(row)) for row in fit.design.rows[fit.fits_itself]]
        return DoesNotApply(
            method="press", args={}, variant=variant, cell_error="#NUM!",
            reason=f"Leverage 1: row{'s' if len(rows) > 1 else ''} {listed(rows)} cannot be predicted from the others.",
        )
    total = row_measures(fit).press
    return Statistic(
        method="press", args={}, variant=variant, statistic=total,
        details={"press": total, "predicted_r_squared": 1.0 - total / fit.tss},
    )
