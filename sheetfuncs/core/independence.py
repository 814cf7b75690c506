"""Independence: does an error tell something about the next one? Rows stand in time order."""

from __future__ import annotations

import numpy as np
from scipy.special import chdtrc, fdtrc

from sheetfuncs.core.auxiliary import add_columns, refused
from sheetfuncs.core.basis import factorize
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.quadratic_forms import durbin_watson_tails
from sheetfuncs.core.results import DoesNotApply, Result, Statistic
from sheetfuncs.errors import ArgumentError, NumbersError

NO_CORRELATION = "errors are not correlated with earlier ones"
_FILLS = {"zeros": "0", "omitted": "drop first rows"}
_TYPES = {"chi-square": "Chisq", "F": "F"}
_ALTERNATIVES = {"positive": "greater", "negative": "less", "two-sided": "two.sided"}


def durbin_watson(fit: Fit) -> Result:
    """Durbin-Watson statistic: sum of squared differences of neighbouring residuals over their sum of squares.

    Between 0 and 4: near 2 without correlation, below 2 with positive, above 2 with negative correlation of
    neighbours (Durbin and Watson 1950, Biometrika 37:409-428). Computed from its definition; 2(1 - r) differs from it.
    """
    variant = "neighbouring rows, in time order"
    refusal = refused(fit, "durbin_watson", {}, variant, NO_CORRELATION)
    if refusal:
        return refusal
    e = fit.design.in_order(fit.residuals)
    steps = np.diff(e)
    return Statistic(
        method="durbin_watson", args={}, variant=variant, statistic=float(steps @ steps) / fit.rss,
        null=NO_CORRELATION, note="2 is no correlation; below 2 it is positive, above 2 negative.",
    )


def durbin_watson_test(fit: Fit, alternative: str = "positive") -> Result:
    """Exact p of the Durbin-Watson statistic for normal errors, at any n; see `quadratic_forms`.

    alternative: "positive" correlation (small statistic), "negative" or "two-sided" (twice the smaller tail).
    Does not hold where a lagged response stands among the predictors.
    """
    if alternative not in _ALTERNATIVES:
        raise ArgumentError(f'"{alternative}" is not an alternative: use positive, negative or two-sided.')
    args = {"alternative": _ALTERNATIVES[alternative], "exact": True}
    variant = f"exact, against {alternative} correlation" if alternative != "two-sided" else "exact, two-sided"
    refusal = refused(fit, "durbin_watson_test", args, variant, NO_CORRELATION)
    if refusal:
        return refusal
    d = float(durbin_watson(fit).statistic or 0.0)
    tails = durbin_watson_tails(fit.basis, d, fit.design.order)
    p = {
        "positive": tails.lower, "negative": tails.upper, "two-sided": min(1.0, 2.0 * min(tails.lower, tails.upper))
    }[alternative]
    return Statistic(
        method="durbin_watson_test", args=args, variant=variant, statistic=d, p=p, null=NO_CORRELATION,
        note="Exact for normal errors; not valid with an earlier value of the response among the predictors.",
    )


def breusch_godfrey(
    fit: Fit, lags: int = 1, *, distribution: str = "chi-square", before_first: str = "zeros"
) -> Result:
    """Breusch-Godfrey test of correlation with the `lags` errors before (Breusch 1978; Godfrey 1978, Econometrica 46).

    Regress the residuals on the design and their own lags. distribution "chi-square": n R2 with `lags` degrees of
    freedom; "F": the lags' F with (lags, n - p - lags). before_first: lagged values before the first row are "zeros",
    or the first `lags` rows are "omitted" and n counts the rest. Without an intercept the auxiliary regression has
    none either.
    """
    if distribution not in _TYPES:
        raise ArgumentError(f'"{distribution}" is not a distribution of this test: use chi-square or F.')
    if before_first not in _FILLS:
        raise ArgumentError(f'"{before_first}" is not possible before the first row: use zeros or omitted.')
    if not float(lags).is_integer() or lags < 1:
        raise ArgumentError(f"{lags} is not a number of lags: use a whole number from 1 up.")
    lags = int(lags)
    args = {"order": lags, "type": _TYPES[distribution], "fill": _FILLS[before_first]}
    start = "zeros before the first row" if before_first == "zeros" else "first rows omitted"
    variant = f"{lags} lag{'s' if lags > 1 else ''}, {distribution}, {start}"
    refusal = refused(fit, "breusch_godfrey", args, variant, NO_CORRELATION)
    if refusal:
        return refusal
    n = fit.n if before_first == "zeros" else fit.n - lags
    left = n - fit.p - lags

    def cannot(reason: str, cell_error: str = "#N/A") -> DoesNotApply:
        return DoesNotApply(
            method="breusch_godfrey", args=args, variant=variant, null=NO_CORRELATION, reason=reason,
            cell_error=cell_error,
        )

    if left < 1:
        rows = f"{fit.n} rows" if n == fit.n else f"{max(n, 0)} of {fit.n} rows"
        return cannot(
            f"{rows} are too few for {fit.p} coefficients and {lags} lag{'s' if lags > 1 else ''}: the auxiliary "
            "regression would fit perfectly, whatever the data.", "#NUM!",
        )
    try:
        part, rest, rank = _lagged_sums(fit, lags, zeros=before_first == "zeros")
    except NumbersError:
        return cannot("Without the first rows the predictors can no longer be told apart.")
    if rank < lags:
        return cannot("The lagged residuals cannot be told apart from the predictors.")
    if distribution == "chi-square":
        statistic = n * part / (part + rest)
        return Statistic(
            method="breusch_godfrey", args=args, variant=variant, statistic=statistic, df=lags,
            p=float(chdtrc(lags, statistic)), null=NO_CORRELATION,
        )
    if rest == 0.0:
        return cannot("The lagged residuals determine the residuals exactly, so that F has no denominator.", "#NUM!")
    statistic = part / lags / (rest / left)
    return Statistic(
        method="breusch_godfrey", args=args, variant=variant, statistic=statistic, df=(lags, left),
        p=float(fdtrc(lags, left, statistic)), null=NO_CORRELATION,
    )


def _lagged_sums(fit: Fit, lags: int, *, zeros: bool) -> tuple[float, float, int]:
    """Sums of squares of the residuals that design and lags explain and leave (0 if rounding); the rank of the lags."""
    e = fit.design.in_order(fit.residuals)
    lagged = np.zeros((fit.n, lags))
    for lag in range(1, lags + 1):
        lagged[lag:, lag - 1] = e[:-lag]
    if zeros:
        order = fit.design.order
        added = add_columns(fit.basis, fit.residuals, lagged if order is None else lagged[np.argsort(order)])
        return added.part, 0.0 if added.fits_perfectly(fit.noise) else added.rest, added.rank
    columns = fit.design.columns if fit.design.order is None else fit.design.columns[fit.design.order]
    basis = factorize(columns[lags:], fit.design.column_names, intercept=fit.design.intercept)
    unexplained = basis.project_out(e[lags:])
    by_design = e[lags:] - unexplained
    added = add_columns(basis, unexplained, lagged[lags:])
    rest = 0.0 if added.fits_perfectly(fit.noise) else added.rest
    return float(by_design @ by_design) + added.part, rest, added.rank
