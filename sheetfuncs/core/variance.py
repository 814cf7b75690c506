"""Constant variance: are the errors equally wide whatever the predictors are?"""

from __future__ import annotations

from math import sqrt

from sheetfuncs.core.auxiliary import refused
from sheetfuncs.core.basis import EPS, ROUNDINGS
from sheetfuncs.core.fit import Fit, once_per_fit
from sheetfuncs.core.results import DoesNotApply, Result, Statistic
from sheetfuncs.core.tails import chi_square_tail

CONSTANT = "the errors have the same variance whatever the predictors are"


def breusch_pagan(fit: Fit, *, studentize: bool = True) -> Result:
    """Breusch-Pagan test with all predictors of the design as possible causes of unequal variance.

    studentize True: n R2 of the squared residuals on the design (Koenker 1981, J. Econometrics 17:107-112), which
    does not lean on normal errors. False: half the explained sum of squares of e^2/sigma^2 (Breusch and Pagan 1979,
    Econometrica 47:1287-1294; sigma^2 = rss/n), which does. Chi-square with p - 1 degrees of freedom. Without an
    intercept the auxiliary regression has no constant either.
    """
    args = {"studentize": studentize, "z": "all regressors"}
    variant = f"{'studentized' if studentize else 'original'}, on all predictors"
    refusal = refused(fit, "breusch_pagan", args, variant, CONSTANT)
    if refusal:
        return refusal
    df = fit.basis.rank - 1
    if df < 1:
        return DoesNotApply(
            method="breusch_pagan", args=args, variant=variant, null=CONSTANT,
            reason="The test needs at least one predictor beside the intercept"
                   + ("." if fit.design.intercept else ", or two predictors without one."),
        )
    part, total = _explained_squares(fit)
    if total <= fit.n * (ROUNDINGS * fit.relative_noise) ** 2:
        return DoesNotApply(
            method="breusch_pagan", args=args, variant=variant, null=CONSTANT, cell_error="#NUM!",
            reason="All residuals have the same size, so their squares show no variation to explain.",
        )
    statistic = fit.n * part / total if studentize else part / 2.0
    note = "" if fit.design.intercept else "Auxiliary regression without a constant, as the fit has none."
    return Statistic(
        method="breusch_pagan", args=args, variant=variant, statistic=statistic, df=df,
        p=chi_square_tail(df, statistic), null=CONSTANT, note=note,
    )


@once_per_fit
def _explained_squares(fit: Fit) -> tuple[float, float]:
    """Sums of squares of squared residuals over their mean, less 1: what the predictors explain, and all of it."""
    ratio = fit.residuals**2 / (fit.rss / fit.n) - 1.0
    along = fit.basis.q.T @ ratio
    return float(along @ along), float(ratio @ ratio)


def breusch_pagan_fitted(fit: Fit) -> Result:
    """The original test with the fitted values as the one possible cause (Cook and Weisberg 1983, Biometrika 70:1-10).

    Half the sum of squares that the fitted values explain of e^2/sigma^2; chi-square with 1 degree of freedom.
    """
    args, variant = {"z": "fitted values", "studentize": False}, "original, on the fitted values"
    refusal = refused(fit, "ncv_test_fitted", args, variant, CONSTANT)
    if refusal:
        return refusal
    direction = fit.fitted - fit.fitted.mean()
    length = float(direction @ direction)
    if length <= (64.0 * EPS * float(abs(fit.fitted).max())) ** 2 * fit.n:
        return DoesNotApply(
            method="ncv_test_fitted", args=args, variant=variant, null=CONSTANT,
            reason="The fitted values do not vary, so they can explain no variance.",
        )
    part = (float(direction @ (fit.residuals**2 / (fit.rss / fit.n))) / sqrt(length)) ** 2
    return Statistic(
        method="ncv_test_fitted", args=args, variant=variant, statistic=part / 2.0, df=1,
        p=chi_square_tail(1, part / 2.0), null="the errors have the same variance whatever the fitted value is",
    )
