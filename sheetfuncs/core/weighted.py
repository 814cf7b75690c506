"""Weighted least squares, with weights that are given or estimated from the residuals."""

from __future__ import annotations

import numpy as np

from sheetfuncs.core.auxiliary import refused
from sheetfuncs.core.basis import listed
from sheetfuncs.core.design import Design
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.remedy import Remedied, RemedyFit, Solution, solve_transformed
from sheetfuncs.core.results import DoesNotApply
from sheetfuncs.core.threads import few_threads
from sheetfuncs.errors import ArgumentError, NumbersError

SAME_PREDICTORS = "log(e^2) on the same regressors (incl. constant if the model has one); w=1/exp(fitted); one step"


def weighted_fit(design: Design, weights: np.ndarray, *, variant: str = "weights as given") -> Remedied:
    """Weighted least squares (Aitken 1935, Proc. R. Soc. Edinburgh 55:42-48), for errors of variance sigma^2 / weight.

    weights: (n,) positive numbers, in the rows' own order. sigma is the standard deviation of an error of weight 1.
    R squared is the weighted one: 1 - sum w e^2 / sum w (y - weighted mean)^2, without an intercept about zero.
    details: weights.
    """
    weights = _checked(design, weights)
    return _weighted(design, weights, "wls", {}, variant)


def log_variance_weights(fit: Fit) -> np.ndarray | DoesNotApply:
    """Weights (n,) from a model of the variance: 1 / exp of the fitted values of log e^2 on the same predictors (Harvey
    1976, Econometrica 44:461-465, by least squares).

    Does not apply where a residual is zero: its logarithm is not there, and one that is almost zero would count for
    more than all others.
    """
    args, variant = {"recipe": SAME_PREDICTORS}, "weights from a model of the variance"
    refusal = refused(fit, "fgls_log_e2", args, variant, "")
    if refusal:
        return refusal
    zero = np.flatnonzero(np.abs(fit.residuals) <= fit.noise / np.sqrt(fit.n))
    if zero.size:
        rows = [str(int(row)) for row in fit.design.rows[zero[:5]]]
        return DoesNotApply(
            method="fgls_log_e2", args=args, variant=variant, cell_error="#NUM!",
            reason=f"The residual of row{'s' if zero.size > 1 else ''} {listed(rows)}{' and others' * (zero.size > 5)} "
                   "is zero, so that the logarithm of its square, which the weights come from, does not exist.",
        )
    with few_threads(fit.basis.q.size):
        size = 2.0 * np.log(np.abs(fit.residuals))
        return np.exp(fit.basis.project_out(size) - size)


def feasible_weighted_fit(fit: Fit) -> Remedied:
    """Weighted least squares with `log_variance_weights`, in one step. The error bars count the weights as known."""
    weights = log_variance_weights(fit)
    if isinstance(weights, DoesNotApply):
        return weights
    args, variant = {"recipe": SAME_PREDICTORS}, "weights from a model of the variance"
    return _weighted(fit.design, weights, "fgls_log_e2", args, variant)


def _checked(design: Design, weights: np.ndarray) -> np.ndarray:
    weights = np.asarray(weights, dtype=np.float64)
    if weights.shape != (design.n,):
        raise ArgumentError(f"{weights.size} weights for {design.n} rows: give one weight a row.")
    bad = np.flatnonzero(~(np.isfinite(weights) & (weights > 0.0)))
    if bad.size:
        row = int(design.rows[bad[0]])
        raise ArgumentError(f"The weight of row {row} is {weights[bad[0]]:g}: weights are positive numbers.")
    return weights


def _weighted(design: Design, weights: np.ndarray, method: str, args: dict[str, str], variant: str) -> Remedied:
    def cannot(reason: str) -> DoesNotApply:
        return DoesNotApply(method=method, args=args, variant=variant, reason=reason, cell_error="#NUM!")

    df = design.n - design.p
    if df < 1:
        return cannot(
            f"{design.n} rows for {design.p} coefficients leave no degrees of freedom, so that weights change nothing."
        )
    unit = float(weights.max())
    with np.errstate(under="ignore"):
        root = np.sqrt(weights / unit)
    try:
        solution = solve_transformed(design, lambda values: values * (root if values.ndim == 1 else root[:, None]))
    except NumbersError as refusal:
        return cannot(str(refusal))
    if solution.perfect:
        return cannot("The weighted fit is perfect: what is left is rounding noise, and has no error bars.")
    sigma = float(np.sqrt(solution.rss / df * unit))
    return RemedyFit(
        method, args, variant, design, solution.coefficients, solution.covariance(sigma / np.sqrt(unit)), sigma, df,
        solution.fitted, solution.residuals, solution.left * np.sqrt(unit), _r_squared(design, root, solution),
        details={"weights": weights},
    )


def _r_squared(design: Design, root: np.ndarray, solution: Solution) -> float | None:
    y = design.response
    if design.intercept:
        y = y - y.mean()
        y = y - float(root**2 @ y) / float(root @ root)
    total = float(np.sum((root * y) ** 2))
    return 1.0 - solution.rss / total if total > 0.0 else None
